// Package report gathers what a test engineer puts on file about a test into
// one page: the question and the verdict, the settings, the pictures, what was
// assumed, and where all of it comes from. The page stands alone: one HTML file
// without scripts that asks nothing of the network and prints on A4 or Letter.
//
// The same input comes to the same bytes. Nothing on the page depends on the
// clock or the machine.
package report

import (
	"context"
	"fmt"
	"html/template"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/report/figure"
	"antelag/scenarios/study/margin"
)

// Page is the whole report.
type Page struct {
	Version string // of the program
	Date    string // as it is to be printed; "" leaves it out
	Tests   []*Test
}

// Test is the report of one scenario, or of one record.
type Test struct {
	Name     string // the file, or the name of an embedded scenario
	Title    string
	Question string
	Word     string // PASS, FAIL or DONE; of a record RECORD
	Verdict  string // in one sentence
	Pass     bool
	Parts    []Part
	Verdicts *accept.Verdict // of a scenario, for JSON; nil of a record

	number   int // on the page, from 1
	overview []string
}

// Part is a part of a test's report under a heading.
type Part struct {
	Heading  string
	Text     []string // paragraphs
	List     []string
	Tables   []Table
	Pictures []Picture
	Listing  string // text as it stands in a file
}

// Table is a table. The first cell of a row is its heading.
type Table struct {
	Caption string
	Head    []string
	Rows    []Row
}

// Row is a row of a table. One that is judged says PASS or FAIL in its first
// cell.
type Row []string

// Picture is a figure under a name that can be part of a file name.
type Picture struct {
	Name    string
	Caption string
	Figure  figure.Figure

	svg template.HTML
}

// Options are what a report may be given beside the scenario.
type Options struct {
	Sets     []string // what the scenario was changed by, PATH=VALUE, to be said
	Sweep    string   // the table of a sweep of the scenario, a CSV file; "": none
	Map      string   // the two settings of the stability map, "X=a:b:n,Y=a:b:n"; "": chosen
	Progress func(done, of int64)
}

// Run runs a scenario and reports on its configured lane. When ctx ends first
// the report is of what ran.
func Run(ctx context.Context, s *scenarios.Scenario, o Options) (*Test, error) {
	spread, err := readSpread(o.Sweep, s)
	if err != nil {
		return nil, fmt.Errorf("sweep: %w", err)
	}
	if o.Map != "" {
		if _, _, err := margin.ParseMap(s, o.Map); err != nil {
			return nil, fmt.Errorf("map: %w", err)
		}
	}
	rec := newRecorder(s)
	v, err := accept.Run(ctx, s, accept.Options{Progress: o.Progress, Observe: rec.observe})
	if err != nil {
		return nil, err
	}
	rec.finish()
	r := &run{s: s, v: v, lane: &v.Lanes[0], rec: rec, spread: spread, options: o}
	return r.report(ctx)
}

// run is a scenario that has run, about to be reported.
type run struct {
	s       *scenarios.Scenario
	v       *accept.Verdict
	lane    *accept.Lane // the configured one
	rec     *recorder
	spread  *spreadTable // nil without a sweep
	options Options
}

func (r *run) report(ctx context.Context) (*Test, error) {
	t := &Test{
		Name: r.s.Name, Title: r.s.Title, Question: r.question(), Word: r.lane.Word(), Pass: r.v.Pass(),
		Verdict: r.verdict(), Verdicts: r.v, overview: r.overview(),
	}
	provenance, err := r.provenance()
	if err != nil {
		return nil, err
	}
	parts := []Part{r.acceptance(), r.compared(), r.motions(), r.energyPart()}
	// The parts that have run are taken to the bench: nothing after this may ask
	// the loop for what it did, but for its coefficients.
	parts = append(parts, r.response(ctx))
	stability, err := r.stability(ctx)
	if err != nil {
		return nil, err
	}
	parts = append(parts, stability, r.spreadPart(), r.reached(), r.structure())
	parts = append(parts, r.channels()...)
	parts = append(parts, r.assumptions(), provenance)
	for _, p := range parts {
		if !p.empty() {
			t.Parts = append(t.Parts, p)
		}
	}
	return t, nil
}

func (p *Part) empty() bool {
	return len(p.Text) == 0 && len(p.List) == 0 && len(p.Tables) == 0 && len(p.Pictures) == 0 && p.Listing == ""
}

// Pictures lists all pictures of a test.
func (t *Test) Pictures() []Picture {
	var out []Picture
	for _, p := range t.Parts {
		out = append(out, p.Pictures...)
	}
	return out
}
