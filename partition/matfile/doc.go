// Package matfile reads and writes matrices and vectors in the files the trade
// uses: Matrix Market, Harwell-Boeing and Rutherford-Boeing, plain triplets,
// SciPy sparse archives and NumPy arrays, the text ones also inside gzip or
// Zstandard.
//
// A Reader streams a matrix in chunks of entries, in file order and in bounded
// memory, whatever the file's size; ReadMatrix and ReadDense hold the whole.
// Formats are told by content, never by name alone. Indices given to callers
// are zero-based; lines and rows in error messages count from one, as an editor
// shows them.
//
// Symmetric, skew-symmetric and hermitian files are expanded to all entries. A
// complex matrix comes out in its equivalent real form, interleaved: unknown k
// becomes the rows and columns 2k (real part) and 2k+1 (imaginary part), the
// entry a+bi the block [a −b; b a]; a complex vector is interleaved (re, im).
//
// Nothing is allocated on a header's word: memory grows with what was read. A
// malformed file is refused with a *FileError. Writers leave either the whole
// file or nothing.
//
// The package does no arithmetic on matrices but the sum of duplicates. A
// Reader belongs to one goroutine; it starts its own for reading and parsing
// and Close waits for them.
package matfile

import "runtime"

// IndexBase says from where plain triplets count their rows and columns.
type IndexBase int

// The index bases of plain triplets. Unknown means: zero-based where an index 0
// stands in the file, otherwise refused with the flag that tells.
const (
	UnknownBase IndexBase = iota
	ZeroBased
	OneBased
)

// Options say how to read. The zero value is the default.
type Options struct {
	IndexBase IndexBase // of plain triplets; other formats state their own
	Threads   int       // goroutines that parse, default one a processor
	ChunkSize int       // bytes of text a chunk, default 512 KiB; the longest line allowed is 1 MiB more
}

const (
	defaultChunk = 512 << 10
	longestLine  = 1 << 20
)

func (o Options) threads() int {
	if o.Threads > 0 {
		return o.Threads
	}
	return runtime.GOMAXPROCS(0)
}

func (o Options) chunk() int {
	if o.ChunkSize > 0 {
		return o.ChunkSize
	}
	return defaultChunk
}

// Header is what a file says of itself.
type Header struct {
	Path        string
	Format      string // "matrix market", "harwell-boeing", "triplets", "npz", "npy", "numbers"
	Layout      string // "coordinate", "array", "csr", "csc", "coo"
	Compression string // "", "gzip", "zstd"
	Field       string // "real", "integer", "pattern", "complex"
	Symmetry    string // "general", "symmetric", "skew-symmetric", "hermitian"
	Rows, Cols  int    // as delivered: of the real form when Complex
	Stored      int64  // entries as the file counts them, before expansion
	Complex     bool   // Rows (and the columns of a matrix) are twice the file's
	Dense       bool   // every position is stored; zeros are not delivered as entries
	Title       string // title or first comment, at most 200 bytes
}
