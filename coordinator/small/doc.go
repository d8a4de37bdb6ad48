// Package small solves the dense problems of sketch size that the coordinator
// meets: the QR factorisation of a sketched basis that grows by panels, the
// projected least-squares problem, the condition of the basis and its harmonic
// Ritz directions.
//
// Its nouns: a QR holds Householder reflectors and grows; a Triangle is a view
// of its factor R; a Hessenberg is the projected problem min‖g − R·H·y‖ under
// Givens rotations; a Warm carries singular vectors from one condition estimate
// to the next.
//
// Indices count from zero. Matrices that callers pass are column-major with no
// gap between columns; triangles are packed by columns. Room is made once for
// the largest size, so that Append, Solve and Condition allocate nothing. All
// sums run in a fixed order that depends neither on the processor nor on the
// number of threads: the assembly kernels give the bits of their Go twins.
//
// The package does no I/O, starts no goroutine and has no state of its own. A
// value must not be used by two goroutines at once; different values may.
package small
