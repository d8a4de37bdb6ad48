package matfile

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

// WriteOptions say how to write. The zero value is the default.
type WriteOptions struct {
	Overwrite bool     // replace an existing file; without it that is ErrExists
	Comment   []string // lines of comment, for the formats that have them
}

// disk is what a writer asks of the file system.
type disk interface {
	create(path string) (diskFile, error) // must not exist
	stat(path string) (fs.FileInfo, error)
	link(from, to string) error // fails with fs.ErrExist where to exists
	rename(from, to string) error
	remove(path string) error
	syncFolder(path string) error
}

type diskFile interface {
	io.WriteCloser
	Sync() error
}

// writeWhole writes path by way of a temporary file in its folder, compressed
// as the ending says, so that either the whole new file stands there or what
// stood there before, and no temporary file after an error.
func writeWhole(d disk, path string, w WriteOptions, fill func(io.Writer) error) error {
	old, err := d.stat(path)
	switch {
	case err == nil && !w.Overwrite:
		return existsError(path)
	case err == nil && !old.Mode().IsRegular():
		return fmt.Errorf("write %s: it is not a regular file", path)
	case err != nil && !errors.Is(err, fs.ErrNotExist):
		return fmt.Errorf("write %s: %w", path, err)
	}
	temporary, err := writeTemporary(d, path, fill)
	if err != nil {
		return fmt.Errorf("write %s: %w", path, err)
	}
	if err := publish(d, temporary, path, w.Overwrite); err != nil {
		d.remove(temporary)
		if errors.Is(err, fs.ErrExist) {
			return existsError(path)
		}
		return fmt.Errorf("write %s: %w", path, err)
	}
	// The file is whole; a folder that cannot be synced (Windows) is no failure.
	_ = d.syncFolder(filepath.Dir(path))
	return nil
}

func existsError(path string) error {
	return fmt.Errorf("write %s: %w; --overwrite replaces it", path, ErrExists)
}

// publish gives the temporary file its name. Without overwrite a hard link
// refuses a name that appeared meanwhile; where links do not exist, a look does.
func publish(d disk, temporary, path string, overwrite bool) error {
	if !overwrite {
		err := d.link(temporary, path)
		if err == nil {
			return d.remove(temporary)
		}
		if errors.Is(err, fs.ErrExist) {
			return err
		}
		if _, err := d.stat(path); err == nil {
			return fs.ErrExist
		}
	}
	return d.rename(temporary, path)
}

// writeTemporary writes and syncs the temporary file and removes it on error.
func writeTemporary(d disk, path string, fill func(io.Writer) error) (string, error) {
	name := fmt.Sprintf("%s.%08x.part", path, rand.Uint32())
	file, err := d.create(name)
	if err != nil {
		return "", err
	}
	err = fillCompressed(file, path, fill)
	if err == nil {
		err = file.Sync()
	}
	if closed := file.Close(); err == nil {
		err = closed
	}
	if err != nil {
		d.remove(name)
		return "", err
	}
	return name, nil
}

// fillCompressed puts the compression that the name's ending asks for between
// fill and the file.
func fillCompressed(file io.Writer, path string, fill func(io.Writer) error) error {
	buffer := bufio.NewWriterSize(file, 256<<10)
	var packer io.WriteCloser
	var err error
	switch compressionOf(path) {
	case "gzip":
		packer = gzip.NewWriter(buffer)
	case "zstd":
		packer, err = zstd.NewWriter(buffer, zstd.WithEncoderConcurrency(1))
	}
	if err != nil {
		return err
	}
	if packer == nil {
		err = fill(buffer)
	} else {
		err = fill(packer)
		if closed := packer.Close(); err == nil {
			err = closed
		}
	}
	if err != nil {
		return err
	}
	return buffer.Flush()
}

// compressionOf tells the compression by the ending of a name to be written.
func compressionOf(path string) string {
	switch strings.ToLower(filepath.Ext(path)) {
	case ".gz":
		return "gzip"
	case ".zst":
		return "zstd"
	}
	return ""
}

// realDisk is the file system of this machine.
type realDisk struct{}

func (realDisk) create(path string) (diskFile, error) {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o666)
	if err != nil {
		return nil, err
	}
	return f, nil
}

func (realDisk) stat(path string) (fs.FileInfo, error) { return os.Stat(path) }
func (realDisk) link(from, to string) error            { return os.Link(from, to) }
func (realDisk) rename(from, to string) error          { return os.Rename(from, to) }
func (realDisk) remove(path string) error              { return os.Remove(path) }

func (realDisk) syncFolder(path string) error {
	f, err := os.Open(path)
	if err != nil {
		return err
	}
	defer f.Close()
	return f.Sync()
}
