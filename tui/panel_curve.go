package tui

import (
	"math"
	"slices"

	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

var (
	figureKey = canvas.Key{Name: "figure", Ink: canvas.Measured, Style: canvas.Solid}
	bestKey   = canvas.Key{Name: "best", Ink: canvas.Good, Style: canvas.Solid}
)

// drawCurve plots the chosen figure of the whole scenario against the setting
// under the cursor: where it stands now, where it is best, the acceptance
// limit, and below which values every limit is met.
func (d *Dashboard) drawCurve(s *Snapshot, b box) {
	v := &s.Curve
	note, ink := "", canvas.Plain
	if v.Working {
		note, ink = "computing…", canvas.Warn
	}
	// The title must not change when the computing ends: only the note gives way.
	title := curveTitle(v, b.at.w-5)
	words := curveWords(v)
	if note != "" && canvas.Width(title)+8+canvas.Width(note) > b.at.w {
		words, note = append(words, span{note, ink}), ""
	}
	in := b.titled(title, note, ink, false)
	if len(v.X) == 0 {
		text := "Put the cursor on a setting with a number to see how the verdict depends on it."
		if v.Working {
			text = "computing the scenario over the range of the setting…"
		}
		drawLines(in, canvas.Dim, text)
		return
	}
	y := flow(in, 0, 2, 2, words...)
	strip := 0
	if len(v.Pass) > 0 && in.at.h-y >= 5 {
		strip = 1
	}
	plot := in.sub(0, y, in.at.w, in.at.h-y-strip)
	d.plotCurve(plot, v)
	if strip > 0 {
		d.passStrip(in, plot, v)
	}
}

// curveTitle says what is plotted against what, in at most room columns.
func curveTitle(v *CurveView, room int) string {
	title, figure := panels[panelCurve].title, v.Figure
	if figure == "" {
		return title
	}
	against := ""
	if v.Setting != "" {
		against = " against " + v.Setting
	}
	if short := shortLabels[figure]; short != "" && canvas.Width(title+": "+figure+against) > room {
		figure = short
	}
	return cut(title+": "+figure+against, max(room, len(title)))
}

// figureAxis is the axis of a figure and the factor from SI into its unit:
// figures without a dimension are ratios, written in percent.
func figureAxis(lo, hi float64, dim quantity.Dim) (canvas.Axis, float64) {
	factor, unit := 100.0, "%"
	if dim != quantity.None {
		factor, unit = unitFor(math.Max(math.Abs(lo), math.Abs(hi)), dim)
	}
	return canvas.Axis{Lo: lo * factor, Hi: hi * factor, Unit: unit}, factor
}

func figureText(v float64, dim quantity.Dim) string {
	if dim == quantity.None {
		return share(v)
	}
	if dim == quantity.Time && v < 0 {
		return late(v)
	}
	if dim == quantity.Time {
		size, _ := milliseconds(v)
		return size
	}
	return quantity.Format(v, dim)
}

func settingText(v float64, dim quantity.Dim) string {
	if !defined(v) {
		return undefined
	}
	return quantity.FormatIn(unitValue(v, dim))
}

// unitValue prepares a setting for three significant digits in its unit.
func unitValue(v float64, dim quantity.Dim) (float64, quantity.Unit, string, int) {
	_, unit := unitFor(v, dim)
	u, err := quantity.ParseUnit(typed.Replace(unit))
	if err != nil {
		u, _ = quantity.ParseUnit("")
	}
	return v, u, unit, 3
}

// curveWords says in words where the setting stands and where it is best.
func curveWords(v *CurveView) []span {
	var out []span
	if defined(v.Now) {
		text := "now " + settingText(v.Now, v.XDim)
		if y := valueAt(v.X, v.Y, v.Now); defined(y) {
			text += ": " + figureText(y, v.YDim)
		}
		out = append(out, span{text, canvas.Bold})
	}
	if defined(v.Best) {
		text := "best " + settingText(v.Best, v.XDim)
		if y := valueAt(v.X, v.Y, v.Best); defined(y) {
			text += ": " + figureText(y, v.YDim)
		}
		out = append(out, span{text, canvas.Good})
	}
	return out
}

// valueAt interpolates the curve at x; NaN outside it.
func valueAt(xs, ys []float64, x float64) float64 {
	for i := 0; i < len(xs) && i < len(ys); i++ {
		switch {
		case xs[i] == x:
			return ys[i]
		case i > 0 && (xs[i-1] < x) == (x < xs[i]):
			f := (x - xs[i-1]) / (xs[i] - xs[i-1])
			return ys[i-1] + f*(ys[i]-ys[i-1])
		}
	}
	return math.NaN()
}

func (d *Dashboard) plotCurve(in box, v *CurveView) {
	if key := v.Setting + " " + v.Figure; key != d.plots.curveOf {
		d.plots.curveOf = key
		d.plots.curveScale.Reset()
	}
	lo, hi := d.curveExtent(v)
	lo, hi = d.plots.curveScale.Update(lo, hi)
	p := &d.plots.curve
	var ky float64
	p.Y, ky = figureAxis(lo, hi, v.YDim)
	x0, x1 := canvas.Extent(v.X)
	kx, unit := unitFor(math.Max(math.Abs(x0), math.Abs(x1)), v.XDim)
	p.X = canvas.Axis{Lo: x0 * kx, Hi: x1 * kx, Unit: unit}
	p.Begin(in.Region)
	xs := d.plots.scaled(0, v.X, kx, math.Inf(1))
	ys := d.plots.scaled(1, v.Y, ky, math.Inf(1))
	p.DrawSeries(figureKey, xs, ys)
	if defined(v.Limit) {
		p.Limit(canvas.Limit, v.Limit*ky, "limit")
		if v.YDim == quantity.Time && v.Limit > 0 {
			p.Limit(canvas.Limit, -v.Limit*ky, "limit")
		}
	}
	p.Cursor(canvas.Cursor, v.Now*kx, "now")
	if y := valueAt(v.X, v.Y, v.Best); defined(y) {
		p.Line(bestKey, v.Best*kx, y*ky, v.Best*kx, lo*ky)
		w, h := p.Area().Size()
		column := int(float64(w) * (v.Best - x0) / (x1 - x0))
		_ = p.Note(column-5, h-1, canvas.Good, "best") || p.Note(column+2, h-1, canvas.Good, "best")
	}
	p.End()
}

// curveExtent is the part of the figure's range worth showing: a curve that
// blows up at one end would flatten the rest, so it is cut off at five times the
// limit, or at five times its median.
func (d *Dashboard) curveExtent(v *CurveView) (lo, hi float64) {
	lo, hi = canvas.Extent(v.Y, []float64{v.Limit})
	if v.SmallerWins {
		lo = math.Min(lo, 0)
	}
	bound := 5 * math.Abs(v.Limit)
	if !defined(bound) || bound == 0 {
		bound = 5 * median(v.Y, d.plots.scaled(2, v.Y, 1, math.Inf(1)))
	}
	if defined(bound) && bound > 0 {
		lo, hi = math.Max(lo, -bound), math.Min(hi, bound)
	}
	return lo, hi
}

// median is the middle of the absolute values, using buffer for the work.
func median(values, buffer []float64) float64 {
	buffer = buffer[:0]
	for _, v := range values {
		if defined(v) {
			buffer = append(buffer, math.Abs(v))
		}
	}
	if len(buffer) == 0 {
		return math.NaN()
	}
	slices.Sort(buffer)
	return buffer[len(buffer)/2]
}

// passStrip marks below the plot for which values of the setting the whole
// verdict passes: a heavy line where it does, nothing where it does not.
func (d *Dashboard) passStrip(in, plot box, v *CurveView) {
	y := in.at.h - 1
	area := d.plots.curve.Area()
	w, _ := area.Size()
	left := plot.at.w - w
	word := "pass"
	if left >= len(word)+1 {
		in.Text(0, y, canvas.Good, word)
	}
	x0, x1 := canvas.Extent(v.X)
	if !(x1 > x0) {
		return
	}
	for x := range w {
		at := x0 + (x1-x0)*(float64(x)+0.5)/float64(w)
		if i := nearestIndex(v.X, at); i < len(v.Pass) && v.Pass[i] {
			in.Set(left+x, y, canvas.Cell{Rune: '━', Ink: canvas.Good})
		} else {
			in.Set(left+x, y, canvas.Cell{Rune: '·', Ink: canvas.Dim})
		}
	}
}

func nearestIndex(xs []float64, x float64) int {
	best := 0
	for i := range xs {
		if math.Abs(xs[i]-x) < math.Abs(xs[best]-x) {
			best = i
		}
	}
	return best
}
