package matfile

import (
	"bytes"
	"encoding/binary"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/klauspost/compress/zip"
)

// sample is the matrix in the files of testdata, which SciPy 1.10 and NumPy 1.24
// wrote from these numbers.
func sample() ([]float64, [][]float64) {
	v := []float64{1.5, -2.25e-7, 3, 4.125, -1.0 / 3, 6e10, 7, 1e-300}
	return v, [][]float64{
		{v[0], 0, 0, v[1], 0}, {0, v[2], 0, 0, 0}, {v[3], 0, v[4], 0, 0}, {0, 0, 0, v[5], 0}, {0, 0, v[6], 0, v[7]}}
}

func TestSparseArchives(t *testing.T) {
	_, want := sample()
	for _, name := range []string{"csr.npz", "csc.npz", "coo.npz", "scipy.rua"} {
		m, h, err := ReadMatrix(filepath.Join("testdata", name), Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if diff := cmp.Diff(want, dense(m)); diff != "" || h.Stored != 8 {
			t.Errorf("%s, %+v: want −, got +:\n%s", name, h, diff)
		}
	}
}

func TestSparseArchiveTypes(t *testing.T) {
	v, _ := sample()
	small := float64(float32(v[1]))
	for name, want := range map[string][][]float64{
		"bool.npz":    {{1, 0, 0, 1}, {0, 1, 0, 0}},
		"float32.npz": {{v[0], 0, 0, small}, {0, v[2], 0, 0}},
		"complex.npz": {{v[0], -v[3], 0, 0, 0, 0, v[1], -v[4]}, {v[3], v[0], 0, 0, 0, 0, v[4], v[1]},
			{0, 0, v[2], -v[5], 0, 0, 0, 0}, {0, 0, v[5], v[2], 0, 0, 0, 0}},
	} {
		m, _, err := ReadMatrix(filepath.Join("testdata", name), Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if diff := cmp.Diff(want, dense(m)); diff != "" {
			t.Errorf("%s: want −, got +:\n%s", name, diff)
		}
	}
	d, _, err := ReadDense(filepath.Join("testdata", "complex.npz"), Options{})
	if err != nil || d.Rows != 4 || d.Cols != 4 || !d.Complex || d.Values[1] != v[3] {
		t.Errorf("as vectors: %+v, %v", d, err)
	}
}

func TestNumPyVectors(t *testing.T) {
	v, _ := sample()
	byColumn := []float64{v[0], v[2], v[4], v[6], v[1], v[3], v[5], v[7]}
	for name, want := range map[string]Dense{
		"vector.npy":    {8, 1, false, v},
		"big.npy":       {8, 1, false, v},
		"version2.npy":  {8, 1, false, v},
		"version3.npy":  {8, 1, false, v},
		"table.npy":     {4, 2, false, byColumn},
		"fortran.npy":   {4, 2, false, byColumn},
		"int16.npy":     {3, 1, false, []float64{1, -2, 300}},
		"complex64.npy": {4, 1, true, []float64{1, 2, 3, -4}},
	} {
		d, h, err := ReadDense(filepath.Join("testdata", name), Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if diff := cmp.Diff(want, *d); diff != "" || h.Rows != d.Rows || h.Cols != d.Cols {
			t.Errorf("%s, %+v: want −, got +:\n%s", name, h, diff)
		}
	}
	m, _, err := ReadMatrix(filepath.Join("testdata", "table.npy"), Options{})
	if err != nil || m.At(3, 1) != v[7] || m.At(1, 0) != v[2] {
		t.Errorf("a table as a matrix: %v, %v", m, err)
	}
}

// npyBytes is a version 1 array with that header text behind and bytes behind it.
func npyBytes(dict string, body []byte) []byte {
	out := append([]byte(npyMagic), 1, 0)
	out = binary.LittleEndian.AppendUint16(out, uint16(len(dict)+1))
	return append(append(append(out, dict...), '\n'), body...)
}

func float64s(values ...float64) (out []byte) {
	for _, v := range values {
		out = binary.LittleEndian.AppendUint64(out, math.Float64bits(v))
	}
	return out
}

func int32s(values ...int32) (out []byte) {
	for _, v := range values {
		out = binary.LittleEndian.AppendUint32(out, uint32(v))
	}
	return out
}

func TestNumPyRefusals(t *testing.T) {
	dict := func(descr, shape string) string {
		return "{'descr': '" + descr + "', 'fortran_order': False, 'shape': " + shape + ", }"
	}
	for name, test := range map[string]struct {
		file []byte
		want string
	}{
		"truncated values":    {npyBytes(dict("<f8", "(3,)"), float64s(1, 2)), "expected 3 elements"},
		"too many values":     {npyBytes(dict("<f8", "(1,)"), float64s(1, 2)), "expected the end of the array"},
		"absurd size":         {npyBytes(dict("<f8", "(2000000000,)"), float64s(1)), "expected 2000000000 elements, found a file of"},
		"beyond any index":    {npyBytes(dict("<f8", "(5000000000,)"), float64s(1)), "expected between 1 and 2147483647 rows"},
		"overflowing shape":   {npyBytes(dict("<f8", "(999999999999,999999999999,)"), nil), "expected a shape that fits a file"},
		"three dimensions":    {npyBytes(dict("<f8", "(1,1,1)"), float64s(1)), "one or two dimensions"},
		"no dimension":        {npyBytes(dict("<f8", "()"), float64s(1)), "one or two dimensions"},
		"no rows":             {npyBytes(dict("<f8", "(0,)"), nil), "expected between 1"},
		"NaN":                 {npyBytes(dict("<f8", "(3,)"), float64s(1, math.NaN(), 2)), "found NaN as element 2"},
		"infinity":            {npyBytes(dict("<c16", "(1,)"), float64s(1, math.Inf(-1))), "found -Inf as element 1"},
		"half precision":      {npyBytes(dict("<f2", "(1,)"), []byte{0, 0}), `found "<f2"`},
		"objects":             {npyBytes(dict("|O", "(1,)"), nil), `found "|O"`},
		"records":             {npyBytes("{'descr': [('a', '<f8')], 'fortran_order': False, 'shape': (1,), }", nil), "expected a NumPy header"},
		"no shape":            {npyBytes("{'descr': '<f8', 'fortran_order': False}", nil), "expected a NumPy header"},
		"negative dimension":  {npyBytes(dict("<f8", "(-1,)"), nil), "expected a NumPy header"},
		"version 9":           {append([]byte(npyMagic), 9, 0), "found version 9"},
		"cut in the header":   {npyBytes(dict("<f8", "(3,)"), nil)[:40], "expected a whole NumPy header"},
		"huge header":         {append([]byte(npyMagic), 2, 0, 255, 255, 255, 255), "at most 65536 bytes"},
		"zip without members": {append([]byte("PK\x05\x06"), make([]byte, 18)...), "a member format.npy"},
		"zip cut off":         {[]byte("PK\x03\x04 and no more"), "expected a whole archive"},
	} {
		t.Run(name, func(t *testing.T) {
			path := write(t, "a.npy", string(test.file))
			_, _, err := ReadDense(path, Options{})
			if err == nil || !strings.Contains(err.Error(), test.want) {
				t.Errorf("error is %v, want %q in it", err, test.want)
			}
			if _, _, err := ReadMatrix(path, Options{}); err == nil {
				t.Error("ReadMatrix accepts it")
			}
		})
	}
}

// npz builds an archive of version 1 arrays: name, header text, bytes.
func npz(t testing.TB, members map[string][2]string) []byte {
	t.Helper()
	var out bytes.Buffer
	z := zip.NewWriter(&out)
	for _, name := range []string{"format", "shape", "data", "indptr", "indices", "row", "col"} {
		m, ok := members[name]
		if !ok {
			continue
		}
		w, err := z.Create(name + ".npy")
		if err == nil {
			_, err = w.Write(npyBytes(m[0], []byte(m[1])))
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return out.Bytes()
}

// goodArchive is [[1, 0], [2, 3]] as CSR.
func goodArchive() map[string][2]string {
	list := func(descr, n string) string {
		return "{'descr': '" + descr + "', 'fortran_order': False, 'shape': (" + n + ",), }"
	}
	return map[string][2]string{
		"format":  {"{'descr': '|S3', 'fortran_order': False, 'shape': (), }", "csr"},
		"shape":   {list("<i4", "2"), string(int32s(2, 2))},
		"data":    {list("<f8", "3"), string(float64s(1, 2, 3))},
		"indptr":  {list("<i4", "3"), string(int32s(0, 1, 3))},
		"indices": {list("<i4", "3"), string(int32s(0, 0, 1))},
	}
}

func TestSparseArchiveRefusals(t *testing.T) {
	path := write(t, "good.npz", string(npz(t, goodArchive())))
	if m, _, err := ReadMatrix(path, Options{}); err != nil || m.At(1, 1) != 3 {
		t.Fatalf("the good archive: %v, %v", m, err)
	}
	for name, test := range map[string]struct {
		member, header, body, want string
	}{
		"other format":       {"format", "", "bsr", `found "bsr"`},
		"no format":          {"format", "-", "", "a member format.npy"},
		"no indices":         {"indices", "-", "", "a member indices.npy"},
		"index beyond":       {"indices", "", string(int32s(0, 0, 2)), "indices of a 2 by 2 matrix, from 0, found row 1, column 2"},
		"negative index":     {"indices", "", string(int32s(0, -1, 1)), "column -1"},
		"first start":        {"indptr", "", string(int32s(1, 1, 3)), "expected 0 as the first start, found 1"},
		"descending starts":  {"indptr", "", string(int32s(0, 2, 1)), "row 2: expected starts that ascend to 3, found 1 after 2"},
		"starts too far":     {"indptr", "", string(int32s(0, 1, 4)), "found 4 after 1"},
		"starts too short":   {"indptr", "", string(int32s(0, 1, 2)), "expected another index"},
		"too few starts":     {"indptr", "2", string(int32s(0, 3)), "expected 3 starts, found 2"},
		"too few indices":    {"indices", "2", string(int32s(0, 1)), "expected 3 elements, as many as values, found 2"},
		"absurd shape":       {"shape", "", string(int32s(2, -2)), "expected between 1 and"},
		"shape does not fit": {"shape", "", string(int32s(2000000000, 2)), "expected 2000000001 starts, found 3"},
		"cut member":         {"data", "", string(float64s(1, 2)), "the end of the array after 2"},
		"long member":        {"data", "", string(float64s(1, 2, 3, 4)), "expected the end of the array"},
		"NaN":                {"data", "", string(float64s(1, math.NaN(), 3)), "found NaN as element 2"},
	} {
		t.Run(name, func(t *testing.T) {
			members := goodArchive()
			m := members[test.member]
			if test.header != "" {
				m[0] = strings.Replace(m[0], "(3,)", "("+test.header+",)", 1)
			}
			m[1] = test.body
			members[test.member] = m
			if test.header == "-" {
				delete(members, test.member)
			}
			_, _, err := ReadMatrix(write(t, "a.npz", string(npz(t, members))), Options{})
			if err == nil || !strings.Contains(err.Error(), test.want) {
				t.Errorf("error is %v, want %q in it", err, test.want)
			}
		})
	}
	if _, _, err := ReadMatrix(filepath.Join("testdata", "bsr.npz"), Options{}); err == nil || !strings.Contains(err.Error(), "csr, csc or coo") {
		t.Errorf("a block archive: %v", err)
	}
}

// A flipped bit in an archive is found by its checksum or by what it breaks.
func TestDamagedArchiveIsNeverAccepted(t *testing.T) {
	good, err := os.ReadFile(filepath.Join("testdata", "csr.npz"))
	if err != nil {
		t.Fatal(err)
	}
	_, want := sample()
	for at := 0; at < len(good); at += 7 {
		bad := bytes.Clone(good)
		bad[at] ^= 0x10
		m, _, err := ReadMatrix(write(t, "a.npz", string(bad)), Options{})
		if err == nil && cmp.Diff(want, dense(m)) != "" {
			t.Errorf("byte %d flipped: read as %v", at, dense(m))
		}
	}
}
