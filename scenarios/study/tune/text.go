package tune

import (
	"fmt"
	"io"
	"math"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study"
)

// WriteText writes the result for people.
func (r *Result) WriteText(w io.Writer, colour bool) error {
	var b strings.Builder
	s := r.Problem.Scenario
	fmt.Fprintf(&b, "%s: %s\n%s\n%s\n", accept.Printable(s.Name), accept.Printable(s.Title), r.Problem.Describe(), r.cost())
	r.verdict(&b, colour)
	r.settings(&b)
	r.measures(&b, colour)
	r.front(&b)
	r.check(&b)
	_, err := io.WriteString(w, b.String())
	return err
}

// Describe says in a line what is looked for.
func (p *Problem) Describe() string {
	text := "tuned for " + p.figureLabel() + " over "
	if p.Draws == 0 {
		text = "tuned for " + p.Column.Label + ", the scenario as it is (it has no [spread])"
		if len(p.Scenario.Spread) > 0 {
			text = "tuned for " + p.Column.Label + ", the scenario as it is"
		}
	} else {
		text += fmt.Sprintf("%d draws from [spread], %s, seed %d, ", p.Draws, p.Law, p.Seed)
		if p.Corners != nil {
			text += fmt.Sprintf("its %d corners, ", p.Corners.Runs())
		}
		text += "and the scenario as it is"
	}
	if p.Lane != scenarios.Configured {
		text += "; lane " + p.Lane
	}
	return text
}

// figureLabel is the figure with what is made of it: "worst response error, rms".
func (p *Problem) figureLabel() string {
	switch {
	case p.Draws == 0:
		return p.Column.Label
	case p.Quantile == 1:
		return "worst " + p.Column.Label
	}
	return fmt.Sprintf("%s of %g %% of the runs", p.Column.Label, 100*p.Quantile)
}

func (r *Result) cost() string {
	text := fmt.Sprintf("%d settings tried", r.Tried)
	if r.Runs > 0 && r.Wall > 0 {
		text += fmt.Sprintf(", %d runs, computed in %s, %s runs a second with %d workers", r.Runs, quantity.Format(r.Wall, quantity.Time),
			quantity.Format(float64(r.Runs)/r.Wall, quantity.None), r.Workers)
	}
	return text
}

func (r *Result) verdict(b *strings.Builder, colour bool) {
	p := r.Problem
	fmt.Fprintf(b, "\n%s  ", accept.Word(r.Pass(), colour))
	switch {
	case r.Pass():
		b.WriteString("the best setting found keeps all limits\n")
	case r.Best.Refused != "":
		fmt.Fprintf(b, "no setting passes: %s\n", accept.Printable(r.Best.Refused))
	default:
		b.WriteString("no setting passes; the nearest is shown. In the way stands\n")
		ever := 0
		for _, o := range r.Stands {
			m := &p.Measures[o.Measure]
			fmt.Fprintf(b, "        %s: %s, allowed %s; ", m.title(p), m.Say(o.Got), m.Allowed())
			if o.Ever {
				ever++
				fmt.Fprintf(b, "met by other settings, at best %s\n", m.Say(o.Nearest))
			} else {
				fmt.Fprintf(b, "no setting tried does better than %s\n", m.Say(o.Nearest))
			}
		}
		if ever == len(r.Stands) && ever > 0 {
			b.WriteString("      each limit can be met, but not all of them together\n")
		}
	}
	if r.Cut {
		b.WriteString("      the search was cut short; more time may find better\n")
	}
}

// title is a measure with what it is of.
func (m *Measure) title(p *Problem) string {
	if m.Over && p.Draws > 0 && m.Name != "completed" {
		return m.Label + ", all runs"
	}
	return m.Label
}

func (r *Result) settings(b *strings.Builder) {
	p := r.Problem
	rows := [][]string{{"setting", "before", "after", "from", "to"}}
	for i := range p.Ranges {
		g := &p.Ranges[i]
		how := ""
		if g.Log {
			how = ", logarithmic"
		}
		rows = append(rows, []string{g.Path, g.Setting.Format(p.start[i]), say(g, r.Best.Values[i]), g.Setting.Format(g.Low), g.Setting.Format(g.High) + how})
	}
	accept.WriteTable(b, rows, nil)
}

// say writes a setting in four digits: more are not worth it.
func say(g *study.Range, v float64) string {
	if v == math.Trunc(v) && g.Setting.Dim == quantity.None {
		return g.Setting.Format(v)
	}
	return quantity.Format(v, g.Setting.Dim)
}

