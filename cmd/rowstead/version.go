package main

import (
	"encoding/json"
	"fmt"
	"runtime"
	"runtime/debug"

	"github.com/spf13/cobra"

	"rowstead/coordinator/report"
)

// release is the version of the program.
const release = "0.1"

// program says what computes.
func program() report.Program {
	p := report.Program{Version: release, Go: runtime.Version(), System: runtime.GOOS + "/" + runtime.GOARCH, Threads: runtime.GOMAXPROCS(0)}
	if build, found := debug.ReadBuildInfo(); found {
		for _, s := range build.Settings {
			if s.Key == "vcs.revision" && len(s.Value) >= 12 {
				p.Version += " " + s.Value[:12]
			}
			if s.Key == "vcs.modified" && s.Value == "true" {
				p.Version += " changed"
			}
		}
	}
	return p
}

func programText() string {
	p := program()
	return fmt.Sprintf("%s, %s, %s", p.Version, p.Go, p.System)
}

func (a *app) versionCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "version",
		Short: "say which rowstead this is",
		Args:  exactly(),
		RunE: func(*cobra.Command, []string) error {
			if a.json {
				p := program()
				text, err := json.Marshal(map[string]string{"version": p.Version, "go": p.Go, "system": p.System})
				a.sayObject(append(text, '\n'))
				return err
			}
			_, err := fmt.Fprintf(a.stdout, "rowstead %s\n", programText())
			return err
		},
	}
	a.jsonFlag(c)
	return c
}

// jsonFlag adds --json.
func (a *app) jsonFlag(c *cobra.Command) {
	c.Flags().BoolVar(&a.json, "json", false, "print exactly one JSON object on standard output")
}
