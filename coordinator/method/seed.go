package method

// cycleSeed draws a new seed for every cycle: the same sketch for all of them
// would correlate with the residual it has already minimised. Splitmix64;
// "Fast splittable pseudorandom number generators" (OOPSLA 2014).
func cycleSeed(seed uint64, cycle int) uint64 {
	return splitmix(seed ^ splitmix(uint64(cycle)))
}

func splitmix(z uint64) uint64 {
	z += 0x9E3779B97F4A7C15
	z = (z ^ z>>30) * 0xBF58476D1CE4E5B9
	z = (z ^ z>>27) * 0x94D049BB133111EB
	return z ^ z>>31
}
