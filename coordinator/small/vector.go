package small

import "math"

// norm is ‖x‖₂ in four lanes; infinite when the squares overflow.
func norm(x []float64) float64 { return math.Sqrt(dot(x, x)) }

// normalise divides x by its norm and returns the norm. A zero vector stays.
func normalise(x []float64) float64 {
	n := norm(x)
	if n > 0 {
		scaleBy(x, 1/n)
	}
	return n
}

func scaleBy(x []float64, f float64) {
	for i := range x {
		x[i] *= f
	}
}

// noise is number i of a fixed sequence, uniform in [−1, 1): the splitmix64
// finaliser (Steele, Lea and Flood, Fast splittable pseudorandom number
// generators, 2014) of seed and i.
func noise(seed, i uint64) float64 {
	z := seed + (i+1)*0x9e3779b97f4a7c15
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	z ^= z >> 31
	return float64(int64(z)) * 0x1p-63
}

func isFinite(x float64) bool { return !math.IsInf(x, 0) && !math.IsNaN(x) }

func allFinite(x []float64) bool {
	for _, a := range x {
		if !isFinite(a) {
			return false
		}
	}
	return true
}
