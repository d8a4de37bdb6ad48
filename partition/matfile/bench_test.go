package matfile

import (
	"bytes"
	"fmt"
	"io"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"rowstead/partition/csr"
)

// stencilText is the coordinate text of a 7-point stencil on n³ points, whose
// values have the given number of digits behind the point.
func stencilText(n, digits int) []byte {
	rng := rand.New(rand.NewPCG(7, 7))
	var body []byte
	count := 0
	for i := range n * n * n {
		for _, off := range []int{-n * n, -n, -1, 0, 1, n, n * n} {
			j := i + off
			if j < 0 || j >= n*n*n {
				continue
			}
			body = strconv.AppendInt(body, int64(i)+1, 10)
			body = append(body, ' ')
			body = strconv.AppendInt(body, int64(j)+1, 10)
			body = append(body, ' ')
			body = strconv.AppendFloat(body, rng.NormFloat64(), 'e', digits, 64)
			body = append(body, '\n')
			count++
		}
	}
	head := fmt.Sprintf("%s%d %d %d\n", coordinate, n*n*n, n*n*n, count)
	return append([]byte(head), body...)
}

// BenchmarkParse is the parser alone, one core, 512 KiB of text.
func BenchmarkParse(b *testing.B) {
	for _, digits := range []int{3, 16} {
		b.Run(fmt.Sprintf("digits=%d", digits+1), func(b *testing.B) {
			text := stencilText(24, digits)
			text = text[bytes.IndexByte(text, '\n')+1:]
			text = text[bytes.IndexByte(text, '\n')+1:]
			text = text[:min(len(text), 512<<10)]
			text = text[:bytes.LastIndexByte(text, '\n')+1]
			g := &coordinates{rows: 1 << 20, cols: 1 << 20, base: 1, values: 1, comments: "%", expand: expansionOf("general", false, false)}
			c := &chunk{text: text, lines: bytes.Count(text, []byte{'\n'})}
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				if g.parse(c); c.err != nil {
					b.Fatal(c.err)
				}
			}
		})
	}
}

// BenchmarkStream is the whole way from the file to the entries.
func BenchmarkStream(b *testing.B) {
	path := filepath.Join(b.TempDir(), "a.mtx")
	text := stencilText(50, 16)
	if err := os.WriteFile(path, text, 0o644); err != nil {
		b.Fatal(err)
	}
	for _, threads := range []int{1, 2} {
		b.Run(fmt.Sprintf("threads=%d", threads), func(b *testing.B) {
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				r, err := Open(path, Options{Threads: threads})
				if err != nil {
					b.Fatal(err)
				}
				var part csr.Triplets
				for err == nil {
					err = r.Next(&part)
				}
				if err != io.EOF {
					b.Fatal(err)
				}
				r.Close()
			}
		})
	}
	b.Run("ReadMatrix", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		for b.Loop() {
			if _, _, err := ReadMatrix(path, Options{}); err != nil {
				b.Fatal(err)
			}
		}
	})
}

// BenchmarkFormats reads the same kind of matrix from the other formats; bytes
// are those of the file.
func BenchmarkFormats(b *testing.B) {
	text := stencilText(24, 16)
	for name, content := range map[string][]byte{
		"gzip":   gzipped(b, text),
		"zstd":   zstandard(b, text),
		"boeing": []byte(boeingText(20000, 7)),
		"npz":    npz(b, stencilArchive(20000, 7)),
	} {
		path := filepath.Join(b.TempDir(), "file")
		if err := os.WriteFile(path, content, 0o644); err != nil {
			b.Fatal(err)
		}
		b.Run(name, func(b *testing.B) {
			b.SetBytes(int64(len(content)))
			for b.Loop() {
				if _, _, err := ReadMatrix(path, Options{Threads: 1}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// band calls put for the entries of a matrix with w entries a column.
func band(n, w int, put func(i, j int, v float64)) {
	rng := rand.New(rand.NewPCG(7, 7))
	for j := range n {
		for k := range w {
			put((j+k*k)%n, j, rng.NormFloat64())
		}
	}
}

func boeingText(n, w int) string {
	var pointer, index, value bytes.Buffer
	count := 0
	band(n, w, func(i, j int, v float64) {
		count++
		fmt.Fprintf(&index, "%8d", i+1)
		fmt.Fprintf(&value, "%24.16E", v)
		if count%10 == 0 {
			index.WriteByte('\n')
		}
		if count%4 == 0 {
			value.WriteByte('\n')
		}
	})
	for j := range n + 1 {
		fmt.Fprintf(&pointer, "%8d\n", j*w+1)
	}
	return boeing("RUA", columns(14, n, n, count, 0), formats("(I8)", "(10I8)", "(4E24.16)", ""), "", pointer.String(), index.String(), value.String())
}

func stencilArchive(n, w int) map[string][2]string {
	var starts, indices []int32
	var values []float64
	band(n, w, func(_, j int, v float64) {
		if len(values)%w == 0 {
			starts = append(starts, int32(len(values)))
		}
		indices, values = append(indices, int32(j)), append(values, v)
	})
	starts = append(starts, int32(len(values)))
	list := func(descr string, count int, body []byte) [2]string {
		return [2]string{fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%d,), }", descr, count), string(body)}
	}
	members := goodArchive()
	members["shape"] = list("<i4", 2, int32s(int32(n), int32(n)))
	members["data"] = list("<f8", len(values), float64s(values...))
	members["indices"], members["indptr"] = list("<i4", len(indices), int32s(indices...)), list("<i4", len(starts), int32s(starts...))
	return members
}

func BenchmarkWrite(b *testing.B) {
	d := &Dense{Rows: 100000, Cols: 1, Values: make([]float64, 100000)}
	rng := rand.New(rand.NewPCG(7, 7))
	for k := range d.Values {
		d.Values[k] = rng.NormFloat64()
	}
	for _, name := range []string{"x.mtx", "x.npy"} {
		b.Run(name, func(b *testing.B) {
			b.SetBytes(int64(8 * len(d.Values)))
			for b.Loop() {
				if err := WriteDense(filepath.Join(b.TempDir(), name), d, WriteOptions{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
