package matfile

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"testing"

	"rowstead/partition/csr"
)

// accepts checks what holds of every file: reading ends without a panic, an
// error about the file names it, and what is accepted is sound.
func accepts(t *testing.T, name string, content []byte, o Options) {
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, content, 0o644); err != nil {
		t.Fatal(err)
	}
	stored, err := streamed(t, path, o)
	m, h, errWhole := ReadMatrix(path, o)
	if err == nil && errWhole == nil {
		if bad := m.Check(); bad != nil {
			t.Fatal(bad)
		}
		if !h.Dense && h.Stored != stored && h.Symmetry == "general" {
			t.Fatalf("the header counts %d entries, %d were delivered", h.Stored, stored)
		}
	}
	if err != nil && errWhole == nil {
		t.Fatalf("streamed: %v, whole: accepted", err)
	}
	d, _, err := ReadDense(path, o)
	if err == nil && len(d.Values) != d.Rows*d.Cols {
		t.Fatalf("%d values of %d by %d", len(d.Values), d.Rows, d.Cols)
	}
	var bad *FileError
	if err != nil && (!errors.As(err, &bad) || bad.Path == "" || bad.Expected == "") {
		t.Fatalf("not about the file: %v", err)
	}
}

// streamed reads a file in chunks and counts the stored entries.
func streamed(t *testing.T, path string, o Options) (int64, error) {
	r, err := Open(path, o)
	if err != nil {
		return 0, err
	}
	defer r.Close()
	per := int64(1)
	if r.Header().Complex {
		per = 4
	}
	n, part := int64(0), csr.Triplets{}
	for {
		err := r.Next(&part)
		if err == io.EOF {
			return n / per, nil
		}
		if err != nil {
			return 0, err
		}
		n += int64(len(part.V))
		for k := range part.V {
			if uint(part.I[k]) >= uint(r.Header().Rows) || uint(part.J[k]) >= uint(r.Header().Cols) {
				t.Fatalf("entry (%d, %d) outside %d by %d", part.I[k], part.J[k], r.Header().Rows, r.Header().Cols)
			}
		}
	}
}

func FuzzCoordinate(f *testing.F) {
	for _, head := range []string{"real general", "integer symmetric", "complex hermitian", "real skew-symmetric"} {
		f.Add([]byte("%%MatrixMarket matrix coordinate "+head+"\n% c\n3 3 2\n2 1 1\n3 1 -2 0\n"), byte(7))
	}
	f.Add([]byte("%%MatrixMarket matrix coordinate pattern general\n3 3 2\n1 1\n3 3\n"), byte(0))
	f.Add([]byte(coordinate+"2 2 2\r\n1 1 1e5\r\n\r\n  2\t2 .5D-3 \r\n"), byte(3))
	f.Fuzz(func(t *testing.T, content []byte, chunk byte) {
		accepts(t, "a.mtx", content, Options{Threads: 1 + int(chunk)%3, ChunkSize: int(chunk)})
	})
}

func FuzzArray(f *testing.F) {
	f.Add([]byte("%%MatrixMarket matrix array real general\n2 2\n1\n2\n3\n4\n"), byte(7))
	f.Add([]byte("%%MatrixMarket matrix array complex hermitian\n2 2\n1 0\n2 1\n3 0\n"), byte(0))
	f.Add([]byte("%%MatrixMarket matrix array integer skew-symmetric\n3 3\n1 2\n3\n"), byte(1))
	f.Fuzz(func(t *testing.T, content []byte, chunk byte) {
		accepts(t, "a.mtx", content, Options{Threads: 1 + int(chunk)%3, ChunkSize: int(chunk)})
	})
}

func FuzzTriplets(f *testing.F) {
	f.Add([]byte("0 0 1\n1 1 2\n"), byte(0))
	f.Add([]byte("# c\n1 1 1 5\n2 1 2 6\n"), byte(2))
	f.Add([]byte("1.5\n2\n"), byte(1))
	f.Fuzz(func(t *testing.T, content []byte, base byte) {
		accepts(t, "a.txt", content, Options{Threads: 1, ChunkSize: int(base) / 3, IndexBase: IndexBase(base % 3)})
	})
}

