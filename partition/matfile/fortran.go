package matfile

import (
	"bytes"
	"strings"
)

// fortranField is one edit descriptor of a Fortran format: where a number
// stands on a line and how it is read. Source: the Fortran 77 standard, chapter
// 13, from memory.
type fortranField struct {
	from, to int  // columns [from, to) of the line, zero-based
	kind     byte // 'I', 'E', 'D', 'F' or 'G'
	decimals int  // digits behind the point where none is written
	scale    int  // kP: without an exponent the value is divided by 10^k
}

// mostFields bounds the descriptors of one line; formats with 80 columns have
// at most 80.
const mostFields = 1024

// parseFortran returns the fields of one line in a format such as (16I5),
// (1P,4D20.12), (8E10.3) or (4(1X,E19.12)); nil where it is none.
func parseFortran(format string) []fortranField {
	text := strings.ToUpper(strings.ReplaceAll(strings.TrimSpace(format), " ", ""))
	if !strings.HasPrefix(text, "(") || !strings.HasSuffix(text, ")") {
		return nil
	}
	p := formatParser{text: text[1 : len(text)-1]}
	p.list(0)
	if p.failed || p.text != "" {
		return nil
	}
	return p.fields
}

// formatParser holds what is left of a format and what was read of it.
type formatParser struct {
	text   string
	fields []fortranField
	column int
	scale  int
	failed bool
}

// list reads items up to a closing parenthesis or the end.
func (p *formatParser) list(depth int) {
	for p.text != "" && p.text[0] != ')' && !p.failed {
		if p.text[0] == ',' {
			p.text = p.text[1:]
			continue
		}
		p.item(depth)
	}
}

// item reads nX, kP, r(list) or rIw, rEw.dEe and the like.
func (p *formatParser) item(depth int) {
	negative := strings.HasPrefix(p.text, "-")
	if negative || strings.HasPrefix(p.text, "+") {
		p.text = p.text[1:]
	}
	count, given := p.number()
	if !given {
		count = 1
	}
	if p.text == "" || negative && p.text[0] != 'P' {
		p.failed = true
		return
	}
	letter := p.text[0]
	p.text = p.text[1:]
	switch letter {
	case 'P':
		p.scale = count
		if negative {
			p.scale = -count
		}
	case 'X':
		p.column += count
	case '(':
		p.group(count, depth)
	case 'I', 'E', 'D', 'F', 'G':
		p.descriptors(letter, count)
	default:
		p.failed = true
	}
}

// group repeats a list in parentheses.
func (p *formatParser) group(count, depth int) {
	start := p.text
	for k := 0; k < count && depth < 4 && !p.failed; k++ {
		p.text = start
		p.list(depth + 1)
		if !strings.HasPrefix(p.text, ")") || len(p.fields) > mostFields {
			p.failed = true
			return
		}
		p.text = p.text[1:]
	}
	p.failed = p.failed || count == 0 || depth >= 4
}

// descriptors reads w[.d][Ee] and adds count fields.
func (p *formatParser) descriptors(letter byte, count int) {
	width, ok := p.number()
	decimals := 0
	if ok && strings.HasPrefix(p.text, ".") {
		p.text = p.text[1:]
		decimals, ok = p.number()
	}
	if ok && letter != 'I' && strings.HasPrefix(p.text, "E") {
		p.text = p.text[1:]
		_, ok = p.number()
	}
	if !ok || width < 1 || count < 1 || len(p.fields)+count > mostFields {
		p.failed = true
		return
	}
	if letter == 'I' {
		decimals = 0
	}
	for range count {
		p.fields = append(p.fields, fortranField{from: p.column, to: p.column + width, kind: letter, decimals: decimals, scale: p.scale})
		p.column += width
	}
}

// number reads up to three digits.
func (p *formatParser) number() (int, bool) {
	n, v := 0, 0
	for n < len(p.text) && n < 3 && p.text[n] >= '0' && p.text[n] <= '9' {
		v = v*10 + int(p.text[n]-'0')
		n++
	}
	p.text = p.text[n:]
	return v, n > 0
}

// cut returns the field's columns of a line, without blanks around.
func (f fortranField) cut(line []byte) []byte {
	if f.from >= len(line) {
		return nil
	}
	return bytes.TrimSpace(line[f.from:min(f.to, len(line))])
}

// real converts the text of a field, which may have an implied point, a scale,
// blanks inside and an exponent without letter. scratch is the caller's and may
// be used again.
func (f fortranField) real(text []byte, scratch *[]byte) (float64, bool) {
	b := (*scratch)[:0]
	point, exponent := false, 0
	mark := -1 // where the exponent begins
	for k, c := range text {
		switch {
		case c == ' ':
			continue
		case c == '.':
			point = true
		case mark < 0 && (c|0x20 == 'e' || c|0x20 == 'd' || c|0x20 == 'q'):
			mark = len(b)
			b = append(b, 'e')
			continue
		case mark < 0 && k > 0 && len(b) > 0 && (c == '+' || c == '-'):
			mark = len(b)
			b = append(b, 'e')
		}
		b = append(b, c)
	}
	if !point {
		exponent = -f.decimals
	}
	if mark < 0 {
		exponent -= f.scale
	}
	if exponent != 0 {
		b = shiftExponent(b, mark, exponent)
	}
	b = append(b, '\n')
	*scratch = b
	v, next, ok := scanFloat(b, 0)
	return v, ok && next == len(b)-1
}

// shiftExponent multiplies the number in b, whose exponent begins at mark (−1:
// none), by 10^by, in the text.
func shiftExponent(b []byte, mark, by int) []byte {
	if mark >= 0 {
		e, next, ok := scanExponent(append(b, '\n'), mark+1)
		if !ok || next != len(b) {
			return append(b, '?') // refused by scanFloat's caller
		}
		by += e
		b = b[:mark]
	}
	b = append(b, 'e')
	if by < 0 {
		b = append(b, '-')
		by = -by
	}
	digits := [8]byte{}
	n := len(digits)
	for by > 0 || n == len(digits) {
		n--
		digits[n] = byte('0' + by%10)
		by /= 10
	}
	return append(b, digits[n:]...)
}
