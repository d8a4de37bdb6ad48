package matfile

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// failingDisk is the real one until its k-th call, which fails.
type failingDisk struct {
	realDisk
	calls *int // left until the failure
}

var errFull = errors.New("no space left on the device")

func (d failingDisk) fails() bool {
	*d.calls--
	return *d.calls == 0
}

func (d failingDisk) create(path string) (diskFile, error) {
	if d.fails() {
		return nil, errFull
	}
	f, err := d.realDisk.create(path)
	return failingFile{f, d}, err
}

func (d failingDisk) stat(path string) (fs.FileInfo, error) {
	if d.fails() {
		return nil, errFull
	}
	return d.realDisk.stat(path)
}

func (d failingDisk) link(from, to string) error {
	if d.fails() {
		return errFull // as on a file system without links
	}
	return d.realDisk.link(from, to)
}

func (d failingDisk) rename(from, to string) error {
	if d.fails() {
		return errFull
	}
	return d.realDisk.rename(from, to)
}

type failingFile struct {
	diskFile
	disk failingDisk
}

func (f failingFile) Write(b []byte) (int, error) {
	if f.disk.fails() {
		n, _ := f.diskFile.Write(b[:len(b)/2])
		return n, errFull
	}
	return f.diskFile.Write(b)
}

func (f failingFile) Sync() error {
	if f.disk.fails() {
		return errFull
	}
	return f.diskFile.Sync()
}

func (f failingFile) Close() error {
	err := f.diskFile.Close()
	if f.disk.fails() {
		return errFull
	}
	return err
}

// Whichever call of the file system fails, either the whole new file stands
// there or what stood there before, and nothing beside it.
func TestEveryFailureLeavesOldOrNew(t *testing.T) {
	text := strings.Repeat("some text that is written ", 40000)
	for _, name := range []string{"x", "x.gz", "x.zst"} {
		for _, old := range []string{"", "old"} {
			for k := 1; ; k++ {
				folder := t.TempDir()
				path := filepath.Join(folder, name)
				if old != "" {
					if err := os.WriteFile(path, []byte(old), 0o644); err != nil {
						t.Fatal(err)
					}
				}
				left := k
				err := writeWhole(failingDisk{calls: &left}, path, WriteOptions{Overwrite: old != ""}, func(out io.Writer) error {
					_, err := io.WriteString(out, text)
					return err
				})
				checkOldOrNew(t, folder, path, old, text, err)
				if left > 0 {
					if err != nil || k < 5 {
						t.Fatalf("without a failure, %d calls: %v", k, err)
					}
					break
				}
			}
		}
	}
}

func checkOldOrNew(t *testing.T, folder, path, old, text string, err error) {
	t.Helper()
	there, _ := os.ReadDir(folder)
	want := 1
	if err != nil && old == "" {
		want = 0
	}
	if len(there) != want {
		t.Fatalf("after %v the folder holds %v", err, there)
	}
	if want == 0 {
		return
	}
	if err != nil {
		if got, _ := os.ReadFile(path); string(got) != old {
			t.Fatalf("after %v the old file holds %d bytes", err, len(got))
		}
		return
	}
	in, err := openStream(path)
	if err != nil {
		t.Fatal(err)
	}
	defer in.close()
	if got, err := io.ReadAll(in.in); err != nil || string(got) != text {
		t.Fatalf("the new file holds %d bytes, %v", len(got), err)
	}
}

func TestUnwritableFolder(t *testing.T) {
	folder := filepath.Join(t.TempDir(), "missing")
	err := WriteDense(filepath.Join(folder, "x.mtx"), &Dense{Rows: 1, Cols: 1, Values: []float64{1}}, WriteOptions{})
	if !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("error is %v", err)
	}
	if _, err := os.Stat(folder); err == nil {
		t.Error("the folder was made")
	}
}

// A file that appears while ours is written is not replaced.
func TestFileThatAppearsMeanwhileIsKept(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x")
	err := writeWhole(realDisk{}, path, WriteOptions{}, func(io.Writer) error { return os.WriteFile(path, []byte("other"), 0o644) })
	if got, _ := os.ReadFile(path); !errors.Is(err, ErrExists) || string(got) != "other" {
		t.Errorf("error is %v, the file holds %q", err, got)
	}
	if left, _ := os.ReadDir(filepath.Dir(path)); len(left) != 1 {
		t.Errorf("%v is left", left)
	}
}
