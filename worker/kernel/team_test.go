package kernel

import (
	"sync/atomic"
	"testing"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func TestStripsCoverRows(t *testing.T) {
	for _, rows := range []int{0, 1, Tile, 8191, 8192, 16383, 16384, 100_000, 262_143, 262_144, 1_000_000, 10_000_001} {
		strips := Strips(rows)
		if len(strips) < 1 || len(strips) > 32 {
			t.Errorf("Strips(%d) has %d strips, want 1 to 32", rows, len(strips))
		}
		at, least, most := 0, rows, 0
		for i, s := range strips {
			if s.Lo != at || s.Hi < s.Lo || (s.Hi%Tile != 0 && s.Hi != rows) {
				t.Errorf("Strips(%d)[%d] = %v after row %d", rows, i, s, at)
			}
			at, least, most = s.Hi, min(least, s.Len()), max(most, s.Len())
		}
		if at != rows {
			t.Errorf("Strips(%d) ends at %d", rows, at)
		}
		if most-least > 2*Tile {
			t.Errorf("Strips(%d) has strips of %d and of %d rows", rows, least, most)
		}
	}
}

func TestTeamRunsEveryStripOnce(t *testing.T) {
	for _, threads := range []int{0, 1, 2, 3, 8} {
		team := NewTeam(threads)
		for _, n := range []int{0, 1, 2, 7, 32, 1000} {
			for range 20 {
				calls := make([]atomic.Int32, n)
				team.Run(n, func(i int) { calls[i].Add(1) })
				for i := range calls {
					if c := calls[i].Load(); c != 1 {
						t.Fatalf("team of %d, %d strips: strip %d ran %d times", threads, n, i, c)
					}
				}
			}
		}
		team.Close()
	}
}

func TestTeamRaisesPanicInCaller(t *testing.T) {
	for _, threads := range []int{1, 2, 4} {
		team := NewTeam(threads)
		for bad := range 6 {
			if got := caught(func() {
				team.Run(6, func(i int) {
					if i == bad {
						panic(i)
					}
				})
			}); got != bad {
				t.Errorf("team of %d, strip %d panics: caller saw %v", threads, bad, got)
			}
		}
		ran := atomic.Int32{}
		team.Run(9, func(int) { ran.Add(1) })
		if ran.Load() != 9 {
			t.Errorf("team of %d after a panic ran %d of 9 strips", threads, ran.Load())
		}
		team.Close()
	}
}

func caught(f func()) (value any) {
	defer func() { value = recover() }()
	f()
	return nil
}

// A sum by strips has the same bits on any number of threads.
func TestSumsDoNotDependOnThreads(t *testing.T) {
	const rows = 100_000
	rng := newRand(3)
	w, cols := vector(rng, rows), columns[float64](rng, rows, 5)
	strips := Strips(rows)
	var first []float64
	for _, threads := range []int{1, 2, 3, 8} {
		team := NewTeam(threads)
		parts := NewPartials(len(strips), 5)
		team.Run(len(strips), func(i int) { Dots(parts.Strip(i), w, cols, strips[i]) })
		team.Close()
		total := make([]float64, 5)
		parts.Total(total)
		if first == nil {
			first = total
		}
		if !sameBits(first, total) {
			t.Errorf("sums on %d threads %v, on one %v", threads, total, first)
		}
	}
}
