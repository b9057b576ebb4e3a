// Package margin says for a scenario how far its loop is from growing by itself:
// the least damped mode, the extra delay and the gain of the measured force at which
// stability is lost, and maps of it over two settings. What it judges is the loop that
// runs, linearized about rest (package stability).
package margin

import (
	"context"
	"errors"
	"fmt"

	"antelag/rtloop"
	"antelag/rtloop/stability"
	"antelag/scenarios"
	"antelag/scenarios/quantity"
)

// Options say how a scenario is judged. The zero value is good.
type Options struct {
	Lane     string // whose compensators; "": the configured lane
	AfterRun bool   // adaptive compensators with what they have learned by the end of the run, not with what they start from
	Workers  int    // how many goroutines a map may keep busy; 0: one for each core
	// Quick leaves out the eigenvalues of the whole state matrix, which confirm the
	// spectral radius; the report is the same.
	Quick bool
	// Progress, which may be nil, is told how much of a map, or of a run, is done.
	Progress func(done, of int64)
	Measure  Measure // what a map holds
}

func (o Options) lane() string {
	if o.Lane == "" {
		return scenarios.Configured
	}
	return o.Lane
}

// Neutral is how far above 1 a spectral radius may be by rounding alone. At 4096 Hz a
// motion would grow by a millionth in a quarter of a second.
const Neutral = 1e-9

// eigenStates is the number of states up to which eigenvalues take less than a second.
const eigenStates = 450

// Of judges a scenario. Errors are *scenarios.Error where the scenario has no such
// margins: a driven target has no loop, some elements no tangent.
func Of(ctx context.Context, s *scenarios.Scenario, o Options) (*Report, error) {
	if err := s.CheckLane(o.lane()); err != nil {
		return nil, err
	}
	s, err := s.Plain()
	if err != nil {
		return nil, err
	}
	learned, err := learn(ctx, s, o, o.Progress)
	if err != nil {
		return nil, err
	}
	a := &analyst{s: s, o: o, learned: learned}
	base, linear, err := a.model(s)
	if err != nil {
		return nil, err
	}
	a.base = base
	r := &Report{Scenario: s.Name, Lane: o.lane(), AfterRun: o.AfterRun, Notes: notes(s)}
	if learned != nil && learned.Outcome() != rtloop.Completed {
		r.Notes = append(r.Notes, fmt.Sprintf("the run %s after %s; learned was what it learned until then", learned.Outcome(), quantity.Short(learned.Time(), quantity.Time)))
	}
	if err := a.modes(r, linear); err != nil {
		return nil, err
	}
	for j := range s.Channels {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		m, err := a.margins(ctx, j)
		if err != nil {
			return nil, err
		}
		c := Channel{Name: s.Channels[j].Name, Margins: *m, CriticalDelay: undefined}
		if m.DelayMargin.Defined() {
			c.CriticalDelay = rtloop.Figure(a.delay(j)) + m.DelayMargin
		}
		r.Channels = append(r.Channels, c)
	}
	if len(r.Channels) == 1 {
		r.Together = r.Channels[0].Margins
	} else {
		m, err := a.margins(ctx, stability.All)
		if err != nil {
			return nil, err
		}
		r.Together = *m
	}
	r.Limiting = r.limiting()
	return r, nil
}

// analyst judges one scenario.
type analyst struct {
	s       *scenarios.Scenario
	o       Options
	learned *rtloop.Loop // whose compensators count; nil: those of the scenario
	base    *stability.Model
	stable  bool
}

// learn runs the scenario where what is learned counts.
func learn(ctx context.Context, s *scenarios.Scenario, o Options, progress func(done, of int64)) (*rtloop.Loop, error) {
	if !o.AfterRun {
		return nil, nil
	}
	if s.Substructure == nil {
		return nil, nil // refused below
	}
	alone, err := s.Alone(o.lane())
	if err != nil {
		return nil, err
	}
	rig, err := alone.Build()
	if err != nil {
		return nil, err
	}
	rig.Reference = nil
	if err := rig.Run(ctx, func(done int64) {
		if progress != nil {
			progress(done, rig.Ticks)
		}
	}); err != nil {
		return nil, err
	}
	if ctx.Err() != nil {
		return nil, ctx.Err()
	}
	return rig.Lanes[0].Loop, nil
}

// model builds the loop of a scenario and its characteristic function.
func (a *analyst) model(s *scenarios.Scenario) (*stability.Model, *rtloop.Loop, error) {
	loop, err := s.BuildLoop(a.o.lane())
	if err != nil {
		return nil, nil, err
	}
	if a.learned != nil {
		loop.TakeLearned(a.learned)
	}
	linear, err := loop.Linear()
	if err != nil {
		return nil, nil, placed(s, err)
	}
	m, err := stability.NewModel(linear)
	return m, linear, err
}

// placed says where in the scenario it is that there is no margin.
func placed(s *scenarios.Scenario, err error) error {
	if errors.Is(err, rtloop.ErrNoLoop) {
		return s.ErrorAt("excitation.drives", err)
	}
	var channel *rtloop.ChannelError
	if errors.As(err, &channel) {
		return s.ErrorAt(fmt.Sprintf("channel[%d].%s", channel.Channel, place(channel.Err)), plain(channel.Err))
	}
	return err
}

// modes fills in radius and modes.
func (a *analyst) modes(r *Report, linear *rtloop.Loop) error {
	poles, err := a.base.Poles()
	if err == nil {
		r.SpectralRadius = rtloop.Figure(size(poles))
		for _, m := range a.base.Modes(poles) {
			r.Modes = append(r.Modes, newMode(m))
		}
	}
	if err != nil || !a.o.Quick {
		if e := a.eigenvalues(r, linear, err != nil); e != nil {
			return e
		}
	}
	if len(r.Modes) > 0 {
		r.Mode = r.Modes[0]
	}
	r.Stable = float64(r.SpectralRadius) <= 1+Neutral
	a.stable = r.Stable
	return nil
}

// eigenvalues confirms the radius by the state matrix, or finds it where the
// characteristic function does not.
func (a *analyst) eigenvalues(r *Report, linear *rtloop.Loop, alone bool) error {
	if r.States = len(linear.State(nil)); r.States > eigenStates && !alone {
		return nil
	}
	system, err := stability.Linearize(linear)
	if err != nil {
		return err
	}
	spectrum, err := system.Spectrum()
	if err != nil {
		return err
	}
	r.Eigenvalues = true
	r.SpectralRadius = rtloop.Figure(spectrum.Radius)
	if alone {
		for _, m := range spectrum.Modes[:min(len(spectrum.Modes), 1)] {
			r.Modes = append(r.Modes, newMode(m))
		}
	}
	return nil
}
