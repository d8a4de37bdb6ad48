package report

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"
)

// Text returns the summary for a person: the verdict first, then what supports
// it, what was chosen and why, where the files are, and the caution.
func (r *Record) Text() string {
	var b strings.Builder
	b.WriteString(r.headline() + "\n")
	if r.Advice != "" && r.Verdict != Met {
		b.WriteString("What to try: " + r.Advice + "\n")
	}
	r.writeResiduals(&b)
	r.writeSides(&b)
	r.writeEffort(&b)
	r.writeChoices(&b)
	r.writeFiles(&b)
	b.WriteString("\n" + fold(Caution, 78) + "\n")
	return b.String()
}

// headline is the verdict in one sentence.
func (r *Record) headline() string {
	tol := short(r.Tolerance, 3)
	switch {
	case r.Verdict == Met && r.Job == "audit":
		return "met: the answer satisfies the equations to " + tol + "."
	case r.Verdict == Met:
		return "met: the equations are solved to " + tol + "."
	case r.Verdict == Short && r.Job == "audit":
		return "short: the answer does not satisfy the equations to " + tol + "."
	case r.Verdict == Short && r.Reason != "":
		return "short: the tolerance " + tol + " was not reached: " + r.Reason + "."
	case r.Verdict == Short:
		return "short: the tolerance " + tol + " was not reached."
	case r.Error != "":
		return "none: " + r.Error
	case r.Reason != "":
		return "none: nothing was solved: " + r.Reason + "."
	}
	return "none: nothing was solved."
}

// writeResiduals puts both residuals beside the tolerance, then what they
// cannot prove.
func (r *Record) writeResiduals(b *strings.Builder) {
	if r.Verdict == None {
		return
	}
	x := r.Residuals
	b.WriteString("\n")
	row := func(name string, v Number, note string) {
		writeTrimmed(b, "  %-30s %-10s %s", name, short(v, 3), note)
	}
	against := func(v Number) string {
		if v.Finite() && v <= r.Tolerance {
			return "within " + short(r.Tolerance, 3)
		}
		return "above " + short(r.Tolerance, 3)
	}
	row("residual, units of the file", x.True, against(x.True))
	row("residual, rows scaled to 1", x.Scaled, against(x.Scaled))
	row("worst row by its own size", x.RowWise, worstRows(x.Worst))
	row("backward error", x.Backward, "")
	fmt.Fprintf(b, "  %-30s %s\n", "digits of x", r.digits())
	if r.KnownError.Finite() {
		row("error against the known answer", r.KnownError, "x = (1, …, 1)")
	}
}

// digits bounds the digits of x by the residual and the condition; a lower bound
// of the condition gives an upper one of the digits.
func (r *Record) digits() string {
	x := r.Residuals
	if !x.ConditionHint.Finite() || x.ConditionHint <= 0 {
		return "not known (no estimate of the condition)"
	}
	if !x.ForwardError.Finite() || x.ForwardError <= 0 {
		return fmt.Sprintf("not known (the condition is at least %s)", short(x.ConditionHint, 2))
	}
	condition := fmt.Sprintf("(the condition is at least %s)", short(x.ConditionHint, 2))
	count := int(math.Floor(-math.Log10(float64(x.ForwardError))))
	if count < 1 {
		return "none " + condition
	}
	return fmt.Sprintf("at most about %d %s", min(count, 16), condition)
}

// worstRows names up to four rows as files count them.
func worstRows(rows []Row) string {
	if len(rows) == 0 {
		return ""
	}
	names := make([]string, 0, 4)
	for _, row := range rows {
		// A complex row stands for two real ones.
		if name := fmt.Sprint(row.Row + 1); len(names) < 4 && !slices.Contains(names, name) {
			names = append(names, name)
		}
	}
	noun := "row "
	if len(names) > 1 {
		noun = "rows "
	}
	return noun + strings.Join(names, ", ") + ", counted from 1 as in the file"
}

