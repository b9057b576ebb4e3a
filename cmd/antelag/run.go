package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"antelag/rtloop"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

const setHelp = "change a setting, `PATH=VALUE`, like damper.compensator.delay=\"12 ms\"; may be repeated"

// runOptions are the flags of run.
type runOptions struct {
	sets    []string
	log     string
	logLane string
	force   bool
	json    bool
}

func newRun() *cobra.Command {
	o := &runOptions{}
	cmd := &cobra.Command{
		Use:   "run SCENARIO…",
		Short: "run scenarios headless, as fast as it goes, and judge them",
		Long: `Run scenarios headless and judge them by their acceptance limits. SCENARIO is a
file or the name of an embedded one. The configured lane decides the exit code:
0 good, 1 a limit failed, a trip or divergence, 2 bad input.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return fmt.Errorf("run takes a SCENARIO: a file, or one of %s", strings.Join(scenarios.Names(), ", "))
			}
			return nil
		},
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	o.flags(cmd)
	return cmd
}

// flags gives a command the flags of run.
func (o *runOptions) flags(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.log, "log", "", "write every tick to this CSV `FILE`, with its provenance beside it")
	f.StringVar(&o.logLane, "log-lane", scenarios.Configured, "write the lane of this `NAME` with --log")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
}

func (o *runOptions) run(cmd *cobra.Command, args []string) error {
	if o.log == "" && cmd.Flags().Changed("log-lane") {
		return errors.New("--log-lane says which lane --log writes; there is no --log")
	}
	tests, err := o.load(args)
	if err != nil {
		return err
	}
	var verdicts []*accept.Verdict
	good := true
	for _, s := range tests {
		var v *accept.Verdict
		v, err = o.one(cmd.Context(), s)
		if v != nil {
			verdicts = append(verdicts, v)
			good = good && v.Pass()
		}
		if err != nil || cmd.Context().Err() != nil {
			break
		}
	}
	if len(verdicts) == 0 {
		return err
	}
	if e := o.print(cmd.OutOrStdout(), verdicts, len(tests) > 1); e != nil {
		return &failure{e}
	}
	switch {
	case err != nil:
		return &failure{err}
	case !good || len(verdicts) < len(tests):
		return errVerdict
	}
	return nil
}

// load reads and builds all scenarios before any runs, so that bad input costs
// nothing and leaves nothing.
func (o *runOptions) load(args []string) ([]*scenarios.Scenario, error) {
	if o.log != "" && len(args) > 1 {
		return nil, errors.New("--log takes one scenario at a time")
	}
	changes, err := parseChanges(o.sets)
	if err != nil {
		return nil, err
	}
	var tests []*scenarios.Scenario
	for _, name := range args {
		s, err := scenarios.Load(name, changes...)
		if err != nil {
			return nil, err
		}
		if len(args) > 1 || o.log != "" { // a single run without a log is built when it runs
			if _, err := s.Build(); err != nil {
				return nil, err
			}
		}
		tests = append(tests, s)
	}
	return tests, nil
}

// parseChanges reads the values of --set.
func parseChanges(sets []string) ([]scenarios.Change, error) {
	var changes []scenarios.Change
	for _, text := range sets {
		c, err := scenarios.ParseChange(text)
		if err != nil {
			return nil, fmt.Errorf("--set: %w", err)
		}
		changes = append(changes, c)
	}
	return changes, nil
}

// one runs one scenario, with its log if asked for.
func (o *runOptions) one(ctx context.Context, s *scenarios.Scenario) (*accept.Verdict, error) {
	bar := newProgress(s.Name)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)() // the last figures may take a moment
	options := accept.Options{Progress: bar.report}
	if o.log == "" {
		return accept.Run(ctx, s, options)
	}
	log, err := o.create(s)
	if err != nil {
		return nil, err
	}
	options.Observe = func(lane string) func(*rtloop.Loop) error {
		if lane != o.logLane {
			return nil
		}
		return log.Row
	}
	v, err := accept.Run(ctx, s, options)
	if e := log.Close(); err == nil {
		err = e
	}
	return v, err
}

// create makes the log and its provenance. That they exist, or would replace
// the scenario itself, is for the user to put right; that they cannot be
// written is a failure.
func (o *runOptions) create(s *scenarios.Scenario) (*runlog.Writer, error) {
	if err := s.CheckLane(o.logLane); err != nil {
		return nil, fmt.Errorf("--log-lane: %w", err)
	}
	for _, path := range []string{o.log, o.log + ".toml"} {
		if sameFile(path, s.Name) {
			return nil, fmt.Errorf("--log %s: %s %s; choose another name", o.log, path, theScenario)
		}
	}
	log, err := runlog.Create(o.log, s.ChannelNames(), s.Excitation.Drives, s.Provenance(version(), o.logLane, time.Now()), o.force)
	switch {
	case errors.Is(err, fs.ErrExist):
		return nil, fmt.Errorf("--log: %w", err)
	case err != nil:
		return nil, &failure{fmt.Errorf("--log: %w", err)}
	}
	return log, nil
}

func (o *runOptions) print(out io.Writer, verdicts []*accept.Verdict, several bool) error {
	switch {
	case o.json && several:
		return writeJSON(out, map[string]any{"runs": verdicts})
	case o.json:
		return writeJSON(out, verdicts[0])
	}
	for i, v := range verdicts {
		if i > 0 {
			fmt.Fprintln(out)
		}
		if err := v.WriteText(out, inColour()); err != nil {
			return err
		}
	}
	return nil
}
