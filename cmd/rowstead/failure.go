package main

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"github.com/spf13/pflag"

	"rowstead/coordinator"
	"rowstead/partition/matfile"
)

// Exit statuses.
const (
	statusMet         = 0
	statusOther       = 1
	statusInput       = 2
	statusShort       = 3
	statusFit         = 4
	statusInterrupted = 130
)

// failure is an error with the status the program ends with.
type failure struct {
	status int
	err    error
}

func (f *failure) Error() string { return f.err.Error() }
func (f *failure) Unwrap() error { return f.err }

// usage is a failure of the command line: what is wrong and what to write.
func usage(format string, values ...any) error {
	return &failure{statusInput, fmt.Errorf(format, values...)}
}

// statusOf is the exit status of an error.
func statusOf(err error) int {
	var known *failure
	var file *matfile.FileError
	var input *coordinator.InputError
	var fit *coordinator.FitError
	switch {
	case err == nil:
		return statusMet
	case errors.As(err, &known):
		return known.status
	case errors.Is(err, context.Canceled), errors.Is(err, coordinator.ErrInterrupted):
		return statusInterrupted
	case errors.As(err, &file), errors.As(err, &input):
		return statusInput
	case errors.As(err, &fit):
		return statusFit
	}
	return statusOther
}

// reasons are the short words of the JSON object for a status without a verdict.
var reasons = map[int]string{
	statusOther: "failed", statusInput: "bad input", statusFit: "cannot fit", statusInterrupted: "interrupted",
}

// oneLine makes a message one line of printable text.
func oneLine(err error) string {
	text := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return ' '
		}
		return r
	}, err.Error())
	return strings.Join(strings.Fields(text), " ")
}

// flagError puts a fault of the flags into our words.
func flagError(command string, err error) error {
	where := "\"rowstead help " + command + "\" lists the flags"
	if command == "rowstead" {
		where = "\"rowstead help COMMAND\" lists the flags of a command"
	}
	var value *pflag.InvalidValueError
	var missing *pflag.ValueRequiredError
	var unknown *pflag.NotExistError
	switch {
	case errors.As(err, &value):
		name := value.GetFlag().Name
		if numeric(value.GetFlag().Value.Type()) {
			return usage("--%s %q: expected %s", name, value.GetValue(), expectation(value.GetFlag().Value.Type()))
		}
		return usage("--%s: %w", name, value.Unwrap())
	case errors.As(err, &missing):
		return usage("--%s needs a value; %s", missing.GetSpecifiedName(), where)
	case errors.As(err, &unknown):
		return usage("there is no flag --%s here; %s", unknown.GetSpecifiedName(), where)
	}
	return &failure{statusInput, err}
}

func numeric(kind string) bool { return expectation(kind) != "" }

// expectation says what the plain kinds of flags take.
func expectation(kind string) string {
	switch kind {
	case "int":
		return "a whole number"
	case "uint64":
		return "a whole number from 0"
	case "float64":
		return "a number"
	case "bool":
		return "true or false"
	}
	return ""
}
