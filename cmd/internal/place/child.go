package place

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"os/exec"
	"strings"
	"sync"
	"time"

	protobuf "google.golang.org/protobuf/proto"

	"rowstead/coordinator/fleet/remote"
	"rowstead/proto"
)

// leaving is how long a worker process may take to end after goodbye.
const leaving = 3 * time.Second

// maxPermit bounds a permit, in bytes.
const maxPermit = 1 << 16

// child is a worker process of ours. Its standard input stays open as long as
// this process lives: the worker ends when it closes.
type child struct {
	name  string
	cmd   *exec.Cmd
	stdin io.WriteCloser
	said  tail
	ended chan struct{} // closed once the process has been waited for
	err   error         // of the process; read after ended
}

// start starts a worker process and hands it its permit.
func (o *Office) start(permit *proto.Permit) (*child, error) {
	text, err := protobuf.Marshal(permit)
	if err != nil {
		return nil, fmt.Errorf("permit: %w", err)
	}
	cmd, err := o.Command()
	if err != nil {
		return nil, err
	}
	c := &child{name: permit.Name, cmd: cmd, ended: make(chan struct{})}
	cmd.Stderr, cmd.WaitDelay = &c.said, time.Second
	if c.stdin, err = cmd.StdinPipe(); err != nil {
		return nil, err
	}
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.killed {
		return nil, errKilled
	}
	if err := cmd.Start(); err != nil {
		return nil, err
	}
	o.children = append(o.children, c)
	go func() {
		defer close(c.ended)
		c.err = cmd.Wait()
	}()
	head := binary.LittleEndian.AppendUint32(nil, uint32(len(text)))
	if _, err := c.stdin.Write(append(head, text...)); err != nil {
		if why := c.explain(); why != "" {
			return nil, errors.New(why)
		}
		return nil, fmt.Errorf("hand it its permit: %w", err)
	}
	return c, nil
}

// ReadPermit reads what start writes.
func ReadPermit(r io.Reader) (*proto.Permit, error) {
	var head [4]byte
	if _, err := io.ReadFull(r, head[:]); err != nil {
		return nil, fmt.Errorf("permit: %w", err)
	}
	length := binary.LittleEndian.Uint32(head[:])
	if length > maxPermit {
		return nil, fmt.Errorf("permit: %d bytes, expected at most %d", length, maxPermit)
	}
	text := make([]byte, length)
	if _, err := io.ReadFull(r, text); err != nil {
		return nil, fmt.Errorf("permit: %w", err)
	}
	permit := &proto.Permit{}
	if err := protobuf.Unmarshal(text, permit); err != nil {
		return nil, fmt.Errorf("permit: %w", err)
	}
	return permit, nil
}

// await waits until the worker has called, its process has ended, or ctx has.
func (c *child) await(ctx context.Context, hub *remote.Hub) (*remote.Worker, error) {
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	stop := make(chan struct{})
	var watch sync.WaitGroup
	watch.Go(func() {
		select {
		case <-c.ended:
			cancel(fmt.Errorf("%s", c.fate()))
		case <-stop:
		}
	})
	defer watch.Wait()
	defer close(stop)
	return hub.Await(ctx, c.name)
}

// explain says why the connection of a worker may have ended: its process has, or
// does so within a second.
func (c *child) explain() string {
	select {
	case <-c.ended:
		return c.fate()
	case <-time.After(time.Second):
		return ""
	}
}

// fate says how the process ended.
func (c *child) fate() string {
	how := "status 0"
	if c.err != nil {
		how = c.err.Error()
	}
	text := fmt.Sprintf("its process %d ended: %s", c.cmd.Process.Pid, how)
	if last := c.said.lastLine(); last != "" {
		text += ", saying " + last
	}
	return text
}

// kill ends the process at once.
func (c *child) kill() {
	c.cmd.Process.Kill() // one that has ended needs none
}

// finish waits for all processes, which have been told goodbye, and kills those
// that stay.
func (o *Office) finish() {
	o.mu.Lock()
	children := o.children
	o.mu.Unlock()
	for _, c := range children {
		c.stdin.Close()
	}
	timer := time.NewTimer(leaving)
	defer timer.Stop()
	for _, c := range children {
		select {
		case <-c.ended:
		case <-timer.C:
			for _, late := range children {
				late.kill()
			}
			<-c.ended
		}
	}
}

// tail keeps the end of what a process writes.
type tail struct {
	mu   sync.Mutex
	text []byte // guarded by mu
}

const tailBytes = 2048

// Write implements io.Writer.
func (t *tail) Write(p []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.text = append(t.text, p...)
	if extra := len(t.text) - tailBytes; extra > 0 {
		t.text = append(t.text[:0], t.text[extra:]...)
	}
	return len(p), nil
}

func (t *tail) lastLine() string {
	t.mu.Lock()
	defer t.mu.Unlock()
	lines := strings.Split(strings.TrimSpace(string(t.text)), "\n")
	return lines[len(lines)-1]
}
