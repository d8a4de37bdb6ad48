package place

import (
	"bytes"
	"context"
	"encoding/binary"
	"os/exec"
	"runtime"
	"strings"
	"testing"

	protobuf "google.golang.org/protobuf/proto"

	"rowstead/coordinator"
	"rowstead/partition"
	"rowstead/partition/samples/problems"
	"rowstead/proto"
)

func TestReadPermit(t *testing.T) {
	want := &proto.Permit{Address: "127.0.0.1:1", Name: "worker-1", PrivateKey: []byte{1, 2, 3}}
	text, err := protobuf.Marshal(want)
	if err != nil {
		t.Fatal(err)
	}
	good := append(binary.LittleEndian.AppendUint32(nil, uint32(len(text))), text...)
	got, err := ReadPermit(bytes.NewReader(append(good, "what follows is not its own"...)))
	if err != nil || !protobuf.Equal(got, want) {
		t.Errorf("ReadPermit = %v, %v", got, err)
	}
	for k := range good {
		if _, err := ReadPermit(bytes.NewReader(good[:k])); err == nil {
			t.Errorf("only %d bytes: no error", k)
		}
	}
	for name, bad := range map[string]string{"too long": "\xff\xff\xff\xff", "no permit": "\x02\x00\x00\x00\xff\xff"} {
		if _, err := ReadPermit(strings.NewReader(bad)); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestTailKeepsTheEnd(t *testing.T) {
	var said tail
	for range 1000 {
		said.Write([]byte("a line before\n"))
	}
	said.Write([]byte("the last\n"))
	if len(said.text) > tailBytes || said.lastLine() != "the last" {
		t.Errorf("%d bytes, the last line is %q", len(said.text), said.lastLine())
	}
}

// A worker that ends before it has called is named with what it said, at once,
// and so is one that cannot be started; nothing is left of the others.
func TestWorkersThatDoNotJoin(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("needs a shell")
	}
	for text, command := range map[string]func() (*exec.Cmd, error){
		"worker-1 has not joined": func() (*exec.Cmd, error) { return exec.Command("sh", "-c", "exec <&-; echo no room >&2; exit 3"), nil },
		"start worker-1":          func() (*exec.Cmd, error) { return exec.Command("/no/such/program"), nil },
	} {
		o := &Office{Command: command}
		a := problems.Poisson2D(5)
		cuts, err := partition.CutByEntries(a.Start, 2)
		if err != nil {
			t.Fatal(err)
		}
		_, err = o.Place(context.Background(), coordinator.Placement{Matrix: a, Cuts: cuts, Right: make([]float64, a.Rows), Threads: 1, Node: 1})
		if err == nil || !strings.HasPrefix(err.Error(), text) {
			t.Errorf("%v, want %q", err, text)
		}
		if err != nil && strings.Contains(text, "joined") && !strings.Contains(err.Error(), "exit status 3, saying no room") {
			t.Errorf("%v does not say why", err)
		}
		for _, c := range o.children {
			<-c.ended
		}
		o.Kill()
		if _, err := o.start(&proto.Permit{}); err == nil {
			t.Error("a worker was started after Kill")
		}
	}
}
