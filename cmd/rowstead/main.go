// Command rowstead solves sparse systems and says how far the answer can be
// trusted.
//
// One file holds one command: its flags, the call, what it prints and its exit
// status. Numbers and files are the business of the packages below partition,
// worker and coordinator.
package main

import (
	"os"
	"os/signal"
	"syscall"
)

func main() {
	signals := make(chan os.Signal, 2)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	a := newApp(os.Args[1:], os.Stdout, os.Stderr)
	go a.watch(signals, os.Exit)
	os.Exit(a.run())
}
