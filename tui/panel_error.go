package tui

import (
	"math"

	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

// drawError plots target less measured against time. The trip limit is drawn
// once half of it is used; before, its line would press the error flat, and how
// much of it is used stands in words.
func (d *Dashboard) drawError(s *Snapshot, b box) {
	t := &s.Trace
	lo, hi := canvas.Extent(t.Lag)
	most := math.Max(math.Abs(lo), math.Abs(hi))
	limited := t.ErrorLimit > 0 && defined(t.ErrorLimit)
	near := limited && most > t.ErrorLimit/2
	note, ink := errorNote(t, most, limited)
	if s.Record != nil && defined(most) {
		note = "most " + length(most)
	}
	in := b.frame(panelError, note, ink)
	if len(t.Time) == 0 {
		in.Text(1, 0, canvas.Dim, "target less measured: nothing has moved yet")
		return
	}
	p, series := &d.plots.lag, [][]float64{t.Lag}
	if near {
		series = append(series, []float64{-t.ErrorLimit, t.ErrorLimit})
	}
	axis, k := lengthAxis(&d.plots.lagScale, d.plots.reach(s), series...)
	p.X, p.Y = d.plots.timeAxis(t.Time), axis
	p.Begin(in.Region)
	p.DrawSeries(errorKey, t.Time, d.plots.scaled(0, t.Lag, k, hugeLength))
	if limited {
		p.Limit(canvas.Limit, t.ErrorLimit*k, "trips")
		p.Limit(canvas.Limit, -t.ErrorLimit*k, "trips")
	}
	p.End()
}

func errorNote(t *Trace, most float64, limited bool) (string, canvas.Ink) {
	switch {
	case !defined(most):
		return "", canvas.Plain
	case !limited:
		return "most " + length(most) + ", no trip limit", canvas.Plain
	}
	text, limit := "most "+length(most)+", ", quantity.Short(t.ErrorLimit, quantity.Length)
	switch {
	case most >= t.ErrorLimit:
		return text + "OVER " + limit, canvas.Bad
	case most > t.ErrorLimit/2:
		return text + "NEAR " + limit, canvas.Warn
	}
	return text + "trips at " + limit, canvas.Plain
}