func (r *Result) measures(b *strings.Builder, colour bool) {
	p := r.Problem
	before := func(f func(c *Candidate) string) string {
		if r.Before == nil {
			return "–"
		}
		return f(r.Before)
	}
	figure := func(c *Candidate) string { return p.Column.Format(c.Figure) }
	rows := [][]string{{"", "before", "after", "allowed", "room"}, {p.figureLabel(), before(figure), figure(r.Best)}}
	marks := []string{"    "}
	for i := range p.Measures {
		m := &p.Measures[i]
		v := r.Best.Measured[i]
		rows = append(rows, []string{m.title(p), before(func(c *Candidate) string { return m.Say(c.Measured[i]) }), m.Say(v), m.Allowed(), m.room(v)})
		mark := "    "
		if !math.IsNaN(m.Limit) {
			mark = accept.Word(m.Pass(v), colour)
		}
		marks = append(marks, mark)
	}
	accept.WriteTable(b, rows, marks)
}

// room says how close a value is to its limit.
func (m *Measure) room(v float64) string {
	switch {
	case math.IsNaN(m.Limit), math.IsNaN(v):
		return ""
	case m.AtLeast && math.IsInf(v, 1):
		return "any"
	case m.Name == "completed" && v == 1:
		return "all"
	case m.AtLeast && m.unit == 1: // margins: in points
		return points(v-m.Limit, "above", "below")
	case m.AtLeast && m.Limit == 0:
		return ""
	case m.AtLeast:
		return points(v/m.Limit-1, "above", "below")
	case m.Limit == 0:
		return ""
	}
	return points(1-v/m.Limit, "left", "over")
}

func points(v float64, good, bad string) string {
	word := good
	if v < 0 {
		v, word = -v, bad
	}
	return fmt.Sprintf("%.2g %% %s", min(100*v, 1e6), word)
}

// tellFront is how many points of the front are told on a screen.
const tellFront = 8

func (r *Result) front(b *strings.Builder) {
	p := r.Problem
	if len(r.Front) < 2 {
		return
	}
	i := p.margin()
	fmt.Fprintf(b, "\n  accuracy against %s: none of these is beaten in both\n", p.Measures[i].Label)
	var head []string
	for k := range p.Ranges {
		head = append(head, p.Ranges[k].Path)
	}
	rows := [][]string{append(head, p.figureLabel(), p.Measures[i].Label, "")}
	for _, c := range thinned(r.Front, tellFront) {
		var row []string
		for k := range p.Ranges {
			row = append(row, say(&p.Ranges[k], c.Values[k]))
		}
		note := ""
		if !p.Pass(c) {
			note = "misses a limit"
		}
		rows = append(rows, append(row, p.Column.Format(c.Figure), p.Measures[i].Say(c.Measured[i]), note))
	}
	accept.WriteTable(b, rows, nil)
}

// thinned keeps at most n of many, both ends among them.
func thinned(all []*Candidate, n int) []*Candidate {
	if len(all) <= n {
		return all
	}
	if n < 2 {
		return all[:n]
	}
	out := make([]*Candidate, n)
	for i := range out {
		out[i] = all[i*(len(all)-1)/(n-1)]
	}
	return out
}

// check tells what other draws say of the best, and how all of it is seen again.
func (r *Result) check(b *strings.Builder) {
	p := r.Problem
	if r.Check != nil {
		for i := range r.Check.Figures {
			t := &r.Check.Figures[i]
			if t.Column.Figure != p.Figure {
				continue
			}
			v := t.Worst.Value
			if p.Quantile < 1 {
				v = t.Quantile(p.Quantile)
			}
			fmt.Fprintf(b, "\n  over %d other draws: %s %s; %d pass [accept]\n", r.Check.Runs, p.figureLabel(), t.Column.Format(v), r.Check.Passed)
		}
	}
	b.WriteString("\n  seen again by\n")
	for _, line := range r.Commands() {
		fmt.Fprintf(b, "      %s\n", line)
	}
}

// Commands make the runs of the best candidate again: the scenario as it is, the
// draws, the corners.
func (r *Result) Commands() []string {
	p := r.Problem
	sets := p.sets(r.Best)
	out := []string{study.Command("run", p.Scenario.Name, sets)}
	if p.Draws == 0 {
		return out
	}
	sweep := study.Command("sweep", p.Scenario.Name, sets)
	if p.Lane != scenarios.Configured {
		sweep += " --lane " + p.Lane
	}
	draws := fmt.Sprintf("%s --draws %d --seed %d", sweep, p.Draws, p.Seed)
	if p.Law != study.Uniform {
		draws += " --law " + string(p.Law)
	}
	out = append(out, draws)
	if p.Corners != nil {
		for i := range p.Corners.Grid {
			sweep += " --over " + study.Quote(p.Corners.Grid[i].String())
		}
		out = append(out, sweep)
	}
	return out
}
