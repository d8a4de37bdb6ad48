package samples

import "testing"

// BenchmarkRows makes the rows of each job at 100,000 unknowns; bytes are those
// of the entries, 12 each.
func BenchmarkRows(b *testing.B) {
	for _, name := range Names() {
		b.Run(name, func(b *testing.B) {
			m, err := Open(name, 100000)
			if err != nil {
				b.Fatal(err)
			}
			b.SetBytes(12 * int64(m.Entries()))
			b.ReportAllocs()
			for b.Loop() {
				if err := m.EachRow(func(int, []int32, []float64) error { return nil }); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(m.Rows())*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
		})
	}
}
