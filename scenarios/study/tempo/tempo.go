// Package tempo runs a scenario at several slowdowns and says what each gains
// and costs: a slower test leaves the actuator more time, so that it is better
// synchronized and further from instability, but the specimen is moved more
// slowly than in the structure that is tested, so that dampers, sliding
// bearings and masses answer with other forces.
//
// The error of the response against the reference at real speed has both in
// it. With x the displacements of all levels at one instant of model time,
//
//	e = x_hybrid(λ) − x_ref(1)         the total
//	s = x_hybrid(λ) − x_perfect(λ)     what synchronization costs
//	r = x_perfect(λ) − x_ref(1)        what lost rate effects cost
//
// where λ is the slowdown, x_perfect(λ) is the same loop, as slow, but with
// perfect actuators and sensors, and x_ref(1) the reference response. e = s + r
// at every instant. Each is given as its rms over all levels and ticks over the
// rms of x_ref(1), and with the correlation ρ of s and r the squares add up:
// E² = S² + R² + 2ρSR.
package tempo

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/study"
	"antelag/scenarios/study/margin"
)

// Default is the range of slowdowns where none is given.
const Default = "1:100:13"

// mostPoints is how many slowdowns one study may have.
const mostPoints = 500

// Point is what the test comes to at one slowdown. SI; an undefined figure is
// NaN. Delays and delay margin are physical.
type Point struct {
	Slowdown float64
	Lasts    float64 // physical seconds of the whole test
	Lane     accept.Lane
	Split    Split
	// DelayMargin is the least extra delay at which the loop grows, s; +Inf:
	// none was found; NaN: the loop has no such margin. Not above 0: it grows
	// as it is.
	DelayMargin float64
	Stable      bool
}

// Split is what the response error is made of, all over the rms of the
// reference response.
type Split struct {
	Total, Sync, Rate float64
	Correlation       float64 // of Sync and Rate; NaN where one of them is nothing
}

// Report is the whole study.
type Report struct {
	Scenario, Title string
	Lane            string
	Structure       bool // there is a structure, and so a response
	Limits          bool // there are acceptance limits
	Points          []Point
	Asked           int    // slowdowns that were asked for; there are fewer points after an interruption
	NoMargin        string // why there is no delay margin, "" where there is
	scene           *scenarios.Scenario
}

// Options say how to run.
type Options struct {
	Lane     string // whose compensators; "": the configured lane
	Workers  int    // 0: one for each core
	Progress func(done, of int64)
}

// Slowdowns reads "a:b:n", n slowdowns from a to b, evenly in the logarithm.
// All but the ends are rounded to three digits, so that they are typed easily.
func Slowdowns(s *scenarios.Scenario, text string) ([]float64, error) {
	if strings.Count(text, ":") != 2 {
		return nil, fmt.Errorf("%q: slowdowns are given as a:b:n, like %s", text, Default)
	}
	axis, err := study.ParseAxis(s, "loop.slowdown="+text+":log")
	if err != nil {
		return nil, err
	}
	if axis.N > mostPoints {
		return nil, fmt.Errorf("loop.slowdown: %d values; allowed are up to %d", axis.N, mostPoints)
	}
	var out []float64
	for i := range axis.N {
		v := axis.At(i)
		if i > 0 && i < axis.N-1 {
			v = rounded(v)
		}
		if n := len(out); n == 0 || v > out[n-1] {
			out = append(out, v)
		}
	}
	return out, nil
}

func rounded(v float64) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 3, 64), 64)
	if err != nil {
		return v
	}
	return r
}

