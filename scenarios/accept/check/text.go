package check

import (
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// Report is a whole check.
type Report struct {
	Results []Result
	LeftOut []string
	Gone    []string
}

// Pass reports whether every scenario was checked and passes.
func (p *Report) Pass() bool {
	for i := range p.Results {
		if !p.Results[i].Pass() {
			return false
		}
	}
	return true
}

// WriteText writes a line for every scenario, then the details of those that
// failed or changed, then the sum. It is the same for any number of workers.
func (p *Report) WriteText(w io.Writer, colour bool) error {
	var out strings.Builder
	rows := make([][]string, len(p.Results))
	marks := make([]string, len(p.Results))
	for i := range p.Results {
		r := &p.Results[i]
		marks[i] = pad(r.status(), colour)
		rows[i] = []string{accept.Printable(r.Name), r.accepted(), r.kept()}
		if r.Verdict == nil {
			rows[i] = []string{accept.Printable(r.Name), accept.Printable(r.Err.Error())}
		}
	}
	table(&out, "", marks, rows)
	for i := range p.Results {
		p.Results[i].details(&out, colour)
	}
	p.sum(&out)
	_, err := io.WriteString(w, out.String())
	return err
}

// pad gives a status the width of the widest.
func pad(status string, colour bool) string {
	return word(status, colour) + strings.Repeat(" ", len("ERROR  ")-len(status))
}

// table writes rows in columns behind marks, which may hold colour. The last
// cell of a row is as long as it likes.
func table(out *strings.Builder, indent string, marks []string, rows [][]string) {
	var widths []int
	for _, row := range rows {
		for i, cell := range row[:len(row)-1] {
			if i == len(widths) {
				widths = append(widths, 0)
			}
			widths[i] = max(widths[i], utf8.RuneCountInString(cell))
		}
	}
	for i, row := range rows {
		line := indent
		if i < len(marks) {
			line += marks[i]
		}
		for k, cell := range row {
			line += cell
			if k < len(row)-1 {
				line += strings.Repeat(" ", widths[k]-utf8.RuneCountInString(cell)+2)
			}
		}
		fmt.Fprintln(out, strings.TrimRight(line, " "))
	}
}

// details shows what failed, and what changed, of one scenario.
func (r *Result) details(out *strings.Builder, colour bool) {
	if r.Verdict == nil {
		return
	}
	failed := []Row{}
	for _, row := range r.limits() {
		if !row.Pass {
			failed = append(failed, row)
		}
	}
	failed = append(failed, r.moves()...)
	changed := r.Comparison != nil && (len(r.Comparison.Settings) > 0 || len(r.Comparison.Added) > 0)
	if r.Pass() && len(failed) == 0 && !changed {
		return
	}
	fmt.Fprintf(out, "\n%s: %s\n", accept.Printable(r.Name), accept.Printable(r.Scene.Title))
	lane := &r.Verdict.Lanes[0]
	if lane.Trip != nil {
		fmt.Fprintf(out, "  %s\n", accept.Printable(lane.Ending(r.Verdict.Time)))
	}
	if r.Err != nil {
		fmt.Fprintf(out, "  %s\n", accept.Printable(r.Err.Error()))
	}
	if r.Comparison != nil {
		r.changes(out)
	}
	r.failures(out, failed, colour)
}

// changes shows which settings are not those of the baseline.
func (r *Result) changes(out *strings.Builder) {
	c := r.Comparison
	if len(c.Settings) > 0 {
		fmt.Fprintf(out, "  settings that are not those of the baseline:\n")
		var rows [][]string
		for _, s := range c.Settings {
			rows = append(rows, []string{accept.Printable(s.Path), accept.Printable(orNone(s.Was)) + " → " + accept.Printable(orNone(s.Is))})
		}
		table(out, "    ", nil, rows)
		if c.Same() {
			fmt.Fprintf(out, "  no figure left its tolerance; the widest move is %s %% of one\n", quantity.Short(float64(int(100*c.Widest+0.5)), quantity.None))
		}
	}
	if n := len(c.Added); n > 0 {
		shown := c.Added[:min(n, 4)]
		text := strings.Join(shown, ", ")
		if n > len(shown) {
			text += ", …"
		}
		fmt.Fprintf(out, "  %s not in the baseline: %s\n", figures(n), accept.Printable(text))
	}
	if len(c.Moved) > 0 {
		fmt.Fprintf(out, "  the baseline is of version %s\n", accept.Printable(r.Baseline.Version))
	}
}

func orNone(s string) string {
	if s == "" {
		return "none"
	}
	return s
}

// failures shows was, is and allowed of all that failed. Limits stand first.
func (r *Result) failures(out *strings.Builder, failed []Row, colour bool) {
	if len(failed) == 0 {
		return
	}
	rows, marks := [][]string{{"", "was", "is", "allowed"}}, []string{strings.Repeat(" ", len("FAIL  "))}
	for _, f := range failed {
		mark, what := word("FAIL", colour)+"  ", "figure "+f.What
		if f.Limit {
			what = "limit " + f.What
		} else if r.State == Replaced {
			mark = "kept  "
		}
		rows = append(rows, []string{what, orDash(f.Was), f.Is, f.Allowed})
		marks = append(marks, mark)
	}
	table(out, "  ", marks, rows)
}

func orDash(s string) string {
	if s == "" {
		return "–"
	}
	return s
}

// sum counts, and says what is amiss beside the scenarios themselves.
func (p *Report) sum(out *strings.Builder) {
	n := map[string]int{}
	moved, bare := false, 0
	for i := range p.Results {
		r := &p.Results[i]
		n[r.status()]++
		moved = moved || r.State == Moved
		if r.State == Absent && r.Err == nil {
			bare++
		}
	}
	fmt.Fprintf(out, "\n%s:", count(len(p.Results), "scenario"))
	sep := " "
	for _, s := range []struct{ status, text string }{
		{"PASS", "%d passed"}, {"DONE", "%d ran without anything to judge it by"}, {"FAIL", "%d failed"}, {"ERROR", "%d not checked"},
	} {
		if n[s.status] > 0 {
			fmt.Fprintf(out, sep+s.text, n[s.status])
			sep = ", "
		}
	}
	fmt.Fprintln(out)
	if bare > 0 {
		fmt.Fprintf(out, "without a baseline: %d; --record keeps one\n", bare)
	}
	if moved {
		fmt.Fprintf(out, "where a change is meant, --record keeps the new figures\n")
	}
	for _, g := range p.Gone {
		fmt.Fprintf(out, "%s: the scenario of this baseline is gone\n", accept.Printable(g))
	}
	if len(p.LeftOut) > 0 {
		fmt.Fprintf(out, "left out, for they are no scenarios: %s\n", accept.Printable(strings.Join(p.LeftOut, ", ")))
	}
}
