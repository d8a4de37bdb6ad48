package matfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"

	"rowstead/partition/csr"
)

func gzipped(t testing.TB, content []byte) []byte {
	t.Helper()
	var out bytes.Buffer
	z := gzip.NewWriter(&out)
	if _, err := z.Write(content); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return out.Bytes()
}

func zstandard(t testing.TB, content []byte) []byte {
	t.Helper()
	z, err := zstd.NewWriter(nil, zstd.WithEncoderConcurrency(1))
	if err != nil {
		t.Fatal(err)
	}
	return z.EncodeAll(content, nil)
}

// faultFiles are whole files by name; every one states how much it holds.
func faultFiles(t testing.TB) map[string][]byte {
	var text strings.Builder
	fmt.Fprintf(&text, "%s30 30 60\n", coordinate)
	for k := range 60 {
		fmt.Fprintf(&text, "%d %d %.17g\n", k/2+1, (k*k)%30+1, 1/float64(k+3))
	}
	files := map[string][]byte{
		"a.mtx": []byte(text.String()), "a.mtx.gz": gzipped(t, []byte(text.String())), "a.mtx.zst": zstandard(t, []byte(text.String())),
		"b.mtx": []byte("%%MatrixMarket matrix array real general\n3 2\n1.5\n2.5\n3.5\n4.5\n5.5\n6.5\n"),
		"a.rua": []byte(tight()), "a.rua.gz": gzipped(t, []byte(tight())),
	}
	for _, name := range []string{"csr.npz", "csc.npz", "coo.npz", "table.npy", "complex64.npy", "scipy.rua"} {
		content, err := os.ReadFile(filepath.Join("testdata", name))
		if err != nil {
			t.Fatal(err)
		}
		files[name] = content
	}
	return files
}

// Cut at any byte, a file is refused, or every entry it promises is there: in
// plain text alone the last number may have lost digits without a trace.
func TestTruncatedAnywhere(t *testing.T) {
	for name, whole := range faultFiles(t) {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, whole, 0o644); err != nil {
			t.Fatal(err)
		}
		want, _, err := ReadMatrix(path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		text := !strings.HasSuffix(name, "gz") && !strings.HasSuffix(name, "zst") && !strings.Contains(name, "np")
		for at := len(whole) - 1; at >= 0; at -= 1 + len(whole)/700 {
			if err := os.Truncate(path, int64(at)); err != nil {
				t.Fatal(err)
			}
			m, _, err := ReadMatrix(path, Options{Threads: 1})
			if err != nil {
				continue
			}
			if !text || m.Entries() != want.Entries() || m.Rows != want.Rows || bytes.LastIndexByte(bytes.TrimSpace(whole), '\n') > at {
				t.Errorf("%s cut to %d of %d bytes is accepted with %d entries", name, at, len(whole), m.Entries())
			}
		}
	}
}

// Right sides are cut as the matrices are.
func TestTruncatedVectors(t *testing.T) {
	right := boeing("RUA", columns(14, 3, 1, 1, 0), formats("(10I3)", "(16I5)", "(2F5.1)", "(2F5.1)"), "F             "+columns(14, 2, 0)+"\n", "  1  2\n", "    1\n", "  3.0\n", "  1.0  2.0\n  3.0  4.0\n  5.0  6.0\n")
	for name, whole := range map[string][]byte{"a.rua": []byte(right), "b.mtx": faultFiles(t)["b.mtx"], "table.npy": faultFiles(t)["table.npy"]} {
		path := filepath.Join(t.TempDir(), name)
		for at := len(whole) - 3; at >= 0; at-- {
			if err := os.WriteFile(path, whole[:at], 0o644); err != nil {
				t.Fatal(err)
			}
			if d, _, err := ReadDense(path, Options{Threads: 1}); err == nil && bytes.LastIndexByte(bytes.TrimSpace(whole), '\n') > at {
				t.Errorf("%s cut to %d of %d bytes is accepted: %v", name, at, len(whole), d)
			}
		}
	}
}

