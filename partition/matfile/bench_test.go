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
