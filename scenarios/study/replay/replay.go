// Package replay judges what really happened in a test from its log: every gauge of
// tracking over the whole record and over time, the energy that late force put in,
// and the moments where it was worst. It can drive the actuator and every
// compensator of a scenario with the recorded target beside it.
//
// A Replay steps through the record block by block, so that it can be shown while
// it goes, in constant memory; Of does all of it at once.
package replay

import (
	"context"
	"fmt"
	"math"
	"strings"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
)

// Recorded names what the log holds among lanes that are computed.
const Recorded = "recorded"

// Options are what a replay may be given beside the log.
type Options struct {
	Log runlog.Options
	// Window is the length of the windows over time, s of the log; 0: that of the
	// energy margin where the log says where it comes from, else 5 s, but no more
	// than an eighth of the record, and about, for speed.
	Window float64
	// Slowdown is how many physical seconds a second of the log took; 0: what the
	// log's provenance says, else 1. Delays are physical seconds.
	Slowdown float64
	// Against is the scenario whose actuator and lanes are driven with the recorded
	// target; nil: none.
	Against  *scenarios.Scenario
	Progress func(done, of int64) // in bytes of the log, of both passes
}

const (
	usualWindow   = 5.0 // s; common practice: a few periods of a structure
	shortestTicks = 32  // of a window
)

// Replay goes through one log.
type Replay struct {
	path       string
	options    Options
	reader     *runlog.Reader
	provenance *scenarios.Scenario // of the log, nil where there is none
	slowdown   float64
	tick       float64 // physical seconds between samples
	window     int     // samples
	channels   []*channel
	notes      []string
	taken      int // samples of the reader's block
	stretch    Stretch

	marginLeast, marginLast float64
	marginAt                int64
}

// Open opens a log to be judged. It must have target and measured of every channel.
func Open(path string, o Options) (*Replay, error) {
	if len(o.Log.Need) == 0 {
		o.Log.Need = []runlog.Role{runlog.Target, runlog.Measured}
	}
	r, err := runlog.Open(path, o.Log)
	if err != nil {
		return nil, err
	}
	p := &Replay{path: path, options: o, reader: r, marginLeast: math.Inf(1), marginLast: math.NaN()}
	if err := p.prepare(); err != nil {
		r.Close()
		return nil, err
	}
	return p, nil
}

func (p *Replay) prepare() error {
	if err := p.readProvenance(); err != nil {
		return err
	}
	step := p.reader.Step()
	p.tick = step * p.slowdown
	if s := p.provenance; s != nil {
		if own := 1 / s.Loop.Num("rate"); math.Abs(own-p.tick) < 1e-6*own {
			p.tick = own // the very number of the run
		}
	}
	if err := p.chooseWindow(step); err != nil {
		return err
	}
	spectra := p.provenance != nil && p.provenance.Accept.Has("spectrum_error") ||
		p.options.Against != nil && p.options.Against.Accept.Has("spectrum_error")
	for _, c := range p.reader.Channels() {
		p.channels = append(p.channels, newChannel(c, p.tick, step, p.window, p.reader.Expected(), spectra))
	}
	return nil
}

// readProvenance reads what run wrote beside the log. A file that does not belong
// to it, or says nothing, is no matter.
func (p *Replay) readProvenance() error {
	p.slowdown = p.options.Slowdown
	path := p.path + ".toml"
	if !exists(path) {
		path = strings.TrimSuffix(p.path, ".gz") + ".toml" // the log was compressed later
	}
	s, err := scenarios.Load(path)
	switch {
	case err == nil && p.belongs(s):
		p.provenance = s
		if p.slowdown == 0 {
			p.slowdown = s.Loop.Num("slowdown")
		}
	case err == nil:
		p.notes = append(p.notes, fmt.Sprintf("%s does not fit the log, by its channels or its rate, and was not used", path))
	case exists(path):
		p.notes = append(p.notes, fmt.Sprintf("%v; it was not used", err))
	}
	if p.slowdown == 0 {
		p.slowdown = 1
	}
	if !(p.slowdown > 0 && p.slowdown <= 1e6) {
		return fmt.Errorf("slowdown: %g is not between 0 and 1e6", p.slowdown)
	}
	return nil
}