// A flipped bit in a gzip or Zstandard file is found.
func TestDamagedCompression(t *testing.T) {
	for _, name := range []string{"a.mtx.gz", "a.mtx.zst"} {
		whole := faultFiles(t)[name]
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, whole, 0o644); err != nil {
			t.Fatal(err)
		}
		want, _, err := ReadMatrix(path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		for at := 0; at < len(whole); at += 3 {
			bad := bytes.Clone(whole)
			bad[at] ^= 4
			if err := os.WriteFile(path, bad, 0o644); err != nil {
				t.Fatal(err)
			}
			m, _, err := ReadMatrix(path, Options{Threads: 1})
			if err == nil && fmt.Sprint(m.Val, m.Col) != fmt.Sprint(want.Val, want.Col) {
				t.Errorf("%s with byte %d damaged is accepted", name, at)
			}
		}
	}
}

// endless gives the same bytes again and again, n bytes in all.
type endless struct {
	piece    []byte
	at, left int
}

func (e *endless) Read(b []byte) (int, error) {
	if e.left == 0 {
		return 0, io.EOF
	}
	n := 0
	for n < len(b) && e.left > 0 {
		k := copy(b[n:], e.piece[e.at:min(len(e.piece), e.at+e.left)])
		n, e.left, e.at = n+k, e.left-k, (e.at+k)%len(e.piece)
	}
	return n, nil
}

// A small compressed file that inflates to much is refused within bounded memory.
func TestInflatingBombs(t *testing.T) {
	for name, test := range map[string]struct{ head, piece, want string }{
		"blanks without line end": {coordinate + "2 2 1\n", strings.Repeat(" ", 1<<16), "lines of at most"},
		"line ends":               {coordinate + "2 2 1\n", strings.Repeat("\n", 1<<16), "expected 1 entry"},
		"entries":                 {coordinate + "2 2 1\n", strings.Repeat("1 1 1\n", 1<<13), "expected the end of the file after 1 entry"},
		"comments":                {"%%MatrixMarket matrix coordinate real general\n", strings.Repeat("% comment\n", 1<<12), "the line with the sizes"},
		"first line":              {"%%MatrixMarket ", strings.Repeat("x", 1<<16), "lines of at most"},
		"numbers of an array":     {"%%MatrixMarket matrix array real general\n2 1\n", strings.Repeat("1\n", 1<<15), "after 2 numbers"},
		"array promised and cut":  {"%%MatrixMarket matrix array real general\n2000000000 1\n", "1\n", "found the end of the file after"},
		"entries promised":        {coordinate + "2000000000 2000000000 900000000000\n", "1 1 1\n", "found the end of the file after"},
	} {
		t.Run(name, func(t *testing.T) {
			left := 32 << 20
			if strings.Contains(name, "promised") {
				left = 6000
			}
			var out bytes.Buffer
			z, err := gzip.NewWriterLevel(&out, gzip.BestSpeed)
			if err == nil {
				_, err = io.Copy(z, io.MultiReader(strings.NewReader(test.head), &endless{[]byte(test.piece), 0, left}))
			}
			if err == nil {
				err = z.Close()
			}
			if err != nil {
				t.Fatal(err)
			}
			path := write(t, "bomb.mtx.gz", out.String())
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			_, _, err = ReadMatrix(path, Options{Threads: 1})
			runtime.ReadMemStats(&after)
			if err == nil || !strings.Contains(err.Error(), test.want) {
				t.Errorf("error is %v, want %q in it", err, test.want)
			}
			// The chunks that go round, their entries, and the inflater.
			if grown := after.TotalAlloc - before.TotalAlloc; grown > 24<<20 {
				t.Errorf("%d bytes were allocated for %d bytes inflated", grown, left)
			}
		})
	}
}

// A reader that stops at an error leaves no goroutine, and repeats the error.
func TestErrorsStay(t *testing.T) {
	path := write(t, "a.mtx", coordinate+"9 9 9\n"+strings.Repeat("1 1 1\n", 4)+"x\n"+strings.Repeat("1 1 1\n", 4))
	r, err := Open(path, Options{Threads: 2, ChunkSize: 6})
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	var part csr.Triplets
	for err == nil {
		err = r.Next(&part)
	}
	again := r.Next(&part)
	var bad *FileError
	if !errors.As(err, &bad) || bad.Line != 7 || again != err {
		t.Errorf("first %v, then %v", err, again)
	}
}
