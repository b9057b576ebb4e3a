package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"antelag/rtloop"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

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
		Args:              cobra.MinimumNArgs(1),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.sets, "set", nil, "change a setting, `PATH=VALUE`, like damper.compensator.delay=\"12 ms\"; may be repeated")
	f.StringVar(&o.log, "log", "", "write every tick to this CSV `file`, with its provenance beside it")
	f.StringVar(&o.logLane, "log-lane", scenarios.Configured, "the lane that --log writes")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *runOptions) run(cmd *cobra.Command, args []string) error {
	tests, err := o.load(args)
	if err != nil {
		return err
	}
	var verdicts []*accept.Verdict
	var failed error
	for _, s := range tests {
		v, err := o.one(cmd, s)
		if v != nil {
			verdicts = append(verdicts, v)
		}
		if err != nil {
			failed = err
			break
		}
		if cmd.Context().Err() != nil {
			break
		}
	}
	if failed != nil && len(verdicts) == 0 {
		return failed
	}
	if err := o.print(cmd, verdicts); err != nil {
		return &failure{err}
	}
	if failed != nil {
		return &failure{failed}
	}
	for _, v := range verdicts {
		if !v.Pass() {
			return errVerdict
		}
	}
	return nil
}

// load reads all scenarios before any runs, so that bad input costs nothing.
func (o *runOptions) load(args []string) ([]*scenarios.Scenario, error) {
	if o.log != "" && len(args) > 1 {
		return nil, errors.New("--log takes one scenario at a time")
	}
	var changes []scenarios.Change
	for _, text := range o.sets {
		c, err := scenarios.ParseChange(text)
		if err != nil {
			return nil, fmt.Errorf("--set: %w", err)
		}
		changes = append(changes, c)
	}
	var tests []*scenarios.Scenario
	for _, name := range args {
		s, err := scenarios.Load(name, changes...)
		if err != nil {
			return nil, err
		}
		tests = append(tests, s)
	}
	return tests, nil
}

// one runs one scenario, with its log if asked for.
func (o *runOptions) one(cmd *cobra.Command, s *scenarios.Scenario) (*accept.Verdict, error) {
	options := accept.Options{Progress: progress(s.Name)}
	var log *runlog.Writer
	if o.log != "" {
		if err := s.CheckLane(o.logLane); err != nil {
			return nil, fmt.Errorf("--log-lane: %w", err)
		}
		if _, err := s.Build(); err != nil { // nothing is written for what cannot run
			return nil, err
		}
		var err error
		log, err = runlog.Create(o.log, s.ChannelNames(), s.Excitation.Drives, s.Provenance(version(), o.logLane, time.Now()), o.force)
		if err != nil {
			return nil, err
		}
		options.Observe = func(lane string) func(*rtloop.Loop) error {
			if lane != o.logLane {
				return nil
			}
			return log.Row
		}
	}
	v, err := accept.Run(cmd.Context(), s, options)
	if log != nil {
		if e := log.Close(); err == nil {
			err = e
		}
	}
	return v, err
}

func (o *runOptions) print(cmd *cobra.Command, verdicts []*accept.Verdict) error {
	out := cmd.OutOrStdout()
	if o.json {
		e := json.NewEncoder(out)
		e.SetIndent("", " ")
		if len(verdicts) == 1 {
			return e.Encode(verdicts[0])
		}
		return e.Encode(map[string]any{"runs": verdicts})
	}
	colour := term.IsTerminal(int(os.Stdout.Fd())) && os.Getenv("NO_COLOR") == ""
	for i, v := range verdicts {
		if i > 0 {
			fmt.Fprintln(out)
		}
		if err := v.WriteText(out, colour); err != nil {
			return err
		}
	}
	return nil
}
