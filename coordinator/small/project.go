package small

// Project sets out to all Columns entries of Qᵀ·v and returns the norm of the
// part of v outside the span of the columns, which no difference of squares
// could give to full precision. len(out) = Columns, len(v) = Rows; v stays.
func (q *QR) Project(v, out []float64) (outside float64) {
	if len(out) != q.columns {
		panic("small: Project needs len(out) = columns")
	}
	q.TransposeApply(v, out)
	return norm(q.vector[q.columns:])
}
