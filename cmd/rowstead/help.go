package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// helpWidth is the widest line of a help text.
const helpWidth = 88

// showHelp prints the help of a command in our own layout: what it does, how it
// is called, what it takes, an example.
func showHelp(w io.Writer, c *cobra.Command) {
	fmt.Fprintf(w, "%s\n\n", c.Short)
	if c.Long != "" {
		fmt.Fprintf(w, "%s\n\n", wrap(c.Long, helpWidth))
	}
	if c.HasParent() {
		fmt.Fprintf(w, "  %s\n\n", c.UseLine())
	}
	writeCommands(w, c)
	writeFlags(w, c.LocalFlags())
	if c.Example != "" {
		fmt.Fprintf(w, "For example\n%s\n", c.Example)
	}
	if !c.HasParent() {
		fmt.Fprint(w, "\"rowstead help COMMAND\" tells more of one. "+
			"Exit status: 0 met, 3 short of the tolerance,\n2 bad input or usage, 4 cannot fit, 130 interrupted, 1 anything else.\n")
	}
}

// writeCommands lists the commands below c.
func writeCommands(w io.Writer, c *cobra.Command) {
	any := false
	for _, sub := range c.Commands() {
		if sub.Hidden {
			continue
		}
		if !any {
			fmt.Fprintln(w, "Commands")
		}
		any = true
		fmt.Fprintf(w, "  %-34s %s\n", sub.Use, sub.Short)
	}
	if any {
		fmt.Fprintln(w)
	}
}

// writeFlags lists flags in the order in which they were declared, the text in
// a second column.
func writeFlags(w io.Writer, flags *pflag.FlagSet) {
	const column = 27
	first := true
	flags.VisitAll(func(f *pflag.Flag) {
		if f.Hidden || f.Name == "help" {
			return
		}
		if first {
			fmt.Fprintln(w, "Flags, none of which is needed")
			first = false
		}
		value, text := pflag.UnquoteUsage(f)
		name := "  --" + f.Name
		if value != "" {
			name += " " + value
		}
		lines := strings.Split(wrap(text, helpWidth-column), "\n")
		fmt.Fprintf(w, "%-*s%s\n", column, name+" ", lines[0])
		for _, line := range lines[1:] {
			fmt.Fprintf(w, "%*s%s\n", column, "", line)
		}
	})
	if !first {
		fmt.Fprintln(w)
	}
}

// wrap breaks paragraphs (separated by empty lines) at width.
func wrap(text string, width int) string {
	var out []string
	for _, paragraph := range strings.Split(text, "\n\n") {
		line := ""
		for _, word := range strings.Fields(paragraph) {
			if line != "" && len([]rune(line))+1+len([]rune(word)) > width {
				out = append(out, line)
				line = ""
			}
			if line != "" {
				line += " "
			}
			line += word
		}
		out = append(out, line, "")
	}
	return strings.Join(out[:len(out)-1], "\n")
}
