package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime/debug"
	"strings"
	"sync"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/place"
	"rowstead/cmd/internal/records"
	"rowstead/cmd/internal/replace"
	"rowstead/coordinator/report"
)

// app is one call of the program: where it writes, and what must be put in
// order when it ends.
type app struct {
	stdout, stderr io.Writer
	pending        replace.Pending
	interrupt      interrupt

	asked  []string // the arguments
	object bool     // they ask for --json; fixed, so that watch may read it
	json   bool     // print one object and nothing else on standard output
	quiet  bool

	mu sync.Mutex // guards what follows
	// record of the run, if there is one; printed as the object
	record *report.Record
	// task is the command in work: solve, audit or sample
	task string
	// current is the run in work; none when its ID is empty
	current records.Run
	lock    io.Closer // of current; the end of the process ends it
	// written are the files that a sample has finished
	written []string
	// outputs are the files that may be growing under a temporary name
	outputs []string
	// said is set once the object is printed
	said bool
	// office has the worker processes, if there are any
	office *place.Office

	screen screen
}

func newApp(args []string, stdout, stderr io.Writer) *app {
	a := &app{asked: args, object: wantsJSON(args), stdout: stdout, stderr: stderr}
	a.screen.w = stderr
	return a
}

// run carries out the command line and returns the exit status. Whatever
// happens, a person reads one line and, with --json, a program reads one object.
func (a *app) run() (status int) {
	defer func() {
		if fault := recover(); fault != nil {
			status = a.crashed(fault, debug.Stack())
		}
	}()
	root := a.commands()
	a.json = a.object
	root.SetArgs(a.asked)
	err := root.Execute()
	var verdict *verdictError
	if errors.As(err, &verdict) {
		return verdict.status
	}
	if err == nil {
		return statusMet
	}
	return a.fail(err)
}

// verdictError ends a command whose result has been printed already.
type verdictError struct{ status int }

func (e *verdictError) Error() string { return fmt.Sprintf("status %d", e.status) }

// wantsJSON looks for --json before the flags are read, so that a fault in
// reading them is told as an object too.
func wantsJSON(args []string) bool {
	for _, arg := range args {
		switch arg {
		case "--":
			return false
		case "--json", "--json=true":
			return true
		}
	}
	return false
}

// fail prints an error once and returns its status.
func (a *app) fail(err error) int {
	if a.interrupt.ending.Load() {
		select {} // watch ends the program
	}
	status := statusOf(err)
	text := oneLine(err)
	a.screen.clear()
	fmt.Fprintf(a.stderr, "rowstead: %s\n", text)
	if a.json {
		a.mu.Lock()
		if a.record == nil {
			a.record = report.New("")
		}
		a.record.Error = text
		if a.record.Reason == "" {
			a.record.Reason = reasons[status]
		}
		a.mu.Unlock()
		a.sayObject(a.record.JSON())
	}
	return status
}

// sayObject prints the object unless one was printed before.
func (a *app) sayObject(text []byte) {
	a.mu.Lock()
	defer a.mu.Unlock()
	if a.said {
		return
	}
	a.said = true
	a.stdout.Write(text) // a closed pipe has nobody to tell
}

// crashed puts the details of a fault of our own into a file and prints one
// line.
func (a *app) crashed(fault any, stack []byte) int {
	a.pending.Abandon()
	var details bytes.Buffer
	fmt.Fprintf(&details, "rowstead %s\narguments %q\n\n%v\n\n%s", programText(), a.asked, fault, stack)
	where := "the details could not be kept"
	if f, err := os.CreateTemp("", "rowstead-fault-*.txt"); err == nil {
		_, err = f.Write(details.Bytes())
		if errors.Join(err, f.Close()) == nil {
			where = "the details are in " + filepath.ToSlash(f.Name())
		}
	}
	return a.fail(fmt.Errorf("this is a fault of rowstead, not of your files: %s; please report it with that file", where))
}

// commands builds the command tree.
func (a *app) commands() *cobra.Command {
	root := &cobra.Command{
		Use:   "rowstead",
		Short: "rowstead solves large sparse systems and says how far the answer can be trusted.",
		Long: "It reads a matrix file and a right side, solves A·x = b by randomized sketching, recomputes the " +
			"residual from your own file, and keeps a record. " + report.Caution,
		Args:               cobra.ArbitraryArgs,
		SilenceErrors:      true,
		SilenceUsage:       true,
		DisableSuggestions: true,
		CompletionOptions:  cobra.CompletionOptions{DisableDefaultCmd: true},
		RunE: func(c *cobra.Command, args []string) error {
			if len(args) > 0 {
				return noCommand(args[0])
			}
			showHelp(a.stdout, c)
			return nil
		},
	}
	root.SetOut(a.stdout)
	root.SetErr(a.stderr)
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		if word := firstWord(a.asked); c == root && word != "" {
			return noCommand(word)
		}
		return flagError(c.Name(), err)
	})
	root.SetHelpFunc(func(c *cobra.Command, _ []string) { showHelp(a.stdout, c) })
	root.SetHelpCommand(a.helpCommand(root))
	cobra.EnableCommandSorting = false
	root.AddCommand(a.solveCommand(), a.auditCommand(), a.sampleCommand(), a.runsCommand(), a.showCommand(), a.resumeCommand(), a.versionCommand(), a.workerCommand())
	for _, c := range root.Commands() {
		c.Flags().SortFlags = false
		c.DisableFlagsInUseLine = true
		c.Flags().BoolP("help", "h", false, "print this help")
	}
	return root
}

// firstWord is the first argument that is no flag: what was meant as a command.
func firstWord(args []string) string {
	for _, arg := range args {
		if !strings.HasPrefix(arg, "-") {
			return arg
		}
	}
	return ""
}

func noCommand(name string) error {
	return usage("there is no command %q; \"rowstead help\" lists them", name)
}

// helpCommand prints the help of a command by its name.
func (a *app) helpCommand(root *cobra.Command) *cobra.Command {
	return &cobra.Command{
		Use:   "help COMMAND",
		Short: "tell more of one command",
		RunE: func(_ *cobra.Command, args []string) error {
			c, rest, err := root.Find(args)
			if err != nil || len(rest) > 0 {
				return noCommand(strings.Join(args, " "))
			}
			showHelp(a.stdout, c)
			return nil
		},
	}
}

// exactly is an argument check in our words.
func exactly(names ...string) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		if len(args) == len(names) {
			return nil
		}
		return usage("%s takes %s, but %d given; write: rowstead %s", c.Name(), listed(names), len(args), c.Use)
	}
}

func listed(names []string) string {
	if len(names) == 0 {
		return "no file"
	}
	return strings.Join(names, " and ")
}
