package study

import (
	"context"
	"errors"
	"runtime"
	"strings"
	"sync"

	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// Options say how a study is run. What it comes to does not depend on them.
type Options struct {
	Workers  int                  // goroutines; 0: one a core
	Progress func(done, of int64) // may be nil
}

// Run makes the runs from first to before last and hands their rows over in
// order, some at a time, in the calling goroutine. An error of emit, or the end
// of ctx, ends it; every row handed over is final.
func (st *Study) Run(ctx context.Context, first, last int64, o Options, emit func([]Row) error) error {
	workers := o.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	return inOrder(ctx, first, last, st.chunk(last-first, workers), workers, st.evaluate, func(rows []Row) error {
		if err := emit(rows); err != nil {
			return err
		}
		if o.Progress != nil {
			o.Progress(rows[len(rows)-1].Run+1-first, last-first)
		}
		return nil
	})
}

// batchBytes is about what the gauges of runs that are made together may keep,
// and batchMost how many they may be.
const (
	batchBytes = 16 << 20
	batchMost  = 32
)

// chunk is how many runs a worker takes at once: they share what they have in
// common, and all workers should get some.
func (st *Study) chunk(runs int64, workers int) int64 {
	n := int64(batchBytes / max(1, st.Scenario.Footprint()))
	return min(max(n, 1), batchMost, max(1, runs/int64(4*workers)))
}

// part is a stretch of work and, when done is closed, its rows.
type part struct {
	first, last int64
	rows        []Row
	err         error
	done        chan struct{}
}

// inOrder shares stretches of the numbers from first to before last out among
// workers and hands the results over in order. Never more than a few stretches
// are under way, so that memory is bounded however long it takes.
func inOrder(ctx context.Context, first, last, chunk int64, workers int,
	work func(ctx context.Context, first, last int64) ([]Row, error), emit func([]Row) error) error {
	ctx, cancel := context.WithCancel(ctx)
	var group sync.WaitGroup
	defer group.Wait()
	defer cancel()
	ahead, todo := make(chan *part, 2*workers), make(chan *part)
	group.Go(func() {
		defer close(ahead)
		defer close(todo)
		for at := first; at < last; at += chunk {
			p := &part{first: at, last: min(at+chunk, last), done: make(chan struct{})}
			for _, to := range []chan *part{ahead, todo} {
				select {
				case <-ctx.Done():
					return
				case to <- p:
				}
			}
		}
	})
	for range workers {
		group.Go(func() {
			for p := range todo {
				p.rows, p.err = work(ctx, p.first, p.last)
				close(p.done)
			}
		})
	}
	for p := range ahead {
		select {
		case <-ctx.Done():
			return ctx.Err()
		case <-p.done:
		}
		if p.err != nil {
			return p.err
		}
		if err := emit(p.rows); err != nil {
			return err
		}
	}
	return ctx.Err()
}

// evaluate makes the runs from first to before last.
func (st *Study) evaluate(ctx context.Context, first, last int64) ([]Row, error) {
	changes := make([][]scenarios.Change, 0, last-first)
	for i := first; i < last; i++ {
		changes = append(changes, st.Changes(i))
	}
	judged, err := Judge(ctx, st.Scenario, st.Lane, changes)
	if err != nil {
		return nil, err
	}
	rows := make([]Row, len(judged))
	for k := range judged {
		rows[k] = st.row(first+int64(k), &judged[k])
	}
	return rows, nil
}

// Judged is what one variation of a scenario came to: a lane, or why it could not
// be built.
type Judged struct {
	accept.Lane
	Refused error
}

// Judge runs a lane of a scenario once for every list of changes, in the calling
// goroutine. Those that have motion and reference in common are made together.
// Changes that make no test that can be built are no error but the result of that
// one.
func Judge(ctx context.Context, s *scenarios.Scenario, lane string, changes [][]scenarios.Change) ([]Judged, error) {
	out := make([]Judged, len(changes))
	groups := map[string][]int{}
	var order []string
	for i, c := range changes {
		key := common(c)
		if _, seen := groups[key]; !seen {
			order = append(order, key)
		}
		groups[key] = append(groups[key], i)
	}
	for _, key := range order {
		if err := together(ctx, s, lane, changes, groups[key], out); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// common is the same for variations that have motion and reference in common.
func common(changes []scenarios.Change) string {
	var key strings.Builder
	for _, c := range changes {
		if sharedSection(c.Path) {
			key.WriteString(c.Path + "=" + c.Value + "\n")
		}
	}
	return key.String()
}

// together makes variations that have motion and reference in common.
func together(ctx context.Context, s *scenarios.Scenario, lane string, changes [][]scenarios.Change, group []int, out []Judged) error {
	batch := accept.NewBatch(lane)
	var built []int
	for _, i := range group {
		varied, err := s.With(changes[i]...)
		if err == nil {
			err = batch.Add(varied)
		}
		var bad *scenarios.Error
		switch {
		case err == nil:
			built = append(built, i)
		case errors.As(err, &bad):
			out[i].Refused = err
		default:
			return err
		}
	}
	lanes, err := batch.Run(ctx)
	if err != nil {
		return err
	}
	for k, i := range built {
		out[i].Lane = lanes[k]
	}
	return nil
}
