// Package fixed is arithmetic that gives the same bits on every processor: a
// counter hash, uniform and normal numbers made from it, and the few elementary
// functions that model jobs and test problems need.
//
// A number of a stream follows from (seed, index) alone, so rows may be made in
// any order, in parts, on any machine. Every product that is added to something
// is rounded first, float64(a*b) + c, because compilers may otherwise fuse the
// two on some processors. The functions are accurate to a few units in the last
// place, not correctly rounded. Nothing here holds state; everything may be
// called from many goroutines.
package fixed

// Mix is the splitmix64 finaliser of z plus its golden-ratio increment: a
// bijection of the 64-bit words that passes for random. Steele, Lea and Flood,
// Fast splittable pseudorandom number generators, 2014.
func Mix(z uint64) uint64 {
	z += 0x9e3779b97f4a7c15
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}

// Stream is a sequence of random words; word i is at hand without its
// predecessors. Two different names of streams are independent for all uses
// here.
type Stream uint64

// NewStream returns the stream of the given number under seed.
func NewStream(seed, number uint64) Stream {
	return Stream(Mix(Mix(seed) ^ Mix(^number)))
}

// Word is word i of the stream.
func (s Stream) Word(i int) uint64 { return Mix(uint64(s) + Mix(uint64(i))) }

// Uniform is number i of the stream, uniform in the open interval (0, 1): an odd
// multiple of 2⁻⁵³.
func (s Stream) Uniform(i int) float64 {
	return float64(float64(s.Word(i)>>12)*0x1p-52) + 0x1p-53
}

// Between is number i of the stream, uniform in (lo, hi).
func (s Stream) Between(i int, lo, hi float64) float64 {
	return lo + float64((hi-lo)*s.Uniform(i))
}

// Below is number i of the stream, an integer uniform in [0, n) up to a bias of
// n·2⁻⁵³. n > 0.
func (s Stream) Below(i, n int) int {
	return int(float64(s.Word(i)>>11) * 0x1p-53 * float64(n))
}

// PowerOfTen is 10 to a power that is number i of the stream, uniform in
// (lo, hi): log-uniform over hi − lo decades.
func (s Stream) PowerOfTen(i int, lo, hi float64) float64 {
	return Exp10(s.Between(i, lo, hi))
}
