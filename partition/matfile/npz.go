package matfile

import (
	"fmt"
	"io"
	"strings"

	"github.com/klauspost/compress/zip"
)

// npzFile is a SciPy sparse archive: a zip file whose members are NumPy arrays
// named format, shape, data and, by format, indptr and indices or row and col.
type npzFile struct {
	in      *stream
	archive *zip.Reader
	head    Header
	format  string // "csr", "csc", "coo"
	rows    int    // as the file states them
	cols    int
}

// openNpz reads the small members and prepares the large ones.
func openNpz(in *stream, purpose use) (*Reader, error) {
	if in.size < 0 {
		return nil, &FileError{Path: in.path, Expected: "an archive that is a plain file", Found: "one inside something else"}
	}
	archive, err := zip.NewReader(in.file, in.size)
	if err != nil {
		return nil, &FileError{Path: in.path, Expected: "a whole archive", Found: "a truncated or broken one", Err: err}
	}
	f := &npzFile{in: in, archive: archive, head: Header{Path: in.path, Format: "npz", Symmetry: "general"}}
	if err := f.readFormat(); err != nil {
		return nil, err
	}
	body := &npzBody{file: f}
	data, err := body.open("data")
	if err == nil {
		err = f.readShape(data)
	}
	if err != nil {
		body.closeMembers()
		return nil, err
	}
	body.values = data
	body.expand = expansionOf("general", f.head.Complex, purpose == asVectors)
	return &Reader{head: f.head, body: body}, nil
}

// member opens one array of the archive.
func (f *npzFile) member(name string) (io.ReadCloser, string, error) {
	full := f.in.path + ": " + name + ".npy"
	for _, m := range f.archive.File {
		if m.Name == name+".npy" {
			r, err := m.Open()
			if err != nil {
				return nil, full, &FileError{Path: full, Expected: "a member this program can inflate", Found: "another", Err: err}
			}
			return r, full, nil
		}
	}
	return nil, full, &FileError{Path: f.in.path, Expected: "a SciPy sparse archive with a member " + name + ".npy", Found: "none"}
}

// readFormat reads the text in format.npy.
func (f *npzFile) readFormat() error {
	in, name, err := f.member("format")
	if err != nil {
		return err
	}
	defer in.Close()
	c, err := openCells(in, name)
	if err != nil {
		return err
	}
	if c.left != 1 || c.array.kind != 'S' && c.array.kind != 'U' {
		return &FileError{Path: name, Expected: "one text", Found: fmt.Sprintf("%d elements of type %c%d", c.left, c.array.kind, c.array.size)}
	}
	raw, err := c.block(1)
	if err == nil {
		err = c.finish()
	}
	if err != nil {
		return err
	}
	// UTF-32 of plain letters becomes those letters without its zeros.
	f.format = strings.ReplaceAll(string(raw), "\x00", "")
	if !contains([]string{"csr", "csc", "coo"}, f.format) {
		return &FileError{Path: name, Expected: "csr, csc or coo", Found: quote(f.format)}
	}
	f.head.Layout = f.format
	return nil
}

// readShape reads shape.npy and completes the header.
func (f *npzFile) readShape(data *cells) error {
	in, name, err := f.member("shape")
	if err != nil {
		return err
	}
	defer in.Close()
	c, err := openCells(in, name)
	if err != nil {
		return err
	}
	if c.left != 2 || c.array.kind != 'i' && c.array.kind != 'u' {
		return &FileError{Path: name, Expected: "two whole numbers", Found: fmt.Sprintf("%d elements of type %c%d", c.left, c.array.kind, c.array.size)}
	}
	rows, err := c.nextIndex()
	if err != nil {
		return err
	}
	cols, err := c.nextIndex()
	if err == nil {
		err = c.finish()
	}
	if err != nil {
		return err
	}
	f.head.Field, f.head.Complex, f.head.Stored = data.array.field(), data.array.kind == 'c', data.left
	f.rows, f.cols = int(rows), int(cols)
	return f.head.setShape(rows, cols, 0)
}
