package main

import (
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"antelag/scenarios"
	"antelag/scenarios/study/tempo"
)

// tempoOptions are the flags of tempo.
type tempoOptions struct {
	sets      []string
	slowdowns string
	png       string
	options   tempo.Options
	force     bool
	json      bool
}

func newTempo() *cobra.Command {
	o := &tempoOptions{}
	cmd := &cobra.Command{
		Use:   "tempo SCENARIO",
		Short: "what running slower gains in synchronization and costs in rate effects",
		Long: `Run a scenario at several slowdowns and show what each gains and costs: tracking,
energy margin and delay margin get better, but a specimen that is moved more slowly
than in the real structure answers with other forces. The error of the response is
split into the two: what synchronization costs (actuator, compensator, sensors,
against the same slow test with perfect ones) and what lost rate effects cost (that
perfect slow test against the reference at real speed).

Names the fastest slowdown that passes [accept]. Exit code: 0 there is one, 1 there is
none, 2 bad input.

` + cautions,
		Args:              oneScenario("tempo"),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.slowdowns, "slowdown", tempo.Default, "the slowdowns `a:b:n`, n of them from a to b, evenly in the logarithm")
	f.StringVar(&o.options.Lane, "lane", scenarios.Configured, "judge the lane of this `NAME`")
	f.StringVar(&o.png, "png", "", "draw everything into this `FILE`, PNG or SVG by its ending")
	f.IntVar(&o.options.Workers, "workers", 0, "run `N` slowdowns at once (default: as many as there are cores)")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *tempoOptions) run(cmd *cobra.Command, args []string) error {
	s, slowdowns, err := o.prepare(args[0])
	if err != nil {
		return err
	}
	bar := newProgress(s.Name)
	defer bar.clear()
	defer context.AfterFunc(cmd.Context(), bar.clear)()
	o.options.Progress = bar.report
	r, err := tempo.Run(cmd.Context(), s, slowdowns, o.options)
	bar.clear()
	if r == nil {
		return err
	}
	if o.json {
		err = writeJSON(cmd.OutOrStdout(), r)
	} else {
		err = r.WriteText(cmd.OutOrStdout(), columns(), inColour())
	}
	if err == nil && len(r.Points) > 0 {
		err = savePicture("--png", o.png, o.force, r.Picture)
	}
	switch {
	case err != nil:
		return &failure{err}
	case cmd.Context().Err() != nil, r.Limits && r.Fastest() < 0:
		return errVerdict
	}
	return nil
}

// prepare reads everything that can be wrong before anything runs.
func (o *tempoOptions) prepare(name string) (*scenarios.Scenario, []float64, error) {
	if err := checkWorkers(o.options.Workers); err != nil {
		return nil, nil, err
	}
	if err := refuse([]output{{flag: "--png", path: o.png, picture: true}}, o.force, theScenario, name); err != nil {
		return nil, nil, err
	}
	changes, err := parseChanges(o.sets)
	if err != nil {
		return nil, nil, err
	}
	s, err := scenarios.Load(name, changes...)
	if err != nil {
		return nil, nil, err
	}
	if err := s.CheckLane(o.options.Lane); err != nil {
		return nil, nil, fmt.Errorf("--lane: %w", err)
	}
	slowdowns, err := tempo.Slowdowns(s, o.slowdowns)
	if err != nil {
		return nil, nil, fmt.Errorf("--slowdown: %w", err)
	}
	return s, slowdowns, nil
}
