package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"antelag/scenarios"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study"
	"antelag/scenarios/study/margin"
	"antelag/scenarios/study/tune"
)

// tuneOptions are the flags of tune.
type tuneOptions struct {
	options                        tune.Options
	energy, delay, velocity, noise string
	time                           string
	law, record, write, png        string
	force, json                    bool
}

func newTune() *cobra.Command {
	o := &tuneOptions{}
	cmd := &cobra.Command{
		Use:   "tune SCENARIO",
		Short: "find the settings that are best in the worst case over [spread]",
		Long: `Find the settings of one or more compensators with which a figure is best in the
worst case over draws from [spread], and with which limits hold: no run may trip,
the scenario as it is must meet its [accept], and energy margin, delay margin,
command velocity and noise gain must be within what is asked for.

The search goes wide, then close, and is the same for a seed and any number of
workers. --record keeps all that was tried; the same command goes on with it.
--write makes a new scenario file of the best. Exit code: 0 a setting passes, 1 none
does, 2 bad input.

` + cautions,
		Args:              oneScenario("tune"),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.options.Sets, "set", nil, setHelp)
	f.StringArrayVar(&o.options.Over, "over", nil, "tune a setting, `SETTING=a:b` or SETTING=a:b:log; may be repeated")
	f.StringVar(&o.options.Lane, "lane", scenarios.Configured, "judge the lane of this `NAME`")
	f.StringVar(&o.options.Figure, "figure", "", "make the figure of this `NAME` small (default: response_error, or nrmse without a structure)")
	f.Float64Var(&o.options.Quantile, "quantile", 1, "the `SHARE` of the runs that it stands for; 1 is the worst case")
	f.IntVar(&o.options.Draws, "draws", 20, "judge a setting by `N` draws from [spread]")
	f.StringVar(&o.law, "law", "", "the `LAW` of the draws: uniform, or normal with the ends at three standard deviations (default: uniform)")
	f.Int64Var(&o.options.Seed, "seed", 1, "seed `N` of draws and search")
	f.StringVar(&o.energy, "energy-margin", "", "keep the energy margin of all runs to this `RATIO` at least (default: that of [accept])")
	f.StringVar(&o.delay, "delay-margin", "0 s", "keep the delay margin to this `TIME` at least; 0 s: the loop must be stable")
	f.StringVar(&o.velocity, "command-velocity", "", "keep commands to this `VELOCITY` at the most, like \"0.5 m/s\" (default: what trips the channel)")
	f.StringVar(&o.noise, "noise-gain", "", "keep the gain of the command over a target of up to 50 Hz to this `RATIO` at the most, like 8")
	f.Int64Var(&o.options.Runs, "runs", 0, "make about `N` runs at the most")
	f.StringVar(&o.time, "time", "", "search for this `TIME` at the most, like \"20 s\"")
	f.IntVar(&o.options.Workers, "workers", 0, "make `N` runs at once (default: as many as there are cores)")
	f.StringVar(&o.record, "record", "", "keep all that was tried in this CSV `FILE`, and go on with it")
	f.StringVar(&o.write, "write", "", "write the scenario with the best settings, if they pass, to this `FILE`")
	f.StringVar(&o.png, "png", "", "draw accuracy against margin into this `FILE`, PNG or SVG by its ending")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *tuneOptions) run(cmd *cobra.Command, args []string) error {
	p, err := o.prepare(cmd, args[0])
	if err != nil {
		return err
	}
	var record *tune.Record
	if o.record != "" {
		if record, err = p.OpenRecord(o.record, version(), o.force); err != nil {
			return fileError("--record", err)
		}
		defer record.Close() //nolint:errcheck // every row is out when it has been appended
	}
	r, err := o.search(cmd.Context(), p, record)
	if r == nil || r.Best == nil {
		return &failure{err}
	}
	if e := o.print(cmd, r); e != nil {
		return &failure{e}
	}
	if e := o.files(r); err == nil {
		err = e
	}
	switch {
	case err != nil && !errors.Is(err, context.Canceled):
		return &failure{err}
	case err != nil || !r.Pass() || cmd.Context().Err() != nil:
		return errVerdict
	}
	return nil
}

