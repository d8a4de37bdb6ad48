// Package replace writes files that are either whole or not there: a file grows
// under a temporary name in the folder it belongs to, reaches the disk, and
// only then takes its name.
//
// A Pending counts the files that are still growing, so that a program which
// must end at once can remove them. It may be used from many goroutines.
package replace

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
)

// bufferBytes is the size of the write buffer.
const bufferBytes = 1 << 20

// Pending is the set of temporary files. The zero value is ready.
type Pending struct {
	mu sync.Mutex
	// names of files that have no final name yet, guarded by mu
	names map[string]bool
	// closed refuses new files after Abandon, guarded by mu
	closed bool
}

// errEnding is what Write returns once Abandon was called.
var errEnding = errors.New("the program is ending")

// Write creates path with what fill writes. An existing file is replaced at the
// very end, and only when overwrite is set; with an error the old file, or
// none, is there. Errors name path.
func (p *Pending) Write(path string, overwrite bool, fill func(io.Writer) error) error {
	if !overwrite {
		if _, err := os.Lstat(path); err == nil {
			return fmt.Errorf("%s: %w", path, os.ErrExist)
		}
	}
	f, err := p.create(path)
	if err != nil {
		return err
	}
	err = writeAll(f, fill)
	if err == nil {
		err = p.settle(f.Name(), path)
	}
	if err != nil {
		p.drop(f.Name())
		return named(path, err)
	}
	return nil
}

// named puts path before an error that names the temporary file instead.
func named(path string, err error) error {
	var inner *os.PathError
	if errors.As(err, &inner) {
		err = inner.Err
	}
	folder := filepath.ToSlash(filepath.Dir(path))
	switch {
	case errors.Is(err, os.ErrNotExist):
		return plainError{fmt.Sprintf("%s: the folder %s does not exist", path, folder), err}
	case errors.Is(err, os.ErrPermission):
		return plainError{fmt.Sprintf("%s: nothing may be written into the folder %s", path, folder), err}
	case errors.Is(err, syscall.ENOTDIR):
		return plainError{fmt.Sprintf("%s: on the way there is a file where a folder should be", path), err}
	}
	return fmt.Errorf("%s: %w", path, err)
}

// plainError tells in our words what the operating system said.
type plainError struct {
	text string
	err  error
}

func (e plainError) Error() string { return e.text }
func (e plainError) Unwrap() error { return e.err }

// Plain tells in our words why a file or its folder could not be written, and
// names the file, not the temporary one that it grows as; other errors stay.
func Plain(err error) error {
	var inner *os.PathError
	if !errors.As(err, &inner) {
		return err
	}
	path := inner.Path
	if at := strings.Index(path, ".part-"); at >= 0 {
		path = filepath.Join(filepath.Dir(path), strings.TrimPrefix(filepath.Base(path[:at]), "."))
	} else if short := len(path) - len(".00000000.part"); short > 0 && strings.HasSuffix(path, ".part") {
		path = path[:short]
	}
	return named(path, inner.Err)
}

// create opens a temporary file beside path and remembers it.
func (p *Pending) create(path string) (*os.File, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.closed {
		return nil, errEnding
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".part-*")
	if err != nil {
		return nil, named(path, err)
	}
	if p.names == nil {
		p.names = make(map[string]bool)
	}
	p.names[f.Name()] = true
	return f, nil
}

// writeAll fills f, sends it to the disk and closes it.
func writeAll(f *os.File, fill func(io.Writer) error) error {
	w := bufio.NewWriterSize(f, bufferBytes)
	err := fill(w)
	if err == nil {
		err = w.Flush()
	}
	if err == nil {
		err = f.Chmod(0o644)
	}
	if err == nil {
		err = f.Sync()
	}
	return errors.Join(err, f.Close())
}

// settle gives the temporary file its name.
func (p *Pending) settle(temporary, path string) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.closed {
		return errEnding
	}
	if err := os.Rename(temporary, path); err != nil {
		return err
	}
	delete(p.names, temporary)
	return nil
}

// drop removes a temporary file.
func (p *Pending) drop(temporary string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	delete(p.names, temporary)
	os.Remove(temporary) // nothing is lost if it stays
}

// Abandon removes every file that has no name yet and refuses new ones. It is
// for the last moment of the program.
func (p *Pending) Abandon() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.closed = true
	for name := range p.names {
		os.Remove(name) // nothing more can be done about one that stays
	}
	clear(p.names)
}

// Probe says whether a file could be made in path's folder, by making one and
// removing it.
func Probe(path string) error {
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".part-*")
	if err != nil {
		return named(path, err)
	}
	return errors.Join(f.Close(), os.Remove(f.Name()))
}
