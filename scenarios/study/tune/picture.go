package tune

import (
	"math"

	"antelag/scenarios/accept"
	"antelag/scenarios/report/figure"
	"antelag/scenarios/study"
)

// Picture draws all candidates by accuracy and margin, with the front of those
// that are not beaten in both, and, where one setting was tuned, the figure
// against it.
func (r *Result) Picture() figure.Figure {
	f := figure.Figure{Title: accept.Printable(r.Problem.Scenario.Title)}
	f.Panels = append(f.Panels, r.tradeOff())
	if len(r.Problem.Ranges) == 1 {
		f.Panels = append(f.Panels, r.curve())
	}
	return f
}

// tradeOff is the front.
func (r *Result) tradeOff() figure.Panel {
	p := r.Problem
	i := p.margin()
	m := &p.Measures[i]
	x, byX := study.FigureAxis(p.figureLabel(), p.Column.Dim, largest(r.Front, func(c *Candidate) float64 { return c.Figure }))
	y, byY := study.FigureAxis(m.Label, m.dim(), largest(r.Front, func(c *Candidate) float64 { return c.Measured[i] }))
	if m.Name == "noise_gain" {
		y.Unit, byY = "", 1
	}
	front := figure.Line{Name: "not beaten in both", Points: true, Joined: true}
	for _, c := range r.Front {
		front.X, front.Y = append(front.X, c.Figure/byX), append(front.Y, c.Measured[i]/byY)
	}
	panel := figure.Panel{X: x, Y: y, Lines: []figure.Line{front}}
	mark := func(name string, c *Candidate) {
		if c != nil && !math.IsNaN(c.Figure) && !math.IsNaN(c.Measured[i]) && !math.IsInf(c.Measured[i], 0) {
			panel.Marks = append(panel.Marks, figure.Mark{Name: name, X: c.Figure / byX, Y: c.Measured[i] / byY})
		}
	}
	mark("after", r.Best)
	mark("before", r.Before)
	if !math.IsNaN(m.Limit) {
		panel.Levels = []figure.Level{{Name: "limit " + m.say(m.Limit), Value: m.Limit / byY}}
	}
	return panel
}

func largest(all []*Candidate, get func(*Candidate) float64) float64 {
	most := 0.0
	for _, c := range all {
		if v := math.Abs(get(c)); v > most && !math.IsInf(v, 0) {
			most = v
		}
	}
	return most
}

// curve is the figure against the one setting, of all that was tried by all draws.
func (r *Result) curve() figure.Panel {
	p := r.Problem
	x, byX := study.SettingAxis(&p.Ranges[0])
	y, by := study.FigureAxis(p.figureLabel(), p.Column.Dim, largest(r.All, func(c *Candidate) float64 { return c.Figure }))
	passing, missing := figure.Line{Name: "keeps all limits", Points: true}, figure.Line{Name: "misses a limit", Points: true}
	for _, c := range r.All {
		to := &missing
		if p.Pass(c) {
			to = &passing
		}
		to.X, to.Y = append(to.X, c.Values[0]/byX), append(to.Y, c.Figure/by)
	}
	var lines []figure.Line
	for _, l := range []figure.Line{passing, missing} {
		if len(l.X) > 0 {
			lines = append(lines, l)
		}
	}
	return figure.Panel{X: x, Y: y, Lines: lines}
}
