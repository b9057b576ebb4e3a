package study

import (
	"fmt"
	"math"
	"strings"

	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/scenarios/report/figure"
)

// Picture draws the summary: over a grid of one setting the figures against it,
// over a grid of two a map of the main figure, else how the figures are
// distributed over the runs. Limits are drawn in.
func (s *Summary) Picture() figure.Figure {
	f := figure.Figure{Title: accept.Printable(s.Study.Scenario.Title)}
	switch {
	case len(s.Study.Grid) == 1 && len(s.Points) > 1:
		f.Panels = s.curves()
	case len(s.Study.Grid) == 2 && int64(len(s.Points)) == s.Study.points && min(s.Study.Grid[0].N, s.Study.Grid[1].N) > 1:
		f.Panels = []figure.Panel{s.plane()}
	default:
		f.Panels = s.distributions()
	}
	return f
}

// pictured are the figures that a picture shows: those with a limit, or, without
// any, the main one.
func (s *Summary) pictured() []int {
	var out []int
	for i := range s.Figures {
		if !math.IsNaN(s.Figures[i].Limit) {
			out = append(out, i)
		}
	}
	if out == nil {
		out = []int{s.main()}
	}
	return out
}

// scale is a unit in which values up to largest read well, with what SI values
// are divided by.
func scale(d quantity.Dim, largest float64) (unit string, by float64) {
	if d == quantity.None {
		return "", 1
	}
	_, unit, _ = strings.Cut(quantity.Format(largest, d), " ")
	u, err := quantity.ParseUnit(unit)
	if err != nil || largest == 0 {
		return d.SI(), 1
	}
	return unit, u.SI(1)
}

// FigureAxis is the axis of a figure, in per cent where it is a ratio, with what SI
// values are divided by.
func FigureAxis(label string, d quantity.Dim, largest float64) (a figure.Axis, by float64) {
	a.Label = label
	if d == quantity.None {
		a.Unit = "%"
		return a, 0.01
	}
	a.Unit, by = scale(d, largest)
	return a, by
}

func (c *Column) axis(largest float64) (a figure.Axis, by float64) {
	return FigureAxis(c.Label, c.Dim, largest)
}

// SettingAxis is the axis of a setting.
func SettingAxis(r *Range) (a figure.Axis, by float64) {
	a.Label, a.Log = r.Path, r.Log
	a.Unit, by = scale(r.Setting.Dim, r.High)
	return a, by
}

// curves draws every pictured figure against the one setting of the grid.
func (s *Summary) curves() []figure.Panel {
	x, byX := SettingAxis(&s.Study.Grid[0].Range)
	var panels []figure.Panel
	for _, i := range s.pictured() {
		t := &s.Figures[i]
		largest := 0.0
		for _, p := range s.Points {
			if p.Worst != nil && !math.IsNaN(p.Worst[i]) {
				largest = max(largest, math.Abs(p.Worst[i]))
			}
		}
		y, by := t.Column.axis(largest)
		worst := figure.Line{Name: "worst draw", Points: len(s.Points) < 30, Joined: true}
		most := figure.Line{Name: "95 % of draws"}
		for _, p := range s.Points {
			if p.Worst == nil {
				continue
			}
			worst.X, worst.Y = append(worst.X, p.Values[0]/byX), append(worst.Y, p.Worst[i]/by)
			most.X, most.Y = append(most.X, p.Values[0]/byX), append(most.Y, p.Most[i]/by)
		}
		panel := figure.Panel{X: x, Y: y, Lines: []figure.Line{worst, most}}
		if s.Study.Draws < tellQuantile {
			panel.Lines = panel.Lines[:1]
		}
		if s.Study.Draws == 0 || len(panels) > 0 { // one legend is enough
			for k := range panel.Lines {
				panel.Lines[k].Name = ""
			}
		}
		panel.Levels = t.level(y.Unit, by, false)
		panels = append(panels, panel)
	}
	return panels
}

// tellQuantile is how many draws there must be for 95 % of them to be others than
// all.
const tellQuantile = 20

// level is the limit of a figure, if it has one.
func (t *Tally) level(unit string, by float64, vertical bool) []figure.Level {
	if math.IsNaN(t.Limit) {
		return nil
	}
	name := strings.TrimSpace(fmt.Sprintf("limit %.4g %s", t.Limit/by, unit))
	return []figure.Level{{Name: name, Value: t.Limit / by, Vertical: vertical}}
}

// plane maps the main figure over the two settings of the grid.
func (s *Summary) plane() figure.Panel {
	i := s.main()
	t, slow, fast := &s.Figures[i], &s.Study.Grid[0], &s.Study.Grid[1]
	x, byX := SettingAxis(&fast.Range)
	y, byY := SettingAxis(&slow.Range)
	m := &figure.Map{}
	largest := 0.0
	for k := range fast.N {
		m.X = append(m.X, fast.At(k)/byX)
	}
	for k := range slow.N {
		m.Y = append(m.Y, slow.At(k)/byY)
		row := make([]float64, fast.N)
		for j := range row {
			row[j] = s.Points[k*fast.N+j].Worst[i]
			if !math.IsNaN(row[j]) {
				largest = max(largest, math.Abs(row[j]))
			}
		}
		m.Z = append(m.Z, row)
	}
	axis, by := t.Column.axis(largest)
	for _, row := range m.Z {
		for j := range row {
			row[j] /= by
		}
	}
	m.Label, m.Unit = axis.Label, axis.Unit
	if s.Study.Draws > 0 {
		m.Label += ", worst draw"
	}
	if !math.IsNaN(t.Limit) {
		m.Contours = []float64{t.Limit / by}
	}
	return figure.Panel{X: x, Y: y, Map: m}
}

// distributions draws, for every pictured figure, the share of runs that are no
// worse than a value.
func (s *Summary) distributions() []figure.Panel {
	var panels []figure.Panel
	for _, i := range s.pictured() {
		t := &s.Figures[i]
		c := t.Column
		largest := 0.0
		t.sketch.steps(func(v float64, _ int64) bool {
			if !math.IsInf(v, 0) {
				largest = max(largest, math.Abs(v))
			}
			return true
		})
		x, by := c.axis(largest)
		line := figure.Line{}
		add := func(bad, share float64) {
			line.X, line.Y = append(line.X, c.Good(bad)/by), append(line.Y, 100*share)
		}
		before := 0.0
		t.sketch.steps(func(v float64, upTo int64) bool {
			if math.IsInf(v, 0) {
				return false
			}
			share := float64(upTo) / float64(t.sketch.n)
			add(v, before)
			add(v, share)
			before = share
			return true
		})
		if c.Figure == "delay" {
			x.Label = "delay, late or early"
		}
		y := figure.Axis{Label: "runs no worse", Unit: "%", Low: 0, High: 100}
		if len(line.X) == 0 {
			line.X, line.Y = []float64{0}, []float64{0}
			x.Label += " (no run completed)"
		}
		panels = append(panels, figure.Panel{X: x, Y: y, Lines: []figure.Line{line}, Levels: t.level(x.Unit, by, true)})
	}
	return panels
}
