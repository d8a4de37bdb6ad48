package matfile

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
)

// Hash returns the SHA-256 of the file as it lies, compressed or not, in
// hexadecimal.
func Hash(path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", fmt.Errorf("hash file: %w", err)
	}
	defer f.Close()
	sum := sha256.New()
	if _, err := io.CopyBuffer(sum, f, make([]byte, 1<<20)); err != nil {
		return "", fmt.Errorf("hash file: %w", err)
	}
	return hex.EncodeToString(sum.Sum(nil)), nil
}
