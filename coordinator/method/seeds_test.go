//go:build !slow

package method_test

// everySeed: only the slow suite solves all random systems.
const everySeed = false
