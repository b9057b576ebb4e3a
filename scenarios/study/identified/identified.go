// Package identified fits an actuator to a log: it reads command and measured
// displacement of one channel, hands them to plant/identify, and says the result
// as text, JSON, picture and as a block of settings to paste into a scenario.
package identified

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"strings"

	"antelag/plant"
	"antelag/plant/identify"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
)

// Options are the choices of Of. The zero value is good.
type Options struct {
	Log runlog.Options
	// Slowdown is how many physical seconds a second of the log took; 0: what the
	// provenance beside the log says, or 1.
	Slowdown float64
	// Hold is "ramp" or "step", how commands followed each other; "": what the
	// provenance says, or a ramp.
	Hold     string
	Fit      identify.Options
	Progress func(done, of int64) // bytes read; may be nil
}

// mostRead bounds the samples that are kept, 16 bytes each.
const mostRead = 1 << 25

// Of reads a log and fits the actuator. An error says what is wrong with the log,
// or that the context has ended.
func Of(ctx context.Context, path string, o Options) (*Report, error) {
	if o.Slowdown != 0 && !(o.Slowdown > 0 && o.Slowdown <= 1e6) {
		return nil, fmt.Errorf("slowdown: %g is not between 0 and 1e6", o.Slowdown)
	}
	o.Log.Need, o.Log.Lean = []runlog.Role{runlog.Command, runlog.Measured}, true
	r, err := runlog.Open(path, o.Log)
	if err != nil {
		return nil, err
	}
	defer r.Close()
	if err := one(path, r.Channels()); err != nil {
		return nil, err
	}
	rep := &Report{Log: path, Channel: r.Channels()[0].Name, Start: 0}
	rec, err := read(ctx, r, &o)
	if err != nil {
		return nil, err
	}
	rep.Start = r.Start()
	rep.Notes = r.Notes()
	if len(rec.Command) == mostRead {
		rep.Notes = append(rep.Notes, fmt.Sprintf("only the first %d samples were read", mostRead))
	}
	rep.provenance(&rec, r, &o)
	if rep.Result, err = identify.Identify(ctx, rec, o.Fit); err != nil {
		if ctx.Err() != nil {
			return nil, err
		}
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	rep.Hold = rec.Hold
	return rep, nil
}

// one makes sure that it is clear which channel is meant.
func one(path string, channels []runlog.Channel) error {
	if len(channels) == 1 {
		return nil
	}
	var names []string
	for _, c := range channels {
		names = append(names, c.Name)
	}
	return fmt.Errorf("%s: has the channels %s; say which with --channel", path, strings.Join(names, ", "))
}

func read(ctx context.Context, r *runlog.Reader, o *Options) (rec identify.Record, err error) {
	// A little more than expected, so that a guess just short does not double it.
	room := min(r.Expected()+r.Expected()/32, mostRead)
	rec.Command, rec.Measured = make([]float64, 0, room), make([]float64, 0, room)
	for r.Next() && len(rec.Command) < mostRead {
		if err := ctx.Err(); err != nil {
			return rec, err
		}
		b := r.Block()
		n := min(b.N, mostRead-len(rec.Command))
		rec.Command = append(rec.Command, b.Channels[0][runlog.Command][:n]...)
		rec.Measured = append(rec.Measured, b.Channels[0][runlog.Measured][:n]...)
		if o.Progress != nil && r.Size() > 0 {
			o.Progress(r.Offset(), r.Size())
		}
	}
	rec.Tick = r.Step()
	return rec, r.Err()
}

// provenance takes slowdown and hold from what run wrote beside the log, unless
// they were given. A file that does not belong to the log is no matter.
func (rep *Report) provenance(rec *identify.Record, r *runlog.Reader, o *Options) {
	slowdown, hold := o.Slowdown, o.Hold
	s, err := scenarios.Load(rep.Log + ".toml")
	switch {
	case err == nil && belongs(s, r):
		if slowdown == 0 {
			slowdown = s.Loop.Num("slowdown")
		}
		if hold == "" {
			hold = s.Loop.Text("hold")
		}
	case err == nil:
		rep.Notes = append(rep.Notes, rep.Log+".toml does not fit the log, by its channels or its rate, and was not used")
	case !errors.Is(err, fs.ErrNotExist) && exists(rep.Log+".toml"):
		rep.Notes = append(rep.Notes, fmt.Sprintf("%v; it was not used", err))
	}
	if slowdown == 0 {
		slowdown = 1
	}
	if hold == "step" {
		rec.Hold = plant.Step
	}
	rec.Tick *= slowdown
	rep.Slowdown = slowdown
}

// belongs reports whether a scenario is where the log comes from.
func belongs(s *scenarios.Scenario, r *runlog.Reader) bool {
	names := map[string]bool{runlog.Unnamed: true}
	for _, n := range s.ChannelNames() {
		names[n] = true
	}
	step := 1 / (s.Loop.Num("rate") * s.Loop.Num("slowdown"))
	return names[r.Channels()[0].Name] && math.Abs(step-r.Step()) < 1e-6*step
}
