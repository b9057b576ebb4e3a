package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/outfile"
	"antelag/scenarios/report"
	"antelag/scenarios/report/figure"
)

// reportOptions are the flags of report.
type reportOptions struct {
	sets  []string
	out   string
	plots string
	date  string
	sweep string
	grid  string
	log   logFlags
	force bool
	json  bool
}

func newReport() *cobra.Command {
	o := &reportOptions{}
	cmd := &cobra.Command{
		Use:   "report SCENARIO|LOG… -o FILE.html",
		Short: "put a test on file: one page with verdict, settings, pictures and provenance",
		Long: `Run scenarios and write one self-contained HTML page about them: the question
and the verdict first, then pictures, settings with their units, what was assumed,
and where it all comes from. The page asks nothing of the network and prints on
A4 or Letter. The same input comes to the same bytes.

Exit code: 0 good; 1 a limit failed, a trip or divergence, or it could not write; 2 bad
input.

A name that ends in .csv, .tsv, .txt, .dat or .asc, also with .gz, is the LOG of a
test that has been: then the page is of its gauges.

` + aboutLogs + `

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return fmt.Errorf("report takes a SCENARIO: a file, or one of %s; or a LOG", strings.Join(scenarios.Names(), ", "))
			}
			return nil
		},
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	o.log.flags(cmd)
	f := cmd.Flags()
	f.StringVarP(&o.out, "output", "o", "", "the page to write, a `FILE.html`")
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.plots, "plots", "", "write every picture into this `DIR` too, as PNG and as SVG")
	f.StringVar(&o.date, "date", "", "the `DATE` to print, as it is given; without it there is none and the same input makes the same page")
	f.StringVar(&o.sweep, "sweep", "", "show the spread of this `TABLE`, a CSV file that sweep wrote of the scenario")
	f.StringVar(&o.grid, "stability-map", "", "the two settings of the stability map, `X=a:b:n,Y=a:b:n` (default: the delay of the actuator and the one that the compensator assumes)")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object about what was written")
	return cmd
}

func (o *reportOptions) run(cmd *cobra.Command, args []string) error {
	if err := o.check(cmd, args); err != nil {
		return err
	}
	subjects, err := o.subjects(args)
	if err != nil {
		return err
	}
	page := &report.Page{Version: version(), Date: o.date}
	good := true
	for _, make := range subjects {
		t, err := make(cmd.Context())
		if err != nil {
			return err
		}
		page.Tests = append(page.Tests, t)
		good = good && t.Pass
		if cmd.Context().Err() != nil {
			break
		}
	}
	pictures, err := o.write(page)
	if err != nil {
		return err
	}
	if err := o.print(cmd, page, pictures); err != nil {
		return &failure{err}
	}
	if !good || len(page.Tests) < len(subjects) {
		return errVerdict
	}
	return nil
}

// subjects are what the page is to be about, in the order given. All scenarios
// are read before any runs.
func (o *reportOptions) subjects(args []string) ([]func(context.Context) (*report.Test, error), error) {
	var names []string
	for _, name := range args {
		if !report.IsLog(name) {
			names = append(names, name)
		}
	}
	tests, err := (&runOptions{sets: o.sets}).load(names)
	if err != nil {
		return nil, err
	}
	columns, err := o.log.options()
	if err != nil {
		return nil, err
	}
	var out []func(context.Context) (*report.Test, error)
	for _, name := range args {
		if report.IsLog(name) {
			out = append(out, func(ctx context.Context) (*report.Test, error) {
				bar := newProgress(name)
				defer bar.clear()
				defer context.AfterFunc(ctx, bar.clear)()
				return report.Record(ctx, name, columns, bar.report)
			})
			continue
		}
		s := tests[0]
		tests = tests[1:]
		out = append(out, func(ctx context.Context) (*report.Test, error) { return o.one(ctx, s) })
	}
	return out, nil
}

// check refuses what could not be written at the end, before anything runs.
func (o *reportOptions) check(cmd *cobra.Command, args []string) error {
	if o.out == "" {
		return errors.New("report needs -o FILE.html, the page to write")
	}
	logs := 0
	for _, name := range args {
		if report.IsLog(name) {
			logs++
		}
	}
	for _, f := range []struct {
		names []string
		of    string
		there bool
	}{
		{[]string{"set", "stability-map", "sweep"}, "scenarios, and only logs are", logs < len(args)},
		{[]string{"map", "units", "rate", "channel"}, "logs, and only scenarios are", logs > 0},
	} {
		for _, name := range f.names {
			if cmd.Flags().Changed(name) && !f.there {
				return fmt.Errorf("--%s is for %s given", name, f.of)
			}
		}
	}
	if o.sweep != "" && len(args) > 1 {
		return errors.New("--sweep takes one scenario at a time")
	}
	if err := refuse([]output{{flag: "-o", path: o.out}}, o.force, "is what the report is about", args...); err != nil {
		return err
	}
	if info, err := os.Stat(o.plots); o.plots != "" && err == nil && !info.IsDir() {
		return fmt.Errorf("--plots: %s: %w and is no directory", o.plots, fs.ErrExist)
	}
	return nil
}

func (o *reportOptions) one(ctx context.Context, s *scenarios.Scenario) (*report.Test, error) {
	bar := newProgress(s.Name)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	return report.Run(ctx, s, report.Options{Sets: o.sets, Sweep: o.sweep, Map: o.grid, Progress: bar.report})
}

// write writes the page and, where they are wanted, the pictures.
func (o *reportOptions) write(page *report.Page) ([]string, error) {
	var html bytes.Buffer
	if err := page.Write(&html); err != nil {
		return nil, err
	}
	files := page.Files()
	var paths []string
	if o.plots != "" {
		for _, f := range files {
			path := filepath.Join(o.plots, f.Name)
			if err := free(path, o.force); err != nil && !errors.Is(err, fs.ErrNotExist) && errors.Is(err, fs.ErrExist) {
				return nil, fmt.Errorf("--plots: %w", err)
			}
			paths = append(paths, path)
		}
		if err := os.MkdirAll(o.plots, 0o755); err != nil {
			return nil, &failure{fmt.Errorf("--plots: %w", err)}
		}
		for i, f := range files {
			if err := figure.Save(paths[i], f.Figure, o.force); err != nil {
				return nil, &failure{fmt.Errorf("--plots: %w", err)}
			}
		}
	}
	if err := outfile.Write(o.out, html.Bytes(), o.force); err != nil {
		return nil, &failure{fmt.Errorf("-o: %w", err)}
	}
	return paths, nil
}

func (o *reportOptions) print(cmd *cobra.Command, page *report.Page, pictures []string) error {
	out := cmd.OutOrStdout()
	if o.json {
		type entry struct {
			Name    string          `json:"name"`
			Verdict string          `json:"verdict"`
			Pass    bool            `json:"pass"`
			Run     *accept.Verdict `json:"run"`
		}
		var tests []entry
		for _, t := range page.Tests {
			tests = append(tests, entry{t.Name, t.Word, t.Pass, t.Verdicts})
		}
		return writeJSON(out, map[string]any{"report": o.out, "pictures": append([]string{}, pictures...), "tests": tests})
	}
	for _, t := range page.Tests {
		fmt.Fprintf(out, "%s  %s: %s\n", t.Word, t.Name, t.Verdict)
	}
	_, err := fmt.Fprintf(out, "written to %s\n", o.out)
	return err
}
