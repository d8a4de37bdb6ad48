package small

func gram(w *square, v, c []float64)   { gramGo(w, v, c) }
func update(c, v []float64, w *square) { updateGo(c, v, w) }