// belongs reports whether a scenario is where the log comes from: it has the log's
// channels, and its step.
func (p *Replay) belongs(s *scenarios.Scenario) bool {
	names := map[string]bool{}
	for _, n := range s.ChannelNames() {
		names[n] = true
	}
	for _, c := range p.reader.Channels() {
		if !names[c.Name] && c.Name != runlog.Unnamed { // a map may leave the name out
			return false
		}
	}
	step := 1 / (s.Loop.Num("rate") * s.Loop.Num("slowdown"))
	return math.Abs(step-p.reader.Step()) < 1e-6*step
}

// chooseWindow decides how long windows are.
func (p *Replay) chooseWindow(step float64) error {
	window := p.options.Window
	expected := float64(p.reader.Expected()) * step
	switch {
	case window != 0:
		if !(window >= shortestTicks*step && window/step <= 1<<20) {
			return fmt.Errorf("window: %g s is not between %g s and %g s, %d and %d samples", window, shortestTicks*step, step*(1<<20), shortestTicks, 1<<20)
		}
	default:
		window = usualWindow
		if own := p.energyWindow(); own > 0 {
			window = own
		}
		if expected > 0 {
			window = min(window, expected/8)
		}
	}
	p.window = max(2*int(math.Round(min(window/step, 1<<20)/2)), shortestTicks)
	if p.options.Window == 0 {
		p.window = quick(p.window)
	}
	return nil
}

// quick returns the length nearest to n whose Fourier transform takes least time:
// 4, 5 or 6 times a power of two.
func quick(n int) int {
	best := 4
	for unit := 1; unit*4 <= 2*n; unit *= 2 {
		for times := 4; times <= 6; times++ {
			if length := unit * times; max(length-n, n-length) < max(best-n, n-best) {
				best = length
			}
		}
	}
	return best
}

// energyWindow is the window of the energy margin of the test that was logged, s;
// 0 where it is not known.
func (p *Replay) energyWindow() float64 {
	if p.provenance == nil {
		return 0
	}
	l, err := p.provenance.BuildLoop(scenarios.Configured)
	if err != nil {
		return 0
	}
	return l.Window()
}

// Stretch is a stretch of the record: the samples of every channel, views that the
// next one overwrites, and the margin as it was logged, nil if it was not.
type Stretch struct {
	First    int64
	N        int
	Channels []runlog.Samples
	Margin   []float64
}

// Advance takes up to n samples more through the gauges and returns them; ok is
// false at the end of the record, or where it cannot be read on. It may return
// fewer than n.
func (p *Replay) Advance(n int) (s *Stretch, ok bool) {
	b := p.reader.Block()
	if p.taken == b.N {
		if !p.reader.Next() {
			return nil, false
		}
		p.taken = 0
	}
	from, to := p.taken, min(p.taken+n, b.N)
	p.taken = to
	s = &p.stretch
	s.First, s.N = b.First+int64(from), to-from
	if s.Channels == nil {
		s.Channels = make([]runlog.Samples, len(p.channels))
	}
	for j, c := range p.channels {
		for role, v := range b.Channels[j] {
			if v != nil {
				s.Channels[j][role] = v[from:to]
			}
		}
		if b.Margin != nil {
			s.Margin = b.Margin[from:to]
		}
		c.add(s.First, &s.Channels[j], s.Margin)
	}
	for k, m := range s.Margin {
		if p.marginLast = m; m < p.marginLeast {
			p.marginLeast, p.marginAt = m, s.First+int64(k)
		}
	}
	return s, true
}

