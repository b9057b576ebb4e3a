//go:build unix

package main

import (
	"bytes"
	"strings"
	"syscall"
	"testing"
	"time"
)

// Ctrl-C ends a measurement with what there is.
func TestPaceInterrupt(t *testing.T) {
	for _, signal := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM} {
		t.Run(signal.String(), func(t *testing.T) {
			t.Parallel()
			j := paced(t, interrupted(t, signal, "pace", "--json", "--rate", "500 Hz", "--time", "1 h"))
			if j.Ticks == 0 || j.Ticks >= 3600*500 {
				t.Errorf("%d ticks", j.Ticks)
			}
			if o := interrupted(t, signal, "pace", "--rate", "500 Hz", "--time", "1 h"); !strings.Contains(o.out, "\nInterrupted after ") {
				t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
			}
		})
	}
}

// interrupted runs a command that shows nothing before its end, and signals
// it: later and later, until the signal does not come before it is heeded, or
// before there is anything to show.
func interrupted(t *testing.T, signal syscall.Signal, args ...string) outcome {
	t.Helper()
	for after := 100 * time.Millisecond; after < patienceOfTests; after *= 2 {
		cmd := command(t.TempDir(), args...)
		var out, err bytes.Buffer
		cmd.Stdout, cmd.Stderr = &out, &err
		if e := cmd.Start(); e != nil {
			t.Fatal(e)
		}
		time.Sleep(after)
		if e := cmd.Process.Signal(signal); e != nil {
			t.Fatal(e)
		}
		o := outcome{ends(t, cmd), out.String(), err.String()}
		if o.code >= 0 && !strings.Contains(o.out, `"ticks": 0`) && !strings.Contains(o.out, "no tick was released") {
			return o
		}
	}
	t.Fatal("it is never there to be interrupted")
	return outcome{}
}
