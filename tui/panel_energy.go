package tui

import (
	"math"
	"strconv"

	"antelag/tui/canvas"
)

// Margins beyond these are drawn at the edge; the number says how far.
const (
	lowestMargin  = -1.0
	highestMargin = 1.5

	// A loop that damps a little by its error has a margin a little above one,
	// for which the axis need not grow.
	aboutOne = 1.1
)

// drawEnergy shows the energy margin as a number and as history with the
// acceptance limit, and the damping that the tracking error adds to the
// structure.
func (d *Dashboard) drawEnergy(s *Snapshot, b box) {
	v := &s.Energy
	note := ""
	if len(s.Channels) > 1 {
		note = "all channels together"
	}
	in := b.frame(panelEnergy, note, canvas.Dim)
	if !v.Structure {
		drawLines(in, canvas.Dim, v.Missing)
		return
	}
	tight, gap := in.at.w < 45, 2
	if tight {
		gap = 1
	}
	y := flow(in, 0, max(1, min(3, in.at.h/2)), gap, energyWords(v, tight)...)
	plot := in.sub(0, y, in.at.w, in.at.h-y)
	switch {
	case plot.at.h <= 0:
	case len(v.Time) == 0:
		plot.Text(1, 0, canvas.Dim, "no history yet")
	case plot.at.h < 5: // a plot would have no labels
		d.energySpark(plot, v)
	default:
		d.energyPlot(plot, v)
	}
}

// energyWords says the margin, how it stands to its limit, the least so far and
// the added damping, which is said shorter where room is tight.
func energyWords(v *EnergyView, tight bool) []span {
	out := []span{{"undefined, too little damped", canvas.Dim}}
	if defined(v.Margin) {
		now := span{margin(v.Margin), canvas.Bold}
		switch {
		case v.Margin < 0:
			now = span{now.text + ", GROWING", canvas.Bad}
		case defined(v.Limit) && v.Margin < v.Limit:
			now = span{now.text + ", BELOW " + percent(v.Limit), canvas.Bad}
		case defined(v.Limit):
			now = span{now.text + ", meets ≥ " + percent(v.Limit), canvas.Good}
		}
		out[0] = now
	}
	if defined(v.MarginMin) {
		out = append(out, span{"least " + margin(v.MarginMin), canvas.Plain})
	}
	if defined(v.Margin) && defined(v.AddedDamping) { // both mean nothing at rest
		text := share(v.AddedDamping)
		if v.AddedDamping > 0 {
			text = "+" + text
		}
		if text = "damping " + text; !tight {
			text = "added " + text + " of critical"
		}
		out = append(out, span{text, canvas.Plain})
	}
	return out
}

// percent writes a limit that people chose.
func percent(f float64) string { return strconv.FormatFloat(100*f, 'g', 4, 64) + " %" }

// energySpark is for panels too low for a plot: the margin now as a bar with
// the limit as its mark, and the history below.
func (d *Dashboard) energySpark(in box, v *EnergyView) {
	const label = "0 to 100 % "
	n := len(label)
	y := in.at.h - 1
	in.Text(0, y, canvas.Dim, label)
	in.sub(n, y, in.at.w-n, 1).Sparkline(canvas.Measured, v.History, 0, 1)
	if y--; y < 0 {
		return
	}
	now := v.Margin
	if now > 1 && now < aboutOne {
		now = 1
	}
	in.Text(0, y, canvas.Dim, "now")
	in.sub(n, y, in.at.w-n, 1).Bar(canvas.Measured, now, 0, 1, v.Limit)
}

func (d *Dashboard) energyPlot(in box, v *EnergyView) {
	lo, hi := canvas.Extent(v.History, []float64{0, 1, v.Limit})
	if hi < aboutOne {
		hi = 1
	}
	lo, hi = d.plots.energyScale.Update(math.Max(lo, lowestMargin), math.Min(hi, highestMargin))
	p := &d.plots.energy
	first, end := canvas.Extent(v.Time)
	p.X = canvas.Axis{Lo: first, Hi: end, Unit: "s"}
	p.Y = canvas.Axis{Lo: 100 * lo, Hi: 100 * hi, Unit: "%"}
	history := d.plots.scaled(0, v.History, 100, math.Inf(1))
	for i, h := range history { // what is below the axis stays visible on its edge
		if defined(h) {
			history[i] = math.Max(100*lo, math.Min(h, 100*hi))
		}
	}
	p.Begin(in.Region)
	p.DrawSeries(marginKey, v.Time, history)
	if defined(v.Limit) {
		p.Limit(canvas.Limit, 100*v.Limit, "limit "+percent(v.Limit))
	}
	p.End()
}

// drawLines writes running text from the top.
func drawLines(in box, ink canvas.Ink, text string) int {
	lines := wrap(text, in.at.w-2, max(in.at.h, 1))
	for y, line := range lines {
		in.Text(1, y, ink, line)
	}
	return len(lines)
}
