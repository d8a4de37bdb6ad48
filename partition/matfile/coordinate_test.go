package matfile

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// What the fast reader of a line accepts, the careful one reads alike.
func TestFastLineIsTheSlowLine(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		g := &coordinates{rows: rapid.IntRange(1, 12).Draw(t, "rows"), cols: math.MaxInt32, base: rapid.IntRange(0, 1).Draw(t, "base"),
			values: rapid.IntRange(0, 2).Draw(t, "values"), integer: rapid.Bool().Draw(t, "integer"), comments: "%"}
		line := rapid.StringMatching(`[ \t]{0,2}[0-9]{0,3}[ \t]{0,2}[0-9]{0,11}[ \t]{0,2}([-+]?[0-9.]{0,4}([eEdD][-+]?[0-9]{0,3})?[ \t\r%x]{0,2}){0,3}`).Draw(t, "line")
		var fast, slow entry
		next, ok := g.fastLine([]byte(line+"\n"), 0, &fast)
		if !ok {
			return
		}
		skip, err := g.slowLine([]byte(line), &slow)
		if skip || err != nil || fmt.Sprint(fast) != fmt.Sprint(slow) || next != len(line)+1 {
			t.Fatalf("%q: fast %v to byte %d, slow %v, skip %v, %v", line, fast, next, slow, skip, err)
		}
	})
}

// Lines as programs write them take the fast way.
func TestUsualLinesAreFast(t *testing.T) {
	g := &coordinates{rows: 2000, cols: 2000, base: 1, values: 1, comments: "%"}
	for _, line := range []string{"1 1 1", "12 345 -1.5e+00", "  1999  2000  1.2345678901234567e-12 ", "3\t4\t5", "1 2 3\r"} {
		var e entry
		if _, ok := g.fastLine([]byte(line+"\n"), 0, &e); !ok {
			t.Errorf("%q is read slowly", line)
		}
	}
}

// Rows of any length, with any duplicates, are sorted and summed as csr does it.
func TestAssemblyProperty(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rows, cols := rapid.IntRange(1, 5).Draw(t, "rows"), rapid.IntRange(1, 60).Draw(t, "columns")
		var text bytes.Buffer
		n := rapid.IntRange(0, 300).Draw(t, "entries")
		fmt.Fprintf(&text, "%s%d %d %d\n", coordinate, rows, cols, n)
		for k := range n {
			i, j := rapid.IntRange(1, rows).Draw(t, "i"), rapid.IntRange(1, cols).Draw(t, "j")
			fmt.Fprintf(&text, "%d %d %v\n", i, j, math.Ldexp(1+float64(k)/7, k%50))
		}
		checkAssembly(t, text.Bytes())
	})
}

func checkAssembly(t *rapid.T, text []byte) {
	path, remove := temporary(t, text)
	defer remove()
	o := Options{Threads: 2, ChunkSize: 500}
	m, h, err := ReadMatrix(path, o)
	if err != nil {
		t.Fatal(err)
	}
	r, err := Open(path, o)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	all, part := csr.Triplets{}, csr.Triplets{}
	for r.Next(&part) == nil {
		all.I, all.J, all.V = append(all.I, part.I...), append(all.J, part.J...), append(all.V, part.V...)
	}
	want := all.Matrix(h.Rows, h.Cols)
	if fmt.Sprint(want.Start, want.Col, want.Val) != fmt.Sprint(m.Start, m.Col, m.Val) {
		t.Fatalf("want %v\ngot %v", want, m)
	}
}

// temporary writes text to a file of its own.
func temporary(t *rapid.T, text []byte) (string, func()) {
	f, err := os.CreateTemp("", "matfile")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := f.Write(text); err != nil {
		t.Fatal(err)
	}
	f.Close()
	return f.Name(), func() { os.Remove(f.Name()) }
}
