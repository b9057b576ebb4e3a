package main

import (
	"bytes"
	"context"
	"errors"
	"time"

	"github.com/spf13/cobra"

	"antelag/scenarios/accept/check"
)

// checkOptions are the flags of check.
type checkOptions struct {
	sets   []string
	only   string
	junit  string
	record bool
	force  bool
	json   bool
}

func newCheck() *cobra.Command {
	o := &checkOptions{}
	cmd := &cobra.Command{
		Use:   "check PATH…",
		Short: "hold every scenario under some paths against its limits and its baseline",
		Long: `Run every scenario found under the paths, several at a time, and hold each
against its acceptance limits and, where there is one, its baseline: the figures
that --record kept beside it in NAME.baseline.toml, each with its tolerance. PATH
is a directory, a file or the name of an embedded scenario, whose baseline is kept
in the working directory.

Exit code: 0 all good; 1 a limit failed, a figure left its tolerance, or something
could not be written; 2 bad input. Of scenarios in a directory those that do not
read are reported with the others, and nothing is recorded.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return errors.New("check takes PATH…: directories, scenario files, or names of embedded scenarios")
			}
			return nil
		},
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.only, "only", "", "check only scenarios whose name matches this `PATTERN` (* ? [ab]), or has it as a part")
	f.BoolVar(&o.record, "record", false, "keep the figures as the baseline; of an existing one, say what changes")
	f.StringVar(&o.junit, "junit", "", "write the results as XML for build servers to this `FILE`")
	f.BoolVar(&o.force, "force", false, "overwrite existing files, by --junit")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *checkOptions) run(cmd *cobra.Command, args []string) error {
	began := time.Now()
	found, err := o.find(args)
	if err != nil {
		return err
	}
	bar := newProgress("check")
	defer bar.clear()
	defer context.AfterFunc(cmd.Context(), bar.clear)()
	results := check.Run(cmd.Context(), found.Tests, check.Work{Version: version(), Record: o.record, Progress: bar.report})
	bar.clear()
	report := &check.Report{Results: results, LeftOut: found.LeftOut, Gone: found.Gone}
	if o.json {
		err = writeJSON(cmd.OutOrStdout(), report)
	} else {
		err = report.WriteText(cmd.OutOrStdout(), inColour())
	}
	if e := o.writeJUnit(report, began); err == nil {
		err = e
	}
	if err != nil {
		return &failure{err}
	}
	return ending(report)
}

// find loads everything before anything runs.
func (o *checkOptions) find(args []string) (*check.Found, error) {
	if o.record && len(o.sets) > 0 {
		return nil, errors.New("--record keeps the figures of the scenarios as they are; it takes no --set")
	}
	changes, err := parseChanges(o.sets)
	if err != nil {
		return nil, err
	}
	if err := refuse([]output{{flag: "--junit", path: o.junit}}, o.force, theScenario); err != nil {
		return nil, err
	}
	found, err := check.Find(args, check.Options{Only: o.only, Changes: changes, Strict: o.record})
	if err != nil {
		return nil, err
	}
	for _, t := range found.Tests {
		if err := refuse([]output{{flag: "--junit", path: o.junit}}, o.force, "belongs to what is checked", t.Name, t.Path); err != nil {
			return nil, err
		}
	}
	return found, nil
}

func (o *checkOptions) writeJUnit(report *check.Report, began time.Time) error {
	if o.junit == "" {
		return nil
	}
	var text bytes.Buffer
	if err := report.WriteJUnit(&text, version(), began); err != nil {
		return err
	}
	return saveFile("--junit", o.junit, o.force, text.Bytes)
}

// ending turns a report into the exit code, which says the worst: what did not
// read, what could not be written, what failed.
func ending(report *check.Report) error {
	for i := range report.Results {
		if r := &report.Results[i]; r.Test.Err != nil {
			return r.Test.Err
		}
	}
	for i := range report.Results {
		if r := &report.Results[i]; r.Err != nil && !r.Interrupted() {
			return &failure{r.Err}
		}
	}
	if !report.Pass() {
		return errVerdict
	}
	return nil
}
