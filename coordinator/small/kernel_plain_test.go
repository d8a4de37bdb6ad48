//go:build !amd64 || noasm

package small

func nativeKernels() []kernels { return nil }