func FuzzBoeing(f *testing.F) {
	f.Add([]byte(tight()))
	f.Add([]byte(boeing("CHA", columns(14, 2, 2, 2, 0), formats("(10I3)", "(16I5)", "(1P,4F5.1)", ""), "", "  1  3  3\n", "    1    2\n", "  2.0  0.0  3.0  1.0\n")))
	f.Add([]byte(boeing("RUA", columns(14, 3, 1, 1, 0), formats("(10I3)", "(16I5)", "(2F5.1)", "(2F5.1)"), "FGX           "+columns(14, 1, 0)+"\n", "  1  2\n", "    1\n", "  3.0\n", "  1.0  2.0\n  3.0\n  4.0  5.0\n  6.0\n  7.0  8.0\n  9.0\n")))
	f.Add([]byte(boeing("RUA", columns(14, 3, 1, 1, 0), formats("(10I3)", "(16I5)", "(2F5.1)", "(2F5.1)"), "M             "+columns(14, 2, 2)+"\n", "  1  2\n", "    1\n", "  3.0\n", "  1  2  3\n    3    1\n  7.0  8.0\n")))
	f.Fuzz(func(t *testing.T, content []byte) { accepts(t, "a.rua", content, Options{Threads: 1}) })
}

func FuzzNpy(f *testing.F) {
	for _, name := range []string{"vector.npy", "table.npy", "fortran.npy", "big.npy", "int16.npy", "complex64.npy", "version2.npy"} {
		content, err := os.ReadFile(filepath.Join("testdata", name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Fuzz(func(t *testing.T, content []byte) { accepts(t, "a.npy", content, Options{Threads: 1}) })
}

func FuzzNpz(f *testing.F) {
	for _, name := range []string{"csr.npz", "csc.npz", "coo.npz", "complex.npz", "bool.npz"} {
		content, err := os.ReadFile(filepath.Join("testdata", name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Fuzz(func(t *testing.T, content []byte) { accepts(t, "a.npz", content, Options{Threads: 1}) })
}

// FuzzNpzMembers goes behind the checksums: the bytes of the members.
func FuzzNpzMembers(f *testing.F) {
	f.Add(int32s(0, 1, 3), int32s(0, 0, 1), float64s(1, 2, 3), int32s(2, 2), byte(0))
	f.Add(int32s(0, 0, 1), int32s(1, 0, 1), float64s(1, 2, 3), int32s(2, 2), byte(1))
	f.Fuzz(func(t *testing.T, starts, indices, values, shape []byte, kind byte) {
		members := goodArchive()
		list := func(descr string, size int, body []byte) [2]string {
			dict := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%d,), }", descr, len(body)/size)
			return [2]string{dict, string(body[:len(body)/size*size])}
		}
		members["indptr"], members["indices"], members["data"], members["shape"] = list("<i4", 4, starts), list("<i4", 4, indices), list("<f8", 8, values), list("<i4", 4, shape)
		switch kind % 3 {
		case 1:
			members["row"], members["col"] = members["indptr"], members["indices"]
			members["format"] = [2]string{members["format"][0], "coo"}
		case 2:
			members["format"] = [2]string{members["format"][0], "csc"}
		}
		accepts(t, "a.npz", npz(t, members), Options{Threads: 1})
	})
}

func FuzzFloat(f *testing.F) {
	for _, text := range []string{"1.5", "-2e-300", "123456789012345678901234567890e-20", ".5e", "1e400", "4.9e-324"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		for _, c := range text {
			if (c < '0' || c > '9') && c != '.' && c != 'e' && c != 'E' && c != '+' && c != '-' {
				return
			}
		}
		if _, next, ok := scanFloat([]byte(text+"\n"), 0); ok {
			text = text[:next]
		}
		sameAsStrconv(t, text)
	})
}
