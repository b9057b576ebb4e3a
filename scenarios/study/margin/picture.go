package margin

import (
	"math"

	"antelag/scenarios/report/figure"
)

// Contours of a drawn map: damping ratios in percent, and by how much motions grow
// in a second, as the spectral radius less 1 over that of a tick.
var dampingContours = []float64{0, 1, 2, 5, 10, 20}

// Figure is the map as a picture: contours of what is measured, and where the
// scenario stands.
func (g *Grid) Figure() figure.Figure {
	x, y := unitFor(&g.X), unitFor(&g.Y)
	p := figure.Panel{
		X: figure.Axis{Label: g.X.Path, Unit: x.name, Log: g.X.Log},
		Y: figure.Axis{Label: g.Y.Path, Unit: y.name, Log: g.Y.Log},
		Map: &figure.Map{
			X: scaled(values(&g.X), x), Y: scaled(values(&g.Y), y),
			Label: "damping ratio of the least damped mode", Unit: "%", Contours: dampingContours,
			Below: "grows by itself",
		},
	}
	if g.Measure == Radius {
		p.Map.Label, p.Map.Unit, p.Map.Contours, p.Map.Below = "spectral radius less 1, in millionths", "", g.radiusContours(), ""
	}
	for iy := range g.Y.N {
		row := make([]float64, g.X.N)
		for ix := range row {
			row[ix] = 100 * g.Damping[iy][ix]
			if g.Measure == Radius {
				row[ix] = 1e6 * (g.Radius[iy][ix] - 1)
			}
		}
		p.Map.Z = append(p.Map.Z, row)
	}
	if _, _, ok := g.place(1, 1); ok {
		p.Marks = []figure.Mark{{Name: "the scenario", X: x.from(g.AtX), Y: y.from(g.AtY)}}
	}
	return figure.Figure{Title: "Stability of " + g.Scenario, Panels: []figure.Panel{p}}
}

func scaled(v []float64, u unit) []float64 {
	for i := range v {
		v[i] = u.from(v[i])
	}
	return v
}

// radiusContours are 0, the edge of stability, and 1-2-5 steps on both sides.
func (g *Grid) radiusContours() []float64 {
	low, high := 0.0, 0.0
	for _, row := range g.Radius {
		for _, r := range row {
			if v := 1e6 * (r - 1); !math.IsNaN(v) {
				low, high = min(low, v), max(high, v)
			}
		}
	}
	out := []float64{0}
	for _, share := range []float64{0.5, 0.2, 0.05} {
		if low < 0 {
			out = append([]float64{-round(-low * share)}, out...)
		}
	}
	for _, share := range []float64{0.05, 0.2, 0.5} {
		if high > 0 {
			out = append(out, round(high*share))
		}
	}
	return ascending(out)
}

// round goes down to 1, 2 or 5 times a power of ten.
func round(v float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{5, 2} {
		if m*p <= v {
			return m * p
		}
	}
	return p
}