// prepare reads everything that can be wrong before anything is written.
func (o *tuneOptions) prepare(cmd *cobra.Command, name string) (*tune.Problem, error) {
	if err := refuse([]output{{flag: "--record", path: o.record, goesOn: true}, {flag: "--write", path: o.write}, {flag: "--png", path: o.png, picture: true}},
		o.force, theScenario, name); err != nil {
		return nil, err
	}
	if err := o.readLimits(); err != nil {
		return nil, err
	}
	if err := checkWorkers(o.options.Workers); err != nil {
		return nil, err
	}
	if o.options.Workers == 0 {
		o.options.Workers = runtime.GOMAXPROCS(0)
	}
	run := runOptions{sets: o.options.Sets}
	tests, err := run.load([]string{name})
	if err != nil {
		return nil, err
	}
	if err := tests[0].CheckLane(o.options.Lane); err != nil {
		return nil, fmt.Errorf("--lane: %w", err)
	}
	if err := o.readMargin(cmd, tests[0]); err != nil {
		return nil, err
	}
	p, err := tune.New(tests[0], o.options)
	if err != nil {
		return nil, err
	}
	_, err = tests[0].Build()
	return p, err
}

// readMargin has the delay margin taken where the loop has one. That a loop is
// none, or has parts that cannot be linearized, matters only to who asks for a
// margin.
func (o *tuneOptions) readMargin(cmd *cobra.Command, s *scenarios.Scenario) error {
	asked := cmd.Flags().Changed("delay-margin")
	_, err := margin.Of(cmd.Context(), s, margin.Options{Lane: o.options.Lane, Quick: true})
	switch {
	case err == nil:
		o.options.Delay = func(ctx context.Context, s *scenarios.Scenario) (float64, error) {
			r, err := margin.Of(ctx, s, margin.Options{Lane: o.options.Lane, Quick: true})
			if err != nil {
				return 0, err
			}
			return r.LeastDelay(), nil
		}
	case asked:
		return fmt.Errorf("--delay-margin: %w", err)
	}
	return nil
}

// readLimits reads what has a unit, or may be left out.
func (o *tuneOptions) readLimits() (err error) {
	limits := &o.options.Limits
	*limits = tune.NoLimits
	for _, f := range []struct {
		flag, text string
		dim        quantity.Dim
		low        float64
		to         *float64
	}{
		{"energy-margin", o.energy, quantity.None, math.Inf(-1), &limits.EnergyMargin},
		{"delay-margin", o.delay, quantity.Time, 0, &limits.DelayMargin},
		{"command-velocity", o.velocity, quantity.Velocity, 0, &limits.CommandVelocity},
		{"noise-gain", o.noise, quantity.None, 0, &limits.NoiseGain},
	} {
		if f.text == "" {
			continue
		}
		if *f.to, err = quantity.ParseAs(strings.TrimSpace(f.text), f.dim); err == nil && *f.to < f.low {
			err = fmt.Errorf("%s is below 0", f.text)
		}
		if err != nil {
			return fmt.Errorf("--%s: %w", f.flag, err)
		}
	}
	if o.time != "" {
		seconds, err := quantity.ParseAs(o.time, quantity.Time)
		if err == nil && !(seconds > 0 && seconds < 1e7) {
			err = fmt.Errorf("%s is no time to search for", o.time)
		}
		if err != nil {
			return fmt.Errorf("--time: %w", err)
		}
		o.options.Time = time.Duration(seconds * float64(time.Second))
	}
	if o.options.Runs < 0 {
		return fmt.Errorf("--runs %d: allowed is a whole number from 1 on", o.options.Runs)
	}
	o.options.Law, err = study.ParseLaw(o.law)
	return err
}

func (o *tuneOptions) search(ctx context.Context, p *tune.Problem, record *tune.Record) (*tune.Result, error) {
	bar := newProgress(p.Scenario.Name)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	p.Progress = bar.report
	began := time.Now()
	r, err := p.Search(ctx, record)
	if r == nil {
		return nil, err
	}
	r.Wall, r.Workers = time.Since(began).Seconds(), p.Workers
	if err == nil && ctx.Err() == nil {
		err = r.Again(ctx)
	}
	return r, err
}

func (o *tuneOptions) print(cmd *cobra.Command, r *tune.Result) error {
	if o.json {
		return writeJSON(cmd.OutOrStdout(), r)
	}
	return r.WriteText(cmd.OutOrStdout(), inColour())
}

// files writes the new scenario and the picture.
func (o *tuneOptions) files(r *tune.Result) error {
	if o.write != "" && r.Pass() { // what does not pass is not to be used
		s, err := r.Problem.Tuned(r.Best)
		if err != nil {
			return err
		}
		if err := saveFile("--write", o.write, o.force, func() []byte { return []byte(s.Resolved()) }); err != nil {
			return err
		}
	}
	return savePicture("--png", o.png, o.force, r.Picture)
}
