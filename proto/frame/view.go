package frame

import (
	"encoding/binary"
	"unsafe"
)

// bytesOf is the memory of v.
func bytesOf[T float64 | int32](v []T) []byte {
	if len(v) == 0 {
		return nil
	}
	return unsafe.Slice((*byte)(unsafe.Pointer(&v[0])), len(v)*int(unsafe.Sizeof(v[0])))
}

// bigEndian says that this machine stores numbers the other way round.
func bigEndian() bool {
	var b [2]byte
	binary.NativeEndian.PutUint16(b[:], 1)
	return b[1] == 1
}

// swap turns numbers of size bytes between the machine's order and the wire's.
func swap(b []byte, size int) {
	if !bigEndian() {
		return
	}
	reverse(b, size)
}

// reverse turns the bytes of every number of b round.
func reverse(b []byte, size int) {
	for ; len(b) >= size; b = b[size:] {
		for i, j := 0, size-1; i < j; i, j = i+1, j-1 {
			b[i], b[j] = b[j], b[i]
		}
	}
}
