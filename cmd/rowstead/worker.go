package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/exec"
	"os/signal"
	"runtime"
	"time"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/memory"
	"rowstead/cmd/internal/place"
	"rowstead/coordinator"
	"rowstead/worker/service"
)

// lingering is how long a worker process goes on with a verb in work after its
// coordinator has gone.
const lingering = 2 * time.Second

// workerCommand is the worker process that --here starts. It is not listed: what
// it needs comes through a pipe from the program that starts it.
func (a *app) workerCommand() *cobra.Command {
	return &cobra.Command{
		Use:    "worker",
		Short:  "hold rows for the program that starts it",
		Long:   "Started by \"rowstead solve --here\", which hands it a permit through its standard input and ends it.",
		Hidden: true,
		Args:   exactly(),
		RunE: func(*cobra.Command, []string) error {
			// Ctrl-C reaches every process of a terminal: it is the coordinator's to
			// act on.
			signal.Ignore(os.Interrupt)
			return serve(os.Stdin, os.Exit)
		},
	}
}

// serve serves the run whose permit comes from stdin until the coordinator says
// goodbye or goes away, which the end of stdin tells too. exit is os.Exit.
func serve(stdin io.Reader, exit func(int)) error {
	permit, err := place.ReadPermit(stdin)
	if err != nil {
		return usage("a worker is started by \"rowstead solve --here\" and reads its permit from it: %w", err)
	}
	ctx, cancel := context.WithCancelCause(context.Background())
	defer cancel(nil)
	go func() {
		io.Copy(io.Discard, stdin) // nothing comes any more: only the end matters
		cancel(fmt.Errorf("the coordinator's process has ended"))
	}()
	return service.Run(ctx, permit, service.Options{
		Peak: memory.Peak,
		Free: func() (int64, error) {
			state, err := memory.Now()
			return state.Free, err
		},
		// Several processes share the cores: more runnable threads than the rows have
		// only take turns at looking for work.
		Threads: func(count int) { runtime.GOMAXPROCS(count) },
		// A verb may take long, and nobody waits for it any more.
		Lost: func() { time.AfterFunc(lingering, func() { exit(statusOther) }) },
	})
}

// placer holds rows in this process, or in so many others.
func (a *app) placer(here int) func(context.Context, coordinator.Placement) (coordinator.Placed, error) {
	if here == 0 {
		return place.InProcess
	}
	office := &place.Office{Command: workerProcess}
	a.mu.Lock()
	a.office = office
	a.mu.Unlock()
	return office.Place
}

// workerProcess is this program as a worker.
func workerProcess() (*exec.Cmd, error) {
	self, err := os.Executable()
	if err != nil {
		return nil, fmt.Errorf("find this program: %w", err)
	}
	c := exec.Command(self, "worker")
	c.Args[0] = os.Args[0]
	return c, nil
}
