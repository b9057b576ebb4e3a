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
	force bool
	json  bool
}

func newReport() *cobra.Command {
	o := &reportOptions{}
	cmd := &cobra.Command{
		Use:   "report SCENARIO… -o FILE.html",
		Short: "put a test on file: one page with verdict, settings, pictures and provenance",
		Long: `Run scenarios and write one self-contained HTML page about them: the question
and the verdict first, then pictures, settings with their units, what was assumed,
and where it all comes from. The page asks nothing of the network and prints on
A4 or Letter. The same input comes to the same bytes.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return fmt.Errorf("report takes a SCENARIO: a file, or one of %s", strings.Join(scenarios.Names(), ", "))
			}
			return nil
		},
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringVarP(&o.out, "output", "o", "", "the page to write, a `FILE.html`")
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.StringVar(&o.plots, "plots", "", "write every picture into this `directory` too, as PNG and as SVG")
	f.StringVar(&o.date, "date", "", "the `date` to print, as it is given; without it there is none and the same input makes the same page")
	f.StringVar(&o.sweep, "sweep", "", "show the spread of this `table`, a CSV file that sweep wrote of the scenario")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object about what was written")
	return cmd
}

func (o *reportOptions) run(cmd *cobra.Command, args []string) error {
	if err := o.check(args); err != nil {
		return err
	}
	tests, err := (&runOptions{sets: o.sets, log: ""}).load(args)
	if err != nil {
		return err
	}
	page := &report.Page{Version: version(), Date: o.date}
	good := true
	for _, s := range tests {
		t, err := o.one(cmd.Context(), s)
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
	if !good || len(page.Tests) < len(tests) {
		return errVerdict
	}
	return nil
}

// check refuses what could not be written at the end, before anything runs.
func (o *reportOptions) check(args []string) error {
	if o.out == "" {
		return errors.New("report needs -o FILE.html, the page to write")
	}
	if o.sweep != "" && len(args) > 1 {
		return errors.New("--sweep takes one scenario at a time")
	}
	for _, name := range args {
		if sameFile(o.out, name) {
			return fmt.Errorf("-o %s: is the scenario itself; choose another name", o.out)
		}
	}
	if err := free(o.out, o.force); err != nil {
		return fmt.Errorf("-o: %w", err)
	}
	if info, err := os.Stat(o.plots); o.plots != "" && err == nil && !info.IsDir() {
		return fmt.Errorf("--plots: %s: %w and is no directory", o.plots, fs.ErrExist)
	}
	return nil
}

// free reports what stands in the way of writing a file.
func free(path string, force bool) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if dir, err := os.Stat(filepath.Dir(path)); err != nil || !dir.IsDir() {
			return fmt.Errorf("%s: there is no directory %s", path, filepath.Dir(path))
		}
		return nil
	case err != nil:
		return err
	case info.IsDir():
		return fmt.Errorf("%s: %w and is a directory; a file name is needed", path, fs.ErrExist)
	case !force:
		return fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
	}
	return nil
}

func (o *reportOptions) one(ctx context.Context, s *scenarios.Scenario) (*report.Test, error) {
	bar := newProgress(s.Name)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	return report.Run(ctx, s, report.Options{Sets: o.sets, Sweep: o.sweep, Progress: bar.report})
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
	if err := figure.WriteFile(o.out, html.Bytes(), o.force); err != nil {
		return nil, &failure{fmt.Errorf("-o: %w", err)}
	}
	return paths, nil
}

func (o *reportOptions) print(cmd *cobra.Command, page *report.Page, pictures []string) error {
	out := cmd.OutOrStdout()
	if o.json {
		type entry struct {
			Scenario string          `json:"scenario"`
			Verdict  string          `json:"verdict"`
			Pass     bool            `json:"pass"`
			Run      *accept.Verdict `json:"run"`
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
