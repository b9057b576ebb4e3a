package tui

import (
	"antelag/tui/canvas"
)

var (
	trailKey    = canvas.Key{Name: "trail", Ink: canvas.Measured, Style: canvas.Solid}
	ellipseKey  = canvas.Key{Name: "ellipse", Ink: canvas.Accent, Style: canvas.Dashed}
	diagonalKey = canvas.Key{Name: "perfect", Ink: canvas.Dim, Style: canvas.Dotted}
)

// drawSubspace plots measured against target, with the line of perfect tracking
// at 45° and the fitted ellipse, and says what they mean.
func (d *Dashboard) drawSubspace(s *Snapshot, b box) {
	v := &s.Subspace
	in := b.frame(panelSubspace, "", canvas.Plain)
	words := subspaceWords(v)
	// The plot needs no more than a square: cells are twice as high as wide, two
	// rows are the foot, and labels stand to the left. The words stand beside it
	// where they have room, else above.
	plot := in
	if side := 2*(in.at.h-2) + 8; in.at.w-side >= 12 {
		plot = in.sub(0, 0, min(side, in.at.w-12), in.at.h)
		subspaceBeside(in.sub(plot.at.w+1, 0, in.at.w-plot.at.w-1, in.at.h), words)
	} else {
		y := flow(in, 0, 2, 2, words...)
		plot = in.sub(0, y, in.at.w, in.at.h-y)
	}
	if len(v.X) == 0 {
		plot.Text(1, 0, canvas.Dim, "no trail yet")
		return
	}
	p := &d.plots.subspace
	axis, k := lengthAxis(&d.plots.subspaceScale, d.plots.reach(s), v.X, v.Y)
	p.X, p.Y, p.Equal = axis, axis, true
	p.Begin(plot.Region)
	x0, x1, y0, y1 := p.Bounds()
	lo, hi := min(x0, y0), max(x1, y1)
	p.Line(diagonalKey, lo, lo, hi, hi)
	p.DrawSeries(trailKey, d.plots.scaled(0, v.X, k, hugeLength), d.plots.scaled(1, v.Y, k, hugeLength))
	if e := v.Ellipse; defined(e.Major) && defined(e.Tilt) && e.Major < hugeLength {
		p.Ellipse(ellipseKey, e.CenterX*k, e.CenterY*k, e.Major*k, e.Minor*k, e.Tilt)
	}
	p.End()
}

// subspaceWords says what the ellipse says.
func subspaceWords(v *SubspaceView) []span {
	if v.Resting {
		return []span{{"at rest", canvas.Dim}}
	}
	delay := span{"delay undefined", canvas.Dim}
	if defined(v.Delay) {
		size, way := milliseconds(v.Delay)
		switch way {
		case "":
			delay = span{"in time (" + size + ")", canvas.Bold}
		default:
			delay = span{way + " by " + size, canvas.Bold}
		}
	}
	if !defined(v.Ellipse.AmplitudeRatio) {
		return []span{delay}
	}
	return []span{delay, {"amplitude " + amplitude(v.Ellipse.AmplitudeRatio), canvas.Bold}}
}

// subspaceBeside writes the words one under the other, and what lies on which
// axis.
func subspaceBeside(in box, words []span) {
	y := 0
	for _, s := range words {
		for _, line := range wrap(s.text, in.at.w, 3) {
			in.Text(0, y, s.ink, line)
			y++
		}
	}
	for _, s := range []span{{"", 0}, {"→ target", canvas.Target}, {"↑ measured", canvas.Measured},
		{"⠑⠄ equal", canvas.Dim}, {"⠒⠂ fitted", canvas.Accent}} {
		if y < in.at.h {
			in.Text(0, y, s.ink, s.text)
		}
		y++
	}
}