// Run runs the scenario at every slowdown. An error means that nothing has run.
// When ctx ends the report has the points that were finished, and the error is
// that of ctx.
func Run(ctx context.Context, s *scenarios.Scenario, slowdowns []float64, o Options) (*Report, error) {
	if o.Lane == "" {
		o.Lane = scenarios.Configured
	}
	tests, err := variants(s, slowdowns, o.Lane)
	if err != nil {
		return nil, err
	}
	r := &Report{
		Scenario: s.Name, Title: s.Title, Lane: o.Lane, Structure: s.Substructure != nil,
		Limits: len(s.Accept) > 0, Asked: len(tests), scene: s,
	}
	points := make([]Point, len(tests))
	notes := make([]error, len(tests))
	failed := make([]error, len(tests))
	p := newProgress(tests, o.Progress)
	var next atomic.Int64
	var workers sync.WaitGroup
	if o.Workers == 0 {
		o.Workers = runtime.GOMAXPROCS(0)
	}
	for range min(o.Workers, len(tests)) {
		workers.Go(func() {
			for n := next.Add(1); n <= int64(len(tests)); n = next.Add(1) {
				i := len(tests) - int(n) // the slowest takes longest: it comes first
				points[i], notes[i], failed[i] = one(ctx, tests[i], p.add)
			}
		})
	}
	workers.Wait()
	for i := range points {
		switch {
		case failed[i] == nil:
			r.Points = append(r.Points, points[i])
			if notes[i] != nil && r.NoMargin == "" {
				r.NoMargin = notes[i].Error()
			}
		case ctx.Err() == nil:
			return nil, failed[i]
		}
	}
	return r, ctx.Err()
}

// variants are the scenarios of all slowdowns, with one lane each. They are all
// built once before any runs, so that bad input costs nothing.
func variants(s *scenarios.Scenario, slowdowns []float64, lane string) ([]*scenarios.Scenario, error) {
	s, err := s.Alone(lane)
	if err == nil {
		s, err = s.Plain()
	}
	if err != nil {
		return nil, err
	}
	if len(slowdowns) == 0 {
		return nil, errors.New("no slowdown is given")
	}
	var out []*scenarios.Scenario
	for _, v := range slowdowns {
		at, err := s.With(scenarios.Change{Path: "loop.slowdown", Value: strconv.FormatFloat(v, 'g', -1, 64)})
		if err == nil {
			_, err = at.Build()
		}
		if err != nil {
			return nil, err
		}
		out = append(out, at)
	}
	return out, nil
}

// one runs one slowdown. note says why there is no delay margin.
func one(ctx context.Context, s *scenarios.Scenario, done func(int64)) (p Point, note, err error) {
	p = Point{Slowdown: s.Loop.Num("slowdown"), DelayMargin: math.NaN()}
	p.Lasts = s.Loop.Num("duration") * p.Slowdown
	if err = p.run(ctx, s, done); err != nil || s.Substructure == nil {
		return p, nil, err
	}
	m, e := margin.Of(ctx, s, margin.Options{Quick: true})
	switch {
	case ctx.Err() != nil:
		return p, nil, ctx.Err()
	case e != nil:
		return p, e, nil
	}
	p.Stable, p.DelayMargin = m.Stable, m.LeastDelay()
	return p, nil, nil
}

// run carries the three loops through the motion side by side.
func (p *Point) run(ctx context.Context, s *scenarios.Scenario, done func(int64)) error {
	rig, err := s.BuildTempo()
	if err != nil {
		return err
	}
	if err := rig.Open(); err != nil {
		return err
	}
	lane := rig.Lanes[0].Loop
	var sums sums
	const between = 1024 // ticks from one look at ctx to the next
	for more := true; more && lane.Outcome() == rtloop.Running; {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		before := lane.Ticks()
		for i := 0; i < between && more && lane.Outcome() == rtloop.Running; i++ {
			more = rig.Advance()
			sums.add(rig)
		}
		done(lane.Ticks() - before)
	}
	if err := rig.Close(); err != nil {
		return err
	}
	res := lane.Result()
	res.Name = rig.Lanes[0].Name
	p.Split = sums.split(rig)
	res.ResponseError = rtloop.Figure(p.Split.Total)
	p.Lane = accept.Judge(res, s.Accept)
	p.Lane.Ran = lane.Time()
	return nil
}

// progress adds up ticks over all workers.
type progress struct {
	lock     sync.Mutex
	done, of int64
	tell     func(done, of int64)
}

func newProgress(tests []*scenarios.Scenario, tell func(done, of int64)) *progress {
	p := &progress{tell: tell}
	for _, s := range tests {
		p.of += int64(math.Round(s.Loop.Num("rate") * s.Loop.Num("duration") * s.Loop.Num("slowdown")))
	}
	return p
}

func (p *progress) add(ticks int64) {
	if p.tell == nil {
		return
	}
	p.lock.Lock()
	defer p.lock.Unlock()
	p.done += ticks
	p.tell(p.done, p.of)
}
