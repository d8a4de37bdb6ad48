//go:build !amd64 || noasm

package small

// gram adds Vᵀ·C to w, see gramGo; v and c have the same length.
func gram(w *square, v, c []float64) { gramGo(w, v, c) }

// update subtracts V·W from C, see updateGo; c and v have the same length.
func update(c, v []float64, w *square) { updateGo(c, v, w) }
