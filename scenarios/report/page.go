package report

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"strings"
)

//go:embed page.html
var pageText string

//go:embed page.css
var pageStyle string

var pageTemplate = template.Must(template.New("page").Funcs(template.FuncMap{
	"verdict": isVerdict,
	"class":   class,
}).Parse(pageText))

// recordWord stands where a test has its verdict.
const recordWord = "RECORD"

// view is what the template sees.
type view struct {
	*Page
	Title    string
	Style    template.CSS
	Cautions []string
	Overview *Table // nil of one test alone
}

// Write writes the page.
func (p *Page) Write(w io.Writer) error {
	v := view{Page: p, Style: template.CSS(pageStyle), Cautions: Cautions, Title: fmt.Sprintf("%d tests", len(p.Tests))}
	if len(p.Tests) == 1 {
		v.Title = p.Tests[0].Title
	} else {
		v.Overview = &Table{Caption: "All tests on this page", Head: overviewHead}
	}
	for i, t := range p.Tests {
		t.number = i + 1
		if err := t.draw(); err != nil {
			return err
		}
	}
	var out bytes.Buffer
	if err := pageTemplate.Execute(&out, v); err != nil {
		return err
	}
	_, err := w.Write(out.Bytes())
	return err
}

// draw makes the pictures.
func (t *Test) draw() error {
	for i := range t.Parts {
		for k := range t.Parts[i].Pictures {
			p := &t.Parts[i].Pictures[k]
			svg, err := p.Figure.SVG()
			if err != nil {
				return fmt.Errorf("%s: picture %s: %w", t.Name, p.Name, err)
			}
			p.svg = template.HTML(svg) // escaped where it was drawn
		}
	}
	return nil
}

// ID names the test on the page.
func (t *Test) ID() string { return fmt.Sprintf("test%d", t.number) }

// PartID names a part of the test on the page.
func (t *Test) PartID(i int) string { return fmt.Sprintf("test%d-%d", t.number, i+1) }

// OverviewCells are the test's cells in the overview, the title not among them.
func (t *Test) OverviewCells() []string { return t.overview }

// Summary says how many tests there are and how many passed.
func (v view) Summary() string {
	count := map[string]int{}
	for _, t := range v.Tests {
		count[t.Word]++
	}
	var parts []string
	for _, word := range []string{"PASS", "FAIL", "DONE", recordWord} {
		if n := count[word]; n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n, summed[word]))
		}
	}
	return fmt.Sprintf("Of %d tests: %s.", len(v.Tests), listed(parts))
}

var summed = map[string]string{"PASS": "passed", "FAIL": "failed", "DONE": "ran without limits to be judged by", recordWord: "of records, which are not judged"}

// Kind says what the page is of.
func (v view) Kind() string {
	records := 0
	for _, t := range v.Tests {
		if t.Word == recordWord {
			records++
		}
	}
	switch records {
	case 0:
		return "Report on a real-time hybrid test, simulated"
	case len(v.Tests):
		return "Report on the record of a real-time hybrid test"
	}
	return "Report on real-time hybrid tests, simulated and recorded"
}

// Worst is the verdict on all tests together.
func (v view) Worst() string {
	worst := "PASS"
	for _, t := range v.Tests {
		switch {
		case t.Word == "FAIL":
			return "FAIL"
		case t.Word != "PASS":
			worst = "DONE"
		}
	}
	return worst
}

// Several reports whether the page has more than one test.
func (v view) Several() bool { return len(v.Tests) != 1 }

// SVG is the drawn picture.
func (p Picture) SVG() template.HTML { return p.svg }

// isVerdict reports whether a cell is a verdict.
func isVerdict(cell string) bool {
	return cell == "PASS" || cell == "FAIL" || cell == "DONE" || cell == recordWord
}

// class is how a verdict is dressed.
func class(word string) string { return strings.ToLower(word) }
