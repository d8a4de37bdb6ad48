package memory

import (
	"errors"
	"testing"
)

func TestNow(t *testing.T) {
	s, err := Now()
	if errors.Is(err, ErrUnknown) {
		t.Skip(err)
	}
	if err != nil || s.Total <= 0 || s.Free <= 0 || s.Free > s.Total {
		t.Errorf("Now() = %+v, %v, want 0 < free ≤ total", s, err)
	}
}

// The peak never falls, and grows with what is touched.
func TestPeak(t *testing.T) {
	before := Peak()
	if before == 0 {
		t.Skip("this system does not tell")
	}
	const size = 256 << 20
	block := make([]byte, size)
	for i := 0; i < size; i += 4096 {
		block[i] = 1
	}
	if after := Peak(); after < before || after < size {
		t.Errorf("peak %d, then %d after touching %d bytes (%d)", before, after, size, block[size-4096])
	}
}
