package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"

	"github.com/spf13/cobra"

	"antelag/scenarios"
	"antelag/scenarios/study/margin"
)

// marginOptions are the flags of margin.
type marginOptions struct {
	sets     []string
	grid     string
	measure  string
	png, svg string
	csv      string
	options  margin.Options
	force    bool
	json     bool
}

func newMargin() *cobra.Command {
	o := &marginOptions{}
	cmd := &cobra.Command{
		Use:   "margin SCENARIO",
		Short: "how far the loop is from growing by itself",
		Long: `Say how far the loop of a scenario is from growing by itself, from the loop that
runs: its spectral radius and modes, and the extra delay and the gain of the
measured force at which stability is lost, of each channel and of all together.
It holds for small motions about rest: elements and storeys that yield count with
their initial stiffness.

--map draws the damping of the least damped mode over two settings:

    antelag margin archive --map "damper.actuator.delay=0:30 ms:120,damper.compensator.delay=0:30 ms:120"

Exit code: 0 the loop is stable, or the map is drawn, 1 it grows, 2 bad input.

` + cautions,
		Args:              oneScenario("margin"),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.options.Lane, "lane", scenarios.Configured, "judge the lane of this `NAME`")
	f.BoolVar(&o.options.AfterRun, "after-run", false, "take adaptive compensators with what they have learned by the end of the run")
	f.StringVar(&o.grid, "map", "", "draw a map over two settings, `X=a:b:n,Y=a:b:n`")
	f.StringVar(&o.measure, "measure", "damping", "show this `MEASURE` in pictures of the map: damping, or radius, the spectral radius")
	f.StringVar(&o.png, "png", "", "draw the map into this `FILE`, PNG or SVG by its ending")
	f.StringVar(&o.svg, "svg", "", "draw it into this `FILE` too, so that a page has the one and a paper the other")
	f.StringVar(&o.csv, "csv", "", "write every cell of the map to this CSV `FILE`")
	f.IntVar(&o.options.Workers, "workers", 0, "work out `N` rows of the map at once (default: as many as there are cores)")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *marginOptions) run(cmd *cobra.Command, args []string) error {
	if err := o.check(cmd, args[0]); err != nil {
		return err
	}
	changes, err := parseChanges(o.sets)
	if err != nil {
		return err
	}
	s, err := scenarios.Load(args[0], changes...)
	if err != nil {
		return err
	}
	if err := s.CheckLane(o.options.Lane); err != nil {
		return fmt.Errorf("--lane: %w", err)
	}
	bar := newProgress(s.Name)
	defer bar.clear()
	defer context.AfterFunc(cmd.Context(), bar.clear)()
	o.options.Progress = bar.report
	if o.grid != "" {
		return o.chart(cmd, s, bar)
	}
	r, err := margin.Of(cmd.Context(), s, o.options)
	bar.clear()
	switch {
	case errors.Is(err, context.Canceled):
		return errVerdict
	case err != nil:
		return err
	case o.json:
		err = writeJSON(cmd.OutOrStdout(), r)
	default:
		err = r.WriteText(cmd.OutOrStdout(), inColour())
	}
	switch {
	case err != nil:
		return &failure{err}
	case !r.Stable:
		return errVerdict
	}
	return nil
}

// check looks for what is wrong with the flags, before anything is worked out.
func (o *marginOptions) check(cmd *cobra.Command, scenario string) error {
	for _, name := range []string{"png", "svg", "csv", "measure", "workers"} {
		if o.grid == "" && cmd.Flags().Changed(name) {
			return fmt.Errorf("--%s is for a map; there is no --map", name)
		}
	}
	switch o.measure {
	case "damping":
	case "radius":
		o.options.Measure = margin.Radius
	default:
		return fmt.Errorf("--measure %q: allowed are damping and radius", o.measure)
	}
	if err := checkWorkers(o.options.Workers); err != nil {
		return err
	}
	return refuse([]output{{flag: "--csv", path: o.csv}, {flag: "--png", path: o.png, picture: true}, {flag: "--svg", path: o.svg, picture: true}}, o.force, theScenario, scenario)
}

// chart draws the map.
func (o *marginOptions) chart(cmd *cobra.Command, s *scenarios.Scenario, bar *progress) error {
	x, y, err := margin.ParseMap(s, o.grid)
	if err != nil {
		return fmt.Errorf("--map: %w", err)
	}
	g, err := margin.Map(cmd.Context(), s, x, y, o.options)
	bar.clear()
	broken := errors.Is(err, context.Canceled)
	if err != nil && !broken {
		return err
	}
	if o.json {
		err = writeJSON(cmd.OutOrStdout(), g)
	} else {
		err = g.Draw(cmd.OutOrStdout(), columns())
	}
	if err != nil {
		return &failure{err}
	}
	if err := cmp.Or(saveFile("--csv", o.csv, o.force, g.CSV), savePicture("--png", o.png, o.force, g.Figure), savePicture("--svg", o.svg, o.force, g.Figure)); err != nil {
		return &failure{err}
	}
	if broken {
		return errVerdict
	}
	return nil
}
