// Command antelag is a bench, in software, for tuning the delay compensation
// of real-time hybrid tests.
package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/signal"
	"syscall"
)

// The exit codes.
const (
	exitGood  = 0
	exitFail  = 1 // ran, but failed a limit, tripped, diverged, or could not write
	exitUsage = 2 // bad input or usage; nothing was written
)

func main() { os.Exit(run(os.Args[1:])) }

func run(args []string) int {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	root := newRoot()
	root.SetArgs(args)
	err := root.ExecuteContext(ctx)
	var failed *failure
	switch {
	case err == nil:
		return exitGood
	case errors.Is(err, errVerdict):
		return exitFail
	case errors.As(err, &failed):
		fmt.Fprintln(os.Stderr, "antelag:", err)
		return exitFail
	}
	fmt.Fprintln(os.Stderr, "antelag:", err)
	return exitUsage
}

// errVerdict ends a command that ran and has said that a limit was failed.
var errVerdict = errors.New("the verdict is not good")

// failure is an error of a command that had begun its work, such as a full
// disk.
type failure struct{ err error }

func (f *failure) Error() string { return f.err.Error() }
func (f *failure) Unwrap() error { return f.err }
