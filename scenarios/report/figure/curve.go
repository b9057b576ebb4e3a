package figure

import (
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// curve draws a Line; it is a plot.Plotter.
type curve struct {
	line       Line
	pen        pen
	logX, logY bool
}

// shown reports whether the values can be placed.
func (c *curve) shown(x, y float64) bool {
	return placeable(x, c.logX) && placeable(y, c.logY)
}

// history reports whether the curve runs along an X that never goes back.
func (c *curve) history() bool {
	return (!c.line.Points || c.line.Joined) && slices.IsSorted(c.line.X)
}

// Plot draws band, line and markers.
func (c *curve) Plot(canvas draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&canvas)
	if len(c.line.Low) > 0 {
		c.band(canvas, tx, ty)
	}
	if !c.line.Points || c.line.Joined {
		var paths [][]vg.Point
		for _, piece := range c.pieces(c.line.Y) {
			path := make([]vg.Point, len(piece))
			for i, k := range piece {
				path[i] = vg.Point{X: tx(c.line.X[k]), Y: ty(c.line.Y[k])}
			}
			if len(path) == 1 && !c.line.Points {
				canvas.DrawGlyph(c.pen.glyph(), path[0])
			}
			paths = append(paths, canvas.ClipLinesXY(thin(path))...)
		}
		canvas.StrokeLines(c.stroke(canvas, paths), paths...)
	}
	if c.line.Points {
		for k := range c.line.X {
			if c.shown(c.line.X[k], c.line.Y[k]) {
				canvas.DrawGlyph(c.pen.glyph(), vg.Point{X: tx(c.line.X[k]), Y: ty(c.line.Y[k])})
			}
		}
	}
}

// stroke is the pen, finer for a curve that fills its panel.
func (c *curve) stroke(canvas draw.Canvas, paths [][]vg.Point) draw.LineStyle {
	style, long := c.pen.stroke(), vg.Length(0)
	for _, p := range paths {
		long += length(p)
	}
	if long > 15*(canvas.Size().X+canvas.Size().Y) {
		style.Width *= 0.6
	}
	return style
}

// pieces are the runs of indices between gaps in y.
func (c *curve) pieces(y []float64) [][]int {
	var out [][]int
	open := false
	for k := range y {
		if !c.shown(c.line.X[k], y[k]) {
			open = false
			continue
		}
		if !open {
			out = append(out, nil)
			open = true
		}
		out[len(out)-1] = append(out[len(out)-1], k)
	}
	return out
}

// band fills what lies between Low and High.
func (c *curve) band(canvas draw.Canvas, tx, ty func(float64) vg.Length) {
	both := make([]float64, len(c.line.Low))
	for k := range both {
		both[k] = c.line.Low[k]
		if !c.shown(c.line.X[k], c.line.High[k]) {
			both[k] = math.NaN()
		}
	}
	for _, piece := range c.pieces(both) {
		var up, down []vg.Point
		for _, k := range piece {
			up = append(up, vg.Point{X: tx(c.line.X[k]), Y: ty(c.line.High[k])})
			down = append(down, vg.Point{X: tx(c.line.X[k]), Y: ty(c.line.Low[k])})
		}
		up, down = thin(up), thin(down)
		for i := len(down) - 1; i >= 0; i-- {
			up = append(up, down[i])
		}
		shade := c.pen.colour
		shade.A = 0x38
		canvas.FillPolygon(shade, canvas.ClipPolygonXY(up))
	}
}

const (
	// column is the width of the strips in which a curve over an increasing X
	// keeps only its first, lowest, highest and last point, points.
	column = vg.Length(0.3)
	// finest is the distance below which other curves keep no further point.
	finest = vg.Length(0.12)
)

// thin leaves out points that nobody could see, so that a picture of a million
// ticks is no larger than one of a thousand. Extremes stay where they are.
func thin(path []vg.Point) []vg.Point {
	if len(path) < 500 {
		return path
	}
	for i := 1; i < len(path); i++ {
		if path[i].X < path[i-1].X {
			return thinTrail(path)
		}
	}
	return thinHistory(path)
}

// thinHistory keeps at most four points of each strip.
func thinHistory(path []vg.Point) []vg.Point {
	var out []vg.Point
	for from := 0; from < len(path); {
		strip := math.Floor(float64(path[from].X / column))
		low, high, to := from, from, from
		for to < len(path) && math.Floor(float64(path[to].X/column)) == strip {
			if path[to].Y < path[low].Y {
				low = to
			}
			if path[to].Y > path[high].Y {
				high = to
			}
			to++
		}
		last := -1
		for _, k := range []int{from, min(low, high), max(low, high), to - 1} {
			if k > last {
				out, last = append(out, path[k]), k
			}
		}
		from = to
	}
	return out
}

// thinTrail drops points while the chord stays within finest of all it skips.
func thinTrail(path []vg.Point) []vg.Point {
	out := []vg.Point{path[0]}
	anchor := 0
	for k := 2; k < len(path); k++ {
		if k-anchor > 200 || !straight(path[anchor:k+1]) {
			anchor = k - 1
			out = append(out, path[anchor])
		}
	}
	return append(out, path[len(path)-1])
}

// straight reports whether all points lie within finest of the chord between
// the first and the last.
func straight(path []vg.Point) bool {
	a, b := path[0], path[len(path)-1]
	dx, dy := float64(b.X-a.X), float64(b.Y-a.Y)
	long := dx*dx + dy*dy
	for _, p := range path[1 : len(path)-1] {
		x, y := float64(p.X-a.X), float64(p.Y-a.Y)
		if long > 0 {
			t := math.Min(1, math.Max(0, (x*dx+y*dy)/long))
			x, y = x-t*dx, y-t*dy
		}
		if x*x+y*y > float64(finest*finest) {
			return false
		}
	}
	return true
}