// Err returns the error that ended the record, nil at its end.
func (p *Replay) Err() error { return p.reader.Err() }

// Close closes the log.
func (p *Replay) Close() error { return p.reader.Close() }

// Time returns the time of a sample, s of the log.
func (p *Replay) Time(sample int64) float64 {
	return p.reader.Start() + float64(sample)*p.reader.Step()
}

// Tick returns the physical time between samples, s.
func (p *Replay) Tick() float64 { return p.tick }

// Channels returns the channels of the record.
func (p *Replay) Channels() []runlog.Channel { return p.reader.Channels() }

// Subspace returns the synchronization subspace of channel j over the window that
// ends where the record stands.
func (p *Replay) Subspace(j int) gauge.Ellipse { return p.channels[j].tracking.Subspace() }

// Of judges a whole log. When ctx ends first it judges what was read, and says so.
func Of(ctx context.Context, path string, o Options) (*Report, error) {
	p, err := Open(path, o)
	if err != nil {
		return nil, err
	}
	defer p.Close()
	if o.Against != nil {
		if err := p.checkAgainst(o.Against); err != nil {
			return nil, err
		}
	}
	passes := int64(1)
	if o.Against != nil {
		passes += int64(len(p.channels))
	}
	told := func(pass int64) {
		if size := p.reader.Size(); o.Progress != nil && size > 0 {
			o.Progress(pass*size+p.reader.Offset(), passes*size)
		}
	}
	for more := true; more && ctx.Err() == nil; {
		_, more = p.Advance(math.MaxInt32)
		told(0)
	}
	if err := p.Err(); err != nil {
		return nil, err
	}
	rep := p.Report()
	rep.Interrupted = ctx.Err() != nil
	if o.Against != nil && !rep.Interrupted {
		err = p.against(ctx, rep, o.Against, func(pass, bytes int64) {
			if size := p.reader.Size(); o.Progress != nil && size > 0 {
				o.Progress(pass*size+bytes, passes*size)
			}
		})
	}
	return rep, err
}

// Report gathers the figures of what has been taken through the gauges.
func (p *Replay) Report() *Report {
	n := p.stretch.First + int64(p.stretch.N)
	rep := &Report{
		Log: p.path, Rate: 1 / p.tick, Slowdown: p.slowdown, Start: rtloop.Figure(p.reader.Start()),
		Time: rtloop.Figure(float64(max(n-1, 0)) * p.reader.Step()), Samples: n, Window: float64(p.window) * p.reader.Step(),
		Notes: append(append([]string{}, p.reader.Notes()...), p.notes...), Energy: p.energy(),
	}
	if p.provenance != nil {
		rep.Title = p.provenance.Title
	}
	for j, c := range p.channels {
		one := Channel{ChannelResult: c.result(), Windows: c.windows.all(c.tracking.PeakTarget(), p.Time)}
		if !c.Has[runlog.Force] {
			for i := range one.Windows {
				one.Windows[i].Injected = rtloop.Figure(math.NaN())
			}
		}
		one.Worst = p.worst(j, one.Windows)
		rep.Channels = append(rep.Channels, one)
	}
	return rep
}

// energy adds up what the forces of all channels did; undefined unless every
// channel has its force.
func (p *Replay) energy() Energy {
	nan := rtloop.Figure(math.NaN())
	e := Energy{nan, nan, nan, nan, nan}
	var injected, work float64
	all := true
	for _, c := range p.channels {
		all = all && c.Has[runlog.Force]
		injected += c.injected.Value()
		work += c.work.Value()
	}
	if all {
		e.Injected, e.Specimen = rtloop.Figure(injected), rtloop.Figure(work)
	}
	if e.MarginFinal = rtloop.Figure(p.marginLast); !math.IsInf(p.marginLeast, 1) {
		e.MarginMin, e.MarginWhen = rtloop.Figure(p.marginLeast), rtloop.Figure(p.Time(p.marginAt))
	}
	return e
}
