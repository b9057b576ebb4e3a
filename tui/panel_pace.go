package tui

import (
	"fmt"
	"strings"
	"time"

	"antelag/tui/canvas"
)

// drawPace shows how punctually ticks are released: what came late, the
// lateness percentiles, and what the system granted.
func (d *Dashboard) drawPace(s *Snapshot, b box) {
	v := &s.Pace
	note, ink := "", canvas.Plain
	switch {
	case v.Ticks == 0:
	case v.Late == 0:
		note, ink = "every tick in time", canvas.Good
	case v.Overruns > 0:
		note, ink = "OVERRUNS", canvas.Bad
	default:
		note, ink = "late ticks", canvas.Warn
	}
	in := b.frame(panelPace, note, ink)
	if v.Ticks == 0 {
		in.Text(1, 0, canvas.Dim, "no ticks released yet")
		return
	}
	y := 0
	for _, line := range paceCounts(v, in.at.w) {
		in.Text(1, y, canvas.Plain, line)
		y++
	}
	y = drawPercentiles(in, y, v)
	drawGranted(in, y, v.Granted)
}

// drawGranted says what the system refused, which has its reason behind a
// colon, and then what it granted.
func drawGranted(in box, y int, all []string) {
	var granted []string
	for _, text := range all {
		if !strings.Contains(text, ": ") {
			granted = append(granted, text)
			continue
		}
		in.Text(1, y, canvas.Warn, "!")
		for _, line := range wrap(text, in.at.w-4, 3) {
			in.Text(3, y, canvas.Warn, line)
			y++
		}
	}
	if len(granted) == 0 {
		return
	}
	for _, line := range wrap("granted: "+strings.Join(granted, ", "), in.at.w-2, max(0, in.at.h-y)) {
		in.Text(1, y, canvas.Plain, line)
		y++
	}
}

// paceCounts says how many ticks came late. Late is more than a tenth of the
// period, overrun more than a whole one, a shift a standstill.
func paceCounts(v *PaceView, width int) []string {
	late := fmt.Sprintf("%d of %d ticks late", v.Late, v.Ticks)
	part := share(float64(v.Late) / float64(v.Ticks))
	over := fmt.Sprintf("%s, %s", count(v.Overruns, "overrun"), count(v.Shifts, "shift"))
	if full := late + " (" + part + "), " + over; canvas.Width(full) < width {
		return []string{full}
	}
	return []string{late, over}
}

// drawPercentiles writes the lateness percentiles: each on its own row with its
// share of the period where there is room, else two in a row.
func drawPercentiles(in box, y int, v *PaceView) int {
	rows := []struct {
		name string
		d    time.Duration
	}{{"50 %", v.P50}, {"99 %", v.P99}, {"99.9 %", v.P999}, {"most", v.Max}}
	in.Text(1, y, canvas.Dim, "lateness (a tick is "+micro(v.Period)+")")
	y++
	tight := in.at.h < 11
	for i, r := range rows {
		ink := canvas.Plain
		if v.Period > 0 && r.d > v.Period/10 {
			ink = canvas.Warn
		}
		if tight {
			half := in.sub(i%2*15, y+i/2, 15, 1)
			half.Text(0, 0, canvas.Dim, r.name)
			half.TextRight(14, 0, ink, micro(r.d))
			continue
		}
		in.sub(1, y, 7, 1).TextRight(6, 0, canvas.Dim, r.name)
		in.sub(8, y, 9, 1).TextRight(9, 0, ink, micro(r.d))
		if v.Period > 0 {
			part := float64(r.d) / float64(v.Period)
			in.sub(17, y, 10, 1).TextRight(9, 0, canvas.Dim, share(part))
			in.sub(28, y, in.at.w-29, 1).Bar(ink, part, 0, 1, 0.1)
		}
		y++
	}
	if tight {
		y += 2
	}
	return y
}
