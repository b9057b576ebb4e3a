package study

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// Compute says what a study cost.
type Compute struct {
	Wall    float64 `json:"wall_s"`
	Runs    int64   `json:"runs"` // made now; others were there
	Workers int     `json:"workers"`
}

// WriteText writes the summary for people.
func (s *Summary) WriteText(w io.Writer, colour bool) error {
	var b strings.Builder
	st := s.Study
	fmt.Fprintf(&b, "%s: %s\n%s\n%s\n", accept.Printable(st.Scenario.Name), accept.Printable(st.Scenario.Title), st.Describe(), s.cost())
	s.verdict(&b, colour)
	s.figures(&b, colour)
	s.varied(&b)
	s.points(&b)
	s.worst(&b)
	_, err := io.WriteString(w, b.String())
	return err
}

// Describe says in a line what the study varies.
func (st *Study) Describe() string {
	var parts []string
	if len(st.Grid) > 0 {
		sizes := make([]string, len(st.Grid))
		for i := range st.Grid {
			sizes[i] = fmt.Sprint(st.Grid[i].N)
		}
		parts = append(parts, "a grid of "+strings.Join(sizes, " × "))
	}
	if st.Draws > 0 {
		how := map[Sampling]string{Latin: "Latin hypercube", Independent: "independent"}[st.Sampling]
		parts = append(parts, fmt.Sprintf("%d draws from [spread], %s, %s, seed %d", st.Draws, st.Law, how, st.Seed))
	}
	text := strings.Join(parts, ", at each point ")
	if st.Lane != "configured" {
		text += "; lane " + st.Lane
	}
	return text
}

func (s *Summary) cost() string {
	c := s.Compute
	duration := quantity.Short(s.Study.Scenario.Loop.Num("duration"), quantity.Time)
	text := fmt.Sprintf("%s of %s of test each", count(s.Runs, "run"), duration)
	if s.Runs < s.Study.Runs() {
		text = fmt.Sprintf("%d of %s of %s of test each", s.Runs, count(s.Study.Runs(), "run"), duration)
	}
	if c.Runs == 0 {
		return text
	}
	if c.Runs < s.Runs {
		text += fmt.Sprintf(", %d of them now", c.Runs)
	}
	return text + fmt.Sprintf(", computed in %s, %s runs a second with %s", quantity.Format(c.Wall, quantity.Time),
		quantity.Format(float64(c.Runs)/c.Wall, quantity.None), count(int64(c.Workers), "worker"))
}

