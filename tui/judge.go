package tui

import (
	"context"
	"fmt"
	"runtime"
	"runtime/debug"
	"time"

	"antelag/rtloop/pace"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// question is what is to be judged: a lane alone, over the whole scenario, and
// then the same with one setting varied.
type question struct {
	number int // to tell its answers from those of older ones
	alone  *scenarios.Scenario
	lane   string
	vary   *variation // nil: no curve
	known  bool       // the verdict is known already; the curve alone is wanted
}

// answer is a verdict, or a part of a curve. A question has several.
type answer struct {
	number  int
	verdict *accept.Lane
	took    time.Duration
	points  []point // more points of the curve
	done    bool    // the curve is complete
	err     error
}

// point is a scenario with the varied setting at x, judged.
type point struct {
	x    float64
	lane accept.Lane
}

// judge answers questions in the background, the newest one only: a new
// question cancels what is being done about the last. There is one worker less
// than there are cores, so that the loop keeps its own, and they compute in the
// background.
type judge struct {
	answers chan answer
	failed  chan *Panic
	cancel  context.CancelFunc
	workers int
	tasks   chan task
	quit    chan struct{}
}

// task is work for a worker.
type task struct {
	ctx   context.Context
	tests []*scenarios.Scenario
	to    chan<- judged
	index int
}

type judged struct {
	index int
	lanes []accept.Lane
	err   error
}

func newJudge() *judge {
	j := &judge{
		answers: make(chan answer, 64), failed: make(chan *Panic, 8),
		cancel: func() {}, workers: max(1, runtime.NumCPU()-1),
		tasks: make(chan task), quit: make(chan struct{}),
	}
	for range j.workers {
		go j.work()
	}
	return j
}

// work runs tasks until the judge is closed.
func (j *judge) work() {
	defer j.guard()
	defer pace.Background()()
	for {
		select {
		case <-j.quit:
			return
		case t := <-j.tasks:
			lanes, err := accept.Together(t.ctx, t.tests)
			t.to <- judged{t.index, lanes, err}
		}
	}
}

// guard turns a panic of one of the judge's goroutines into a message.
func (j *judge) guard() {
	if r := recover(); r != nil {
		j.failed <- &Panic{Where: "the verdict", Value: r, Stack: debug.Stack()}
	}
}

// ask begins to answer a question and drops the last one.
func (j *judge) ask(q question) {
	j.cancel()
	ctx, cancel := context.WithCancel(context.Background())
	j.cancel = cancel
	go func() {
		defer j.guard()
		j.answer(ctx, q)
	}()
}

// close drops the last question and ends the workers.
func (j *judge) close() {
	j.cancel()
	close(j.quit)
}

// answer is the goroutine of one question.
func (j *judge) answer(ctx context.Context, q question) {
	if !q.known {
		began := time.Now()
		lanes, err := j.run(ctx, []*scenarios.Scenario{q.alone})
		if ctx.Err() != nil {
			return
		}
		a := answer{number: q.number, took: time.Since(began), err: err}
		if err == nil {
			a.verdict = &lanes[0]
		}
		if !j.say(ctx, a) || err != nil {
			return
		}
	}
	if q.vary != nil {
		j.curve(ctx, q)
	}
}

func (j *judge) say(ctx context.Context, a answer) bool {
	select {
	case <-ctx.Done():
		return false
	case j.answers <- a:
		return true
	}
}

// run has tests judged, shared out among the workers.
func (j *judge) run(ctx context.Context, tests []*scenarios.Scenario) ([]accept.Lane, error) {
	n := min(j.workers, len(tests))
	to := make(chan judged, n)
	share := func(i int) (from, end int) { return i * len(tests) / n, (i + 1) * len(tests) / n }
	for i := range n {
		from, end := share(i)
		select {
		case <-ctx.Done():
			return nil, ctx.Err()
		case j.tasks <- task{ctx, tests[from:end], to, i}:
		}
	}
	lanes := make([]accept.Lane, len(tests))
	for range n {
		select {
		case <-ctx.Done():
			return nil, ctx.Err()
		case r := <-to:
			if r.err != nil {
				return nil, r.err
			}
			from, _ := share(r.index)
			copy(lanes[from:], r.lanes)
		}
	}
	return lanes, nil
}

// Panic is a panic of one of the dashboard's goroutines, to be shown after the
// terminal has been restored.
type Panic struct {
	Where string
	Value any
	Stack []byte
}

func (p *Panic) Error() string { return fmt.Sprintf("panic in %s: %v", p.Where, p.Value) }
