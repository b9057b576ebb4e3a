package tempo

import (
	"fmt"
	"math"
	"strings"

	"antelag/scenarios/accept"
	"antelag/scenarios/report/figure"
	"antelag/tui/canvas"
)

// curve is one figure over the slowdowns.
type curve struct {
	name string
	y    []float64
}

// parts are the response error and what it is made of, in per cent. What is
// nothing is a gap: it has no place on a logarithmic axis.
func (r *Report) parts() []curve {
	out := []curve{{name: "response error"}, {name: "synchronization"}, {name: "rate effects"}}
	for i := range r.Points {
		s := r.Points[i].Split
		for k, v := range []float64{s.Total, s.Sync, s.Rate} {
			if !(v >= nothing) || math.IsInf(v, 0) {
				v = math.NaN()
			}
			out[k].y = append(out[k].y, 100*v)
		}
	}
	return out
}

func (r *Report) slowdowns() []float64 {
	var out []float64
	for i := range r.Points {
		out = append(out, r.Points[i].Slowdown)
	}
	return out
}

// Picture draws response error, tracking error, delay margin and energy margin
// over the slowdown. Limits are drawn in.
func (r *Report) Picture() figure.Figure {
	x := figure.Axis{Label: "slowdown", Log: true}
	line := func(c curve) figure.Line {
		return figure.Line{Name: c.name, X: r.slowdowns(), Y: c.y, Points: len(r.Points) <= 30, Joined: true}
	}
	f := figure.Figure{Title: accept.Printable(r.Title)}
	if r.Structure {
		p := figure.Panel{X: x, Y: figure.Axis{Label: "response error", Unit: "%", Log: true}, Levels: r.level("response_error", 100), Share: 1.6}
		for _, c := range r.parts() {
			p.Lines = append(p.Lines, line(c))
		}
		f.Panels = append(f.Panels, p)
	}
	var tracking, delay, energy curve
	for i := range r.Points {
		p := &r.Points[i]
		_, nrmse, _ := p.tracking()
		tracking.y = append(tracking.y, 100*float64(nrmse))
		delay.y = append(delay.y, 1e3*p.DelayMargin)
		energy.y = append(energy.y, 100*math.Max(-2, float64(p.Lane.Energy.MarginMin)))
	}
	f.Panels = append(f.Panels, figure.Panel{X: x, Y: figure.Axis{Label: "tracking error", Unit: "%", Log: true}, Lines: []figure.Line{line(tracking)}, Levels: r.level("nrmse", 100)})
	if shows(delay.y, 0) {
		f.Panels = append(f.Panels, figure.Panel{X: x, Y: figure.Axis{Label: "delay margin", Unit: "ms", Log: true}, Lines: []figure.Line{line(delay)}})
	}
	if shows(energy.y, math.Inf(-1)) {
		f.Panels = append(f.Panels, figure.Panel{X: x, Y: figure.Axis{Label: "energy margin", Unit: "%"}, Lines: []figure.Line{line(energy)}, Levels: r.level("energy_margin", 100)})
	}
	return f
}

// shows reports whether a curve has a value above low to be drawn.
func shows(y []float64, low float64) bool {
	for _, v := range y {
		if v > low && !math.IsInf(v, 0) {
			return true
		}
	}
	return false
}

func (r *Report) level(limit string, by float64) []figure.Level {
	if !r.scene.Accept.Has(limit) {
		return nil
	}
	return []figure.Level{{Name: "accepted", Value: by * r.scene.Accept.Num(limit)}}
}

// lift keeps the logarithm of a share above zero, where a plot has its line.
const lift = 20

// draw plots the parts of the response error in characters, both axes
// logarithmic.
func (r *Report) draw(b *strings.Builder, columns int) {
	curves := r.parts()
	var x []float64
	for _, v := range r.slowdowns() {
		x = append(x, math.Log10(v))
	}
	var all [][]float64
	for k := range curves {
		for i, v := range curves[k].y {
			curves[k].y[i] = math.Log10(v) + lift
		}
		all = append(all, curves[k].y)
	}
	low, high := canvas.Extent(all...)
	if math.IsNaN(low) {
		return
	}
	power := func(v float64) string { return fmt.Sprintf("%.3g", math.Pow(10, v)) }
	lowered := func(v float64) string { return power(v - lift) }
	columns = min(max(columns, 40), 120)
	grid := canvas.NewGrid(columns, min(max(columns/5, 10), 18))
	keys := []canvas.Key{
		{Name: curves[0].name, Ink: canvas.Bold},
		{Name: curves[1].name, Ink: canvas.Command, Style: canvas.Dashed},
		{Name: curves[2].name, Ink: canvas.Measured, Style: canvas.Dotted},
	}
	plot := canvas.Plot{
		X:      canvas.Axis{Lo: x[0], Hi: x[len(x)-1], Label: power, Unit: "slowdown"},
		Y:      canvas.Axis{Lo: math.Floor(2*low) / 2, Hi: math.Ceil(2*high) / 2, Label: lowered, Unit: "%"},
		Legend: keys,
	}
	plot.Begin(grid.Whole())
	for k := range keys {
		plot.DrawSeries(keys[k], x, curves[k].y)
	}
	plot.End()
	fmt.Fprintf(b, "%s\n", grid.String())
}
