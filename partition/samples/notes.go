package samples

import (
	"fmt"
	"strings"
)

// office heads every note. It is invented, like all it works on.
const office = "Tarn Street Engineers, Ostervale (an invented office)"

// caution ends every note.
const caution = "A solved system is not a checked design; the responsible engineer decides."

// story is what an analyst writes beside the files of a job. Every field is one
// paragraph.
type story struct {
	sheet      string // number and title of the job
	question   string // what is asked, by whom
	model      string // equations, grid, materials
	boundaries string // boundary conditions and loads
	rows       string // what an equation says, units of A and b
	reading    string // how to find entry k of x
	use        string // what the answer is for
	watch      string // what is hard or treacherous about the system
	codes      string // further duties; may be empty
}

// text sets the paragraphs under their headings, in lines of at most 80
// characters.
func (s story) text(m *Model) string {
	var out strings.Builder
	paragraph := func(heading, body string) {
		if body != "" {
			out.WriteString("\n" + heading + "\n" + wrap(body, "  ", 80))
		}
	}
	out.WriteString(office + "\n" + s.sheet + "\n")
	fmt.Fprintf(&out, "%d unknowns, matrix %s\n", m.Rows(), m.kind())
	paragraph("Question", s.question)
	paragraph("Model", s.model)
	paragraph("Boundaries and loads", s.boundaries)
	paragraph("Equations", s.rows)
	paragraph("Reading the answer", s.reading+" "+m.plausible())
	paragraph("Use", s.use)
	paragraph("Watch", s.watch)
	paragraph("Caution", strings.TrimSpace(s.codes+" "+caution))
	return out.String()
}

func (i Info) kind() string {
	switch {
	case i.Definite:
		return "symmetric positive definite"
	case i.Symmetric:
		return "symmetric, not definite"
	}
	return "not symmetric"
}

// plausible is the sentence on plausible values.
func (i Info) plausible() string {
	var parts []string
	for _, u := range i.Unknowns {
		parts = append(parts, fmt.Sprintf("%s between %g and %g %s", u.Symbol, u.Low, u.High, u.Unit))
	}
	return "A plausible answer has " + strings.Join(parts, "; ") + ". Anything outside is a mistake in the model or an answer that is not one."
}

// wrap breaks text between words.
func wrap(text, indent string, width int) string {
	var out strings.Builder
	column := 0
	for _, word := range strings.Fields(text) {
		switch {
		case column == 0:
			out.WriteString(indent)
			column = len(indent)
		case column+1+len([]rune(word)) > width:
			out.WriteString("\n" + indent)
			column = len(indent)
		default:
			out.WriteString(" ")
			column++
		}
		out.WriteString(word)
		column += len([]rune(word))
	}
	return out.String() + "\n"
}
