package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"slices"

	"github.com/spf13/cobra"

	"antelag/rtloop/runlog"
	"antelag/scenarios"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study/replay"
	"antelag/tui"
)

// replayOptions are the flags of replay.
type replayOptions struct {
	log      logFlags
	window   string
	slowdown float64
	against  string
	sets     []string
	csv, png string
	live     bool
	speed    float64
	force    bool
	json     bool
}

func newReplay() *cobra.Command {
	o := &replayOptions{}
	cmd := &cobra.Command{
		Use:   "replay LOG",
		Short: "judge what really happened in a test, from its log",
		Long: `Judge a recorded test: every gauge of tracking over the whole record and over time,
the energy that late force put in, and the moments where it was worst. With
--against its target drives the actuator of a scenario under every lane, with the
loop open, and they are ranked.

` + aboutLogs + `

Exit code: 0 good; 1 the configured lane of --against failed a limit on tracking,
tripped or diverged; 2 bad input.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) != 1 {
				return errors.New("replay takes one LOG: a file that run wrote, or any table of time, target and measured")
			}
			return nil
		},
		RunE: o.run,
	}
	o.log.flags(cmd)
	f := cmd.Flags()
	f.StringVar(&o.window, "window", "", "make the windows over time this `TIME` long (default: about 5 s, or that of the energy margin)")
	f.Float64Var(&o.slowdown, "slowdown", 0, "physical `SECONDS` that a second of the log took (default: as the log was written)")
	f.StringVar(&o.against, "against", "", "drive the actuator and lanes of this `SCENARIO` with the recorded target")
	f.StringArrayVar(&o.sets, "set", nil, setHelp+"; of --against")
	f.StringVar(&o.csv, "csv", "", "write the windows to this CSV `FILE`")
	f.StringVar(&o.png, "png", "", "draw the windows into this `FILE`, PNG or SVG by its ending")
	f.BoolVar(&o.live, "live", false, "play it on the dashboard's panels; ? shows the keys")
	f.Float64Var(&o.speed, "speed", 1, "begin to play --live `N` times as fast as the test, 1/64 to 64")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *replayOptions) run(cmd *cobra.Command, args []string) error {
	options, err := o.options(args[0], cmd.Flags().Changed("slowdown"))
	if err != nil {
		return err
	}
	if o.live {
		return o.play(cmd.Context(), args[0], options)
	}
	rep, err := o.replay(cmd.Context(), args[0], options)
	if err != nil {
		return err
	}
	wrote := cmp.Or(saveFile("--csv", o.csv, o.force, rep.CSV), savePicture("--png", o.png, o.force, rep.Figure))
	if err := o.print(cmd.OutOrStdout(), rep); err != nil {
		return &failure{err}
	}
	switch {
	case wrote != nil:
		return &failure{wrote}
	case rep.Interrupted || !rep.Pass():
		return errVerdict
	}
	return nil
}

// options reads everything that can be wrong before anything is read or written.
func (o *replayOptions) options(log string, slowed bool) (replay.Options, error) {
	out := replay.Options{Slowdown: o.slowdown}
	var err error
	if out.Log, err = o.log.options(); err != nil {
		return out, err
	}
	if slowed && !(o.slowdown > 0) {
		return out, fmt.Errorf("--slowdown %g: it must be above zero", o.slowdown)
	}
	if o.window != "" {
		if out.Window, err = quantity.ParseAs(o.window, quantity.Time); err == nil && !(out.Window > 0) {
			err = fmt.Errorf("%s must be above zero", o.window)
		}
		if err != nil {
			return out, fmt.Errorf("--window: %w", err)
		}
	}
	if err := refuse([]output{{flag: "--csv", path: o.csv}, {flag: "--png", path: o.png, picture: true}},
		o.force, ofTheLog, log, log+".toml"); err != nil {
		return out, err
	}
	if o.against == "" {
		if len(o.sets) > 0 {
			return out, errors.New("--set changes the scenario of --against; there is none")
		}
		return out, nil
	}
	out.Against, err = o.load()
	return out, err
}

// play plays the log on the terminal. Bad input comes before the want of one.
func (o *replayOptions) play(ctx context.Context, log string, options replay.Options) error {
	if o.csv != "" || o.png != "" || o.json || o.against != "" {
		return errors.New("--live shows the log and writes nothing: leave out --csv, --png, --json and --against")
	}
	if !(o.speed >= tui.SlowestPlay && o.speed <= tui.FastestPlay) {
		return fmt.Errorf("--speed %g: it must be between 1/64 and 64", o.speed)
	}
	opened, err := replay.Open(log, options)
	if err != nil {
		return err
	}
	slowdown := opened.Slowdown()
	if err := opened.Close(); err != nil {
		return err
	}
	if !onTerminal() {
		return errors.New("replay --live needs a terminal on stdin and stdout; without --live it prints what the log says")
	}
	options.Log.Need = []runlog.Role{runlog.Target, runlog.Measured}
	return onDashboard(tui.Play(ctx, log, tui.PlayOptions{Log: options.Log, Slowdown: slowdown, Speed: o.speed},
		func(ctx context.Context) (float64, []tui.Moment, error) { return overview(ctx, log, options) }))
}

// overview is what the whole log says, for the dashboard.
func overview(ctx context.Context, log string, options replay.Options) (end float64, worst []tui.Moment, err error) {
	rep, err := replay.Of(ctx, log, options)
	if err != nil {
		return 0, nil, err
	}
	for _, c := range rep.Channels {
		for _, m := range c.Worst {
			text := m.Words()
			if len(rep.Channels) > 1 {
				text = c.Name + ": " + text
			}
			worst = append(worst, tui.Moment{Time: float64(m.End), Text: text})
		}
	}
	slices.SortStableFunc(worst, func(a, b tui.Moment) int { return cmp.Compare(a.Time, b.Time) })
	return float64(rep.Start + rep.Time), worst, nil
}

func (o *replayOptions) load() (*scenarios.Scenario, error) {
	run := runOptions{sets: o.sets}
	tests, err := run.load([]string{o.against})
	if err != nil {
		return nil, err
	}
	return tests[0], nil
}

func (o *replayOptions) replay(ctx context.Context, log string, options replay.Options) (*replay.Report, error) {
	bar := newProgress(log)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	options.Progress = bar.report
	return replay.Of(ctx, log, options)
}

func (o *replayOptions) print(out io.Writer, rep *replay.Report) error {
	if o.json {
		return writeJSON(out, rep)
	}
	return rep.WriteText(out, inColour())
}
