package snapshot

import (
	"bufio"
	"io"
	"os"
	"path/filepath"
	"runtime"
)

// replace writes a file through write under a temporary name beside path, brings
// it to the disk and renames it to path. On an error the temporary file is
// removed and path is untouched.
func replace(path string, write func(io.Writer) error) (err error) {
	f, err := os.CreateTemp(filepath.Dir(path), filepath.Base(path)+".part*")
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			f.Close() // a second Close only repeats an error
			os.Remove(f.Name())
		}
	}()
	w := bufio.NewWriterSize(f, 1<<18)
	if err := write(w); err != nil {
		return err
	}
	if err := w.Flush(); err != nil {
		return err
	}
	if err := f.Sync(); err != nil {
		return err
	}
	if err := f.Close(); err != nil {
		return err
	}
	if err := os.Rename(f.Name(), path); err != nil {
		return err
	}
	return syncFolder(filepath.Dir(path))
}

// syncFolder brings the new name to the disk. Windows has no such call for
// folders and keeps names in its journal.
func syncFolder(dir string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	err = d.Sync()
	if closed := d.Close(); err == nil {
		err = closed
	}
	return err
}
