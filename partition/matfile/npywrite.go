package matfile

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strings"
)

// npyAlign is what NumPy aligns the first element to.
const npyAlign = 64

// denseNpy writes a version 1.0 array, little-endian: one dimension for one
// vector, else two in column-major order; complex pairs as complex128.
func denseNpy(out io.Writer, d *Dense) error {
	descr, rows := "<f8", d.Rows
	if d.Complex {
		descr, rows = "<c16", d.Rows/2
	}
	order, shape := "False", fmt.Sprintf("(%d,)", rows)
	if d.Cols != 1 {
		order, shape = "True", fmt.Sprintf("(%d, %d)", rows, d.Cols)
	}
	dict := fmt.Sprintf("{'descr': '%s', 'fortran_order': %s, 'shape': %s, }", descr, order, shape)
	start := len(npyMagic) + 4
	dict += strings.Repeat(" ", npyAlign-(start+len(dict)+1)%npyAlign) + "\n"
	head := append([]byte(npyMagic), 1, 0)
	head = binary.LittleEndian.AppendUint16(head, uint16(len(dict)))
	if _, err := out.Write(append(head, dict...)); err != nil {
		return err
	}
	buffer := make([]byte, 0, 32<<10)
	for _, v := range d.Values {
		buffer = binary.LittleEndian.AppendUint64(buffer, math.Float64bits(v))
		if len(buffer) == cap(buffer) {
			if _, err := out.Write(buffer); err != nil {
				return err
			}
			buffer = buffer[:0]
		}
	}
	_, err := out.Write(buffer)
	return err
}
