package tui

import (
	"fmt"

	"antelag/rtloop"
	"antelag/tui/canvas"
)

// drawTrace plots target, command and measured against time, with their
// values now. When the lane has ended by a limit it says so across the top.
func (d *Dashboard) drawTrace(s *Snapshot, b box) {
	t := &s.Trace
	in := b.frame(panelTrace, traceNote(s), canvas.Accent)
	y := 0
	if l := s.lane(); l != nil && (l.Outcome == rtloop.Tripped || l.Outcome == rtloop.Diverged) {
		for _, line := range wrap(tripText(l.Outcome, l.Trip), in.at.w-1, 2) {
			in.Text(1, y, canvas.Bad, line)
			y++
		}
	}
	if len(t.Time) == 0 {
		in.Text(1, y, canvas.Dim, "nothing has moved yet")
		return
	}
	p := &d.plots.trace
	axis, k := lengthAxis(&d.plots.traceScale, d.plots.reach(s), t.Target, t.Command, t.Measured)
	p.X, p.Y = d.plots.timeAxis(t.Time), axis
	p.Legend = p.Legend[:0]
	long := in.at.w >= 76
	for _, series := range []struct {
		key    canvas.Key
		values []float64
	}{{targetKey, t.Target}, {measuredKey, t.Measured}, {commandKey, t.Command}} {
		key := series.key
		if long {
			key.Name += " " + length(last(series.values))
		}
		p.Legend = append(p.Legend, key)
	}
	p.Begin(in.Sub(0, y, in.at.w, in.at.h-y))
	p.DrawSeries(commandKey, t.Time, d.plots.scaled(0, t.Command, k, hugeLength))
	p.DrawSeries(measuredKey, t.Time, d.plots.scaled(1, t.Measured, k, hugeLength))
	p.DrawSeries(targetKey, t.Time, d.plots.scaled(2, t.Target, k, hugeLength))
	p.End()
}

// traceNote says whose displacement it is, and what the screen did not get.
func traceNote(s *Snapshot) string {
	if n := s.Trace.Dropped; n > 0 {
		return fmt.Sprintf("screen missed %d samples", n)
	}
	name := ""
	if l := s.lane(); l != nil {
		name = l.Name
	}
	if len(s.Channels) > 1 && s.Channel >= 0 && s.Channel < len(s.Channels) {
		name += " · " + s.Channels[s.Channel]
	}
	return name
}
