package check

import (
	"context"
	"errors"
	"fmt"
	"runtime"
	"sync"
	"sync/atomic"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/accept/baseline"
)

// State says what became of a scenario's baseline.
type State string

// What a baseline can come to.
const (
	Absent    State = "none"      // there is none
	Same      State = "same"      // every figure holds
	Moved     State = "moved"     // at least one does not
	Recorded  State = "recorded"  // written for the first time
	Replaced  State = "replaced"  // written again, because something had changed
	Unchanged State = "unchanged" // recording found nothing new and left the file
	Unwritten State = "unwritten" // it was to be written and could not be
)

// Result is what one scenario came to.
type Result struct {
	*Test
	Verdict    *accept.Verdict // nil where it did not run
	Comparison *baseline.Comparison
	State      State
	// Err is the error of the Test, or that the run or the recording failed.
	Err error
}

// Pass reports whether the scenario met its limits and holds its baseline.
// Where recording replaces a baseline the old one decides nothing.
func (r *Result) Pass() bool {
	return r.Err == nil && r.Verdict != nil && r.Verdict.Pass() && r.State != Moved
}

// Work says how to run.
type Work struct {
	Workers  int    // 0: as many as there are cores
	Version  string // of the program, for what is recorded
	Record   bool
	Progress func(done, of int64)
}

// Run checks all scenarios, several at a time, and gives the results in the
// order of the tests, whatever order they ended in. When ctx ends, what was
// running or waiting has no verdict and nothing more is recorded.
func Run(ctx context.Context, tests []*Test, w Work) []Result {
	out := make([]Result, len(tests))
	var next, done atomic.Int64
	var workers sync.WaitGroup
	if w.Workers == 0 {
		w.Workers = runtime.GOMAXPROCS(0)
	}
	for range min(w.Workers, len(tests)) {
		workers.Go(func() {
			for i := next.Add(1) - 1; i < int64(len(tests)); i = next.Add(1) - 1 {
				out[i] = w.one(ctx, tests[i])
				if n := done.Add(1); w.Progress != nil {
					w.Progress(n, int64(len(tests)))
				}
			}
		})
	}
	workers.Wait()
	return out
}

var errInterrupted = errors.New("interrupted")

// one checks one scenario.
func (w *Work) one(ctx context.Context, t *Test) Result {
	r := Result{Test: t, State: Absent, Err: t.Err}
	if r.Err != nil {
		return r
	}
	if ctx.Err() != nil {
		r.Err = errInterrupted
		return r
	}
	v, err := accept.Run(ctx, t.Scene, accept.Options{})
	if err != nil {
		r.Err = err
		return r
	}
	for i := range v.Lanes {
		if v.Lanes[i].Outcome == rtloop.Interrupted {
			r.Err = errInterrupted
			return r
		}
	}
	r.Verdict = v
	now := baseline.From(v, w.Version)
	if t.Baseline != nil {
		r.Comparison = t.Baseline.Compare(now)
		r.State = Same
		if !r.Comparison.Same() {
			r.State = Moved
		}
	}
	if w.Record {
		w.record(&r, now)
	}
	return r
}

// record keeps the figures, where there is anything new to keep.
func (w *Work) record(r *Result, now *baseline.Baseline) {
	state := Recorded
	if r.Comparison != nil {
		if r.Comparison.Whole() {
			r.State = Unchanged
			return
		}
		state, now = Replaced, r.Baseline.Renew(now)
	}
	if err := now.Save(r.Path, r.Name); err != nil {
		r.State, r.Err = Unwritten, fmt.Errorf("baseline not recorded: %w", err)
		return
	}
	r.State = state
}

// Interrupted reports whether an interruption kept a scenario from its verdict.
func (r *Result) Interrupted() bool { return errors.Is(r.Err, errInterrupted) }