// writeSides lists the right sides one by one when there are several.
func (r *Record) writeSides(b *strings.Builder) {
	if len(r.Sides) < 2 {
		return
	}
	fmt.Fprintf(b, "\n%d right sides; the figures above are those of the worst.\n", len(r.Sides))
	for _, s := range r.Sides {
		writeTrimmed(b, "  column %-4d %-6s %-10s %-10s %s  %s", s.Column+1, s.Verdict,
			short(s.Residuals.True, 3), short(s.Residuals.Scaled, 3), plural(s.Products, "product"), s.Reason)
	}
}

// writeEffort says what was solved and what it took.
func (r *Record) writeEffort(b *strings.Builder) {
	if r.Rows == 0 {
		return
	}
	if r.Complex {
		fmt.Fprintf(b, "\n  %s (%d real ones), %s, %s of the real form", plural(r.Rows/2, "complex equation"), r.Rows, plural(r.Columns/2, "unknown"), entriesText(r.Entries))
	} else {
		fmt.Fprintf(b, "\n  %s, %s, %s", plural(r.Rows, "equation"), plural(r.Columns, "unknown"), entriesText(r.Entries))
	}
	for _, in := range r.Inputs {
		if in.Role == "matrix" {
			fmt.Fprintf(b, " (%s)", filepath.Base(in.Path))
		}
	}
	b.WriteString("\n")
	if r.Verdict == None || r.Job == "audit" {
		return
	}
	fmt.Fprintf(b, "  %s, %s (%d full), %s, %s\n", plural(r.Products, "product"), plural(r.Steps, "step"), r.FullSteps,
		plural(r.Cycles, "cycle"), Span(float64(r.Seconds.Total)))
}

// writeChoices lists every setting with its reason, the ones chosen by the
// program first.
func (r *Record) writeChoices(b *strings.Builder) {
	if len(r.Choices) == 0 {
		return
	}
	b.WriteString("\nWhat was chosen, and why\n")
	for _, asked := range []bool{false, true} {
		for _, c := range r.Choices {
			if c.Asked != asked {
				continue
			}
			reason := c.Reason
			if asked {
				reason = "as asked"
				if c.Reason != "" {
					reason += "; " + c.Reason
				}
			}
			writeTrimmed(b, "  %-13s %-12s %s", c.Name, c.Value, reason)
		}
	}
}

// writeFiles says where answer and record are.
func (r *Record) writeFiles(b *strings.Builder) {
	if r.Job == "audit" || r.Answer == "" && r.ID == "" {
		return
	}
	b.WriteString("\n")
	if r.Answer != "" {
		fmt.Fprintf(b, "Answer: %s\n", r.Answer)
	}
	if r.AnswerNote != "" {
		fmt.Fprintf(b, "        %s\n", r.AnswerNote)
	}
	if r.ID != "" {
		fmt.Fprintf(b, "Record: %s  (rowstead show %s)\n", r.Path, r.ID)
	}
}

// writeTrimmed writes one line without blanks at its end.
func writeTrimmed(b *strings.Builder, format string, values ...any) {
	b.WriteString(strings.TrimRight(fmt.Sprintf(format, values...), " ") + "\n")
}

// entriesText writes a count of entries.
func entriesText(n int) string {
	if n == 1 {
		return "1 entry"
	}
	return fmt.Sprintf("%d entries", n)
}

// plural writes a count with its noun.
func plural(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// fold breaks a text at spaces into lines of at most width characters; a longer
// word has a line of its own.
func fold(text string, width int) string {
	var b strings.Builder
	column := 0
	for i, word := range strings.Fields(text) {
		n := len([]rune(word))
		switch {
		case i == 0:
		case column+1+n > width:
			b.WriteByte('\n')
			column = 0
		default:
			b.WriteByte(' ')
			column++
		}
		b.WriteString(word)
		column += n
	}
	return b.String()
}