func count(n int64, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

func (s *Summary) verdict(b *strings.Builder, colour bool) {
	fmt.Fprintf(b, "\n%s  %d of %s", accept.Word(s.Pass(), colour), s.Passed, count(s.Runs, "run"))
	if s.Passed == 1 {
		b.WriteString(" passes")
	} else {
		b.WriteString(" pass")
	}
	switch {
	case s.Study.Draws > 0 && len(s.Study.Grid) == 0:
		fmt.Fprintf(b, "; at least %s of all draws do, with 95 %% confidence", percentDown(s.AtLeast()))
	case len(s.Study.Grid) == 1 && s.Runs == s.Study.Runs() && len(s.Points) > 0:
		fmt.Fprintf(b, "; %s", s.spans())
	}
	b.WriteString("\n")
	var other []string
	for _, o := range []string{rtloop.Tripped.String(), rtloop.Diverged.String(), Refused} {
		if n := s.Outcomes[o]; n > 0 {
			other = append(other, fmt.Sprintf("%d %s", n, o))
		}
	}
	if len(other) > 0 {
		fmt.Fprintf(b, "      %s\n", strings.Join(other, ", "))
	}
	for _, limit := range sorted(s.Limits) {
		fmt.Fprintf(b, "      %d ended by %s\n", s.Limits[limit], limit)
	}
	if s.Why != nil {
		fmt.Fprintf(b, "      first refused: %v\n", s.Why)
	}
}

func sorted(m map[string]int64) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// percentDown writes a share so that it is never more than it is.
func percentDown(v float64) string {
	return fmt.Sprintf("%.2f %%", math.Floor(1e4*v)/100)
}

// spans says at which values of the grid all runs pass.
func (s *Summary) spans() string {
	if len(s.Spans) == 0 {
		return "at no value do all pass"
	}
	setting := &s.Study.Grid[0].Setting
	var parts []string
	for _, sp := range s.Spans {
		text := setting.Format(sp.Low)
		if sp.High > sp.Low {
			text += " to " + setting.Format(sp.High)
		}
		parts = append(parts, text)
	}
	return "all pass at " + strings.Join(parts, ", ")
}

func (s *Summary) figures(b *strings.Builder, colour bool) {
	rows := [][]string{{"figure", "worst", "95 %", "median", "best", "allowed", "failed"}}
	var marks []string
	for i := range s.Figures {
		t := &s.Figures[i]
		row := []string{t.Column.Label, t.Column.extreme(&t.Worst), t.Column.Size(t.Quantile(0.95)), t.Column.Size(t.Quantile(0.5)), t.Column.extreme(&t.Best)}
		mark := "    "
		if !math.IsNaN(t.Limit) {
			j := accept.Judgement{Limit: t.Column.Figure, Want: t.Limit, Dim: t.Column.Dim}
			row = append(row, j.Allowed(), fmt.Sprint(t.Failed))
			mark = accept.Word(t.Failed == 0, colour)
		}
		rows, marks = append(rows, row), append(marks, mark)
	}
	accept.WriteTable(b, rows, marks)
}

// extreme writes the figure of one run, or why it has none.
func (c *Column) extreme(e *Extreme) string {
	if math.IsNaN(e.Value) && e.Outcome != completed && e.Outcome != "" {
		return e.Outcome
	}
	return c.Format(e.Value)
}

// Size writes a value whose sign is not known, as of a quantile.
func (c *Column) Size(v float64) string {
	if c.Figure == "delay" {
		return quantity.Format(v, c.Dim)
	}
	return c.Format(v)
}

func (s *Summary) varied(b *strings.Builder) {
	st := s.Study
	rows := [][]string{{"varied", "from", "to", "how"}}
	for i := range st.Grid {
		a := &st.Grid[i]
		how := count(int64(a.N), "value")
		if a.Log {
			how += ", logarithmic"
		}
		rows = append(rows, []string{a.Path, a.Setting.Format(a.Low), a.Setting.Format(a.High), how})
	}
	for i := range st.Spread {
		sp := &st.Spread[i]
		rows = append(rows, []string{sp.Path, sp.Setting.Format(sp.Low), sp.Setting.Format(sp.High), "drawn"})
	}
	accept.WriteTable(b, rows, nil)
}

// tellPoints is how many points of a grid are told on a screen.
const tellPoints = 24

func (s *Summary) points(b *strings.Builder) {
	st, main := s.Study, s.Main()
	if len(s.Points) == 0 || len(s.Points) > tellPoints {
		return
	}
	var head []string
	for i := range st.Grid {
		head = append(head, st.Grid[i].Path)
	}
	head = append(head, "pass", "worst "+main.Column.Label)
	if st.Draws > 0 {
		head = append(head, "95 %")
	}
	rows := [][]string{head}
	for _, p := range s.Points {
		if p.Worst == nil {
			break // not all its draws are there
		}
		var row []string
		for i, v := range p.Values {
			row = append(row, st.Grid[i].Setting.Format(v))
		}
		row = append(row, fmt.Sprintf("%d of %d", p.Passed, p.Runs), main.Column.Format(p.Worst[s.main()]))
		if st.Draws > 0 {
			row = append(row, main.Column.Size(p.Most[s.main()]))
		}
		rows = append(rows, row)
	}
	accept.WriteTable(b, rows, nil)
}

// worst names the runs in which the figures that count were worst, and how to
// make them again.
func (s *Summary) worst(b *strings.Builder) {
	if s.Runs == 0 {
		return
	}
	var runs []int64
	labels := map[int64][]string{}
	for i := range s.Figures {
		t := &s.Figures[i]
		if !t.Column.judged {
			continue
		}
		run := t.Worst.Run
		if _, seen := labels[run]; !seen {
			runs = append(runs, run)
		}
		labels[run] = append(labels[run], t.Column.Label)
	}
	b.WriteString("\n  worst, to be run again by\n")
	for _, run := range runs {
		fmt.Fprintf(b, "    %s (run %d):\n      %s\n", strings.Join(labels[run], "; "), run, s.Study.Command(run))
	}
	if main := s.Main(); len(s.Study.Grid) > 0 && s.Study.Draws == 0 && !math.IsNaN(main.Best.Value) {
		fmt.Fprintf(b, "  best %s (run %d):\n      %s\n", main.Column.Label, main.Best.Run, s.Study.Command(main.Best.Run))
	}
}
