// Command antelag is a bench, in software, for tuning the delay compensation
// of real-time hybrid tests.
package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/signal"
	"strconv"
	"strings"
	"syscall"
	"unicode"
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
	context.AfterFunc(ctx, stop) // a second Ctrl-C ends at once
	root := newRoot()
	root.SetArgs(args)
	err := root.ExecuteContext(ctx)
	switch {
	case err == nil:
		return exitGood
	case errors.Is(err, errVerdict):
		return exitFail
	}
	complain(err)
	var failed *failure
	var path *fs.PathError
	if errors.As(err, &failed) || errors.As(err, &path) && path.Op == "write" {
		return exitFail
	}
	return exitUsage
}

// complain says what is wrong in one line. What it quotes from files and
// arguments may hold anything; what cannot be printed is escaped.
func complain(err error) {
	var line strings.Builder
	for _, r := range err.Error() {
		if unicode.IsPrint(r) {
			line.WriteRune(r)
			continue
		}
		escaped := strconv.QuoteRune(r)
		line.WriteString(escaped[1 : len(escaped)-1])
	}
	fmt.Fprintln(os.Stderr, "antelag:", line.String())
}

// errVerdict ends a command that ran and has said that a limit was failed.
var errVerdict = errors.New("the verdict is not good")

// failure is an error of a command that had begun its work, such as a full
// disk.
type failure struct{ err error }

func (f *failure) Error() string { return f.err.Error() }
func (f *failure) Unwrap() error { return f.err }
