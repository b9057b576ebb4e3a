package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"antelag/scenarios/study/identified"
	"antelag/tui/canvas"
)

// identifyOptions are the flags of identify.
type identifyOptions struct {
	log      logFlags
	slowdown float64
	hold     string
	write    string
	png      string
	force    bool
	json     bool
}

func newIdentify() *cobra.Command {
	o := &identifyOptions{}
	cmd := &cobra.Command{
		Use:   "identify LOG",
		Short: "fit today's actuator to a log: gain, delay, lag, frequency response",
		Long: `Fit an actuator to what it was commanded and what it did: gain, delay and lag with
standard errors, as "lag-delay" and as "second-order"; the frequency response with
coherence; the delay against frequency and amplitude; and what the record cannot
tell. The fitted block is printed, to paste into a scenario, or written with --write.
The fit includes the lag of the displacement sensor. A sweep or band noise over all
frequencies that the test will have, as large as the test will be, tells the most.

` + aboutLogs + `

Exit code: 0 good, 1 it could not write or was interrupted, 2 bad input.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) != 1 {
				return errors.New("identify takes one LOG: a file that run wrote, or any table of time, command and measured")
			}
			return nil
		},
		RunE: o.run,
	}
	o.log.flags(cmd)
	f := cmd.Flags()
	f.Float64Var(&o.slowdown, "slowdown", 0, "physical `SECONDS` that a second of the log took (default: as the log was written)")
	f.StringVar(&o.hold, "hold", "", "how commands followed each other, a `HOLD`: ramp or step (default: as the log was written, or ramp)")
	f.StringVar(&o.write, "write", "", "write the fitted block into this `FILE`")
	f.StringVar(&o.png, "png", "", "draw the frequency response into this `FILE`, PNG or SVG by its ending")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the text")
	return cmd
}

func (o *identifyOptions) run(cmd *cobra.Command, args []string) error {
	options, err := o.options(args[0], cmd.Flags().Changed("slowdown"))
	if err != nil {
		return err
	}
	rep, err := o.identify(cmd.Context(), args[0], options)
	if errors.Is(err, context.Canceled) {
		return &failure{errors.New("interrupted before there was a fit; nothing was written")}
	}
	if err != nil {
		return err
	}
	unusable := rep.Usable()
	if o.write != "" && unusable != nil {
		return fmt.Errorf("--write: %w", unusable)
	}
	wrote := cmp.Or(saveFile("--write", o.write, o.force, func() []byte { return []byte(rep.Block()) }), savePicture("--png", o.png, o.force, rep.Figure))
	if err := o.print(cmd.OutOrStdout(), rep); err != nil {
		return &failure{err}
	}
	if wrote != nil {
		return &failure{wrote}
	}
	return nil
}

// options reads everything that can be wrong before anything is read or written.
func (o *identifyOptions) options(log string, slowed bool) (identified.Options, error) {
	out := identified.Options{Slowdown: o.slowdown, Hold: o.hold}
	var err error
	if out.Log, err = o.log.options(); err != nil {
		return out, err
	}
	if slowed && !(o.slowdown > 0) {
		return out, fmt.Errorf("--slowdown %g: it must be above zero", o.slowdown)
	}
	if o.hold != "" && o.hold != "ramp" && o.hold != "step" {
		return out, fmt.Errorf("--hold %s: allowed are ramp and step", o.hold)
	}
	return out, refuse([]output{{flag: "--write", path: o.write}, {flag: "--png", path: o.png, picture: true}},
		o.force, ofTheLog, log, log+".toml")
}

func (o *identifyOptions) identify(ctx context.Context, log string, options identified.Options) (*identified.Report, error) {
	bar := newProgress(log)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	options.Progress = bar.report
	return identified.Of(ctx, log, options)
}

func (o *identifyOptions) print(out io.Writer, rep *identified.Report) error {
	if o.json {
		return writeJSON(out, rep)
	}
	if err := rep.WriteText(out); err != nil {
		return err
	}
	if width, _, err := term.GetSize(int(os.Stdout.Fd())); err == nil {
		_, err = fmt.Fprintf(out, "\n%s\n", plotResponse(rep.Curves(), min(width-1, 100)))
		return err
	}
	return nil
}

// plotResponse draws gain and delay against frequency for a terminal.
func plotResponse(c *identified.Curves, width int) string {
	grid := canvas.NewGrid(width, 22)
	whole := grid.Whole()
	panel := func(r canvas.Region, unit string, record, fit []float64) {
		keys := []canvas.Key{{Name: "record", Ink: canvas.Measured}, {Name: "fit", Ink: canvas.Target, Style: canvas.Dotted}}
		p := canvas.Plot{X: canvas.Axis{Lo: 0, Hi: c.Hz[len(c.Hz)-1], Unit: "Hz"}, Y: canvas.Axis{Unit: unit}, Legend: keys}
		lo, hi := canvas.Extent(record, fit)
		margin := 0.05 * (hi - lo)
		p.Y.Lo, p.Y.Hi = lo-margin, hi+margin
		p.Begin(r)
		p.DrawSeries(keys[0], c.Hz, record)
		p.DrawSeries(keys[1], c.Hz, fit)
		p.End()
	}
	w, h := whole.Size()
	panel(whole.Sub(0, 0, w, h/2), "gain", c.Gain, c.FitGain)
	panel(whole.Sub(0, h/2, w, h-h/2), "ms late", c.Delay, c.FitDelay)
	return grid.String()
}
