package tui

import (
	"math"

	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

// drawRecord says what a log that is played says since it was last sought in.
func (d *Dashboard) drawRecord(s *Snapshot, b box) {
	v := s.Record
	note := ""
	if defined(v.Since) {
		note = "since " + seconds(v.Since)
	}
	in := b.frame(panelRecord, note, canvas.Dim)
	if !defined(v.Since) {
		in.Text(1, 0, canvas.Dim, "nothing has been read yet")
		return
	}
	ratio := math.NaN()
	if v.PeakTarget > 0 {
		ratio = v.PeakError / v.PeakTarget
	}
	what := "tracking error"
	if in.at.w < 36 {
		what = "error"
	}
	rows := []span{
		{what + ", rms", canvas.Plain}, {share(v.NRMSE), canvas.Bold},
		{what + ", peak", canvas.Plain}, {length(v.PeakError), canvas.Bold},
		{"  of the peak target", canvas.Plain}, {share(ratio), canvas.Bold},
		{"target, peak", canvas.Plain}, {length(v.PeakTarget), canvas.Bold},
		{"delay now", canvas.Plain}, {late(s.Subspace.Delay), canvas.Bold},
	}
	for y := 0; 2*y < len(rows); y++ {
		in.Text(1, y, rows[2*y].ink, rows[2*y].text)
		in.TextRight(in.at.w-1, y, rows[2*y+1].ink, rows[2*y+1].text)
	}
	if v.Without != "" {
		in.sub(0, len(rows)/2, in.at.w, 1).Text(1, 0, canvas.Warn, "the log has no "+v.Without)
	}
}

// drawDelay plots the delay of the synchronization subspace against time.
func (d *Dashboard) drawDelay(s *Snapshot, b box) {
	v := s.Record
	in := b.frame(panelDelay, "late is up", canvas.Dim)
	lo, hi := canvas.Extent(v.Delay)
	if !defined(lo) {
		in.Text(1, 0, canvas.Dim, "no delay to show yet")
		return
	}
	p := &d.plots.delay
	lo, hi = d.plots.delayScale.Update(math.Min(lo, 0), math.Max(hi, 0))
	k, unit := unitFor(math.Max(math.Abs(lo), math.Abs(hi)), quantity.Time)
	from, to := canvas.Extent(v.Time)
	p.X = canvas.Axis{Lo: from, Hi: math.Max(to, from+1), Unit: "s"}
	p.Y = canvas.Axis{Lo: lo * k, Hi: hi * k, Unit: unit}
	p.Begin(in.Region)
	p.DrawSeries(delayKey, v.Time, d.plots.scaled(0, v.Delay, k, hugeLength))
	p.End()
}
