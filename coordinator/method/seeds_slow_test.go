//go:build slow

package method_test

const everySeed = true
