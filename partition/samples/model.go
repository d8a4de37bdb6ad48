package samples

import "fmt"

// Model is a job at a chosen size whose rows are made on demand. It holds a few
// hundred kilobytes, whatever the size.
type Model struct {
	Info
	gen generator
}

// Open prepares the job of that name with about size unknowns, the nearest that
// its grid allows; 0 takes the job's default. An unknown name and a size outside
// [Smallest, Largest] are errors.
func Open(name string, size int) (*Model, error) {
	j, err := find(name)
	if err != nil {
		return nil, err
	}
	if size == 0 {
		size = j.info.DefaultSize
	}
	if size < Smallest || size > Largest {
		return nil, fmt.Errorf("%s of %d unknowns: a model job has between %d and %d", name, size, Smallest, Largest)
	}
	return &Model{Info: j.info, gen: j.build(size)}, nil
}

// Rows is the number of unknowns and of equations.
func (m *Model) Rows() int { return m.gen.unknowns() }

// Each calls yield with every row in order: the columns, ascending, their
// values, and the right side. The slices are reused in the next call. An error
// of yield ends the walk and is returned as it is.
func (m *Model) Each(yield func(row int, cols []int32, vals []float64, right float64) error) error {
	var l line
	for k := range m.Rows() {
		l.reset()
		m.gen.row(k, &l)
		if err := yield(k, l.cols, l.vals, l.right); err != nil {
			return err
		}
	}
	return nil
}

// EachRow is Each without the right side.
func (m *Model) EachRow(yield func(row int, cols []int32, vals []float64) error) error {
	return m.Each(func(row int, cols []int32, vals []float64, _ float64) error { return yield(row, cols, vals) })
}

// Entries counts the entries of A by making every row once.
func (m *Model) Entries() int {
	var l line
	count := 0
	for k := range m.Rows() {
		l.reset()
		m.gen.row(k, &l)
		count += len(l.cols)
	}
	return count
}

// Right makes b, length Rows.
func (m *Model) Right() []float64 {
	b := make([]float64, m.Rows())
	var l line
	for k := range b {
		l.reset()
		m.gen.row(k, &l)
		b[k] = l.right
	}
	return b
}

// Label says what entry k of x is, for a file of labels: the unknown, where it
// is, its unit. 0 ≤ k < Rows.
func (m *Model) Label(k int) string { return m.gen.label(k) }

// Notes is the text that belongs beside the files: the question, the model, the
// units, how to read the answer, and its caution.
func (m *Model) Notes() string { return m.gen.story().text(m) }

// line is one row under construction.
type line struct {
	cols  []int32
	vals  []float64
	right float64
}

func (l *line) reset() { l.cols, l.vals, l.right = l.cols[:0], l.vals[:0], 0 }

func (l *line) add(col int, v float64) {
	l.cols, l.vals = append(l.cols, int32(col)), append(l.vals, v)
}
