package figure

import (
	"sort"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

const (
	hatchGap  = vg.Length(12) // between lines, along X
	hatchStep = vg.Length(0.5)
)

var hatchStroke = draw.LineStyle{Color: quiet, Width: lineThin}

// hatch draws oblique lines over all cells below the edge.
func (c *cells) hatch(canvas draw.Canvas, tx, ty func(float64) vg.Length) {
	if c.Below == "" {
		return
	}
	across, up := places(c.x, tx), places(c.y, ty)
	size := canvas.Size()
	for start := canvas.Min.X - size.Y; start < canvas.Max.X; start += hatchGap {
		var from vg.Point
		open := false
		for d := vg.Length(0); d <= size.Y; d += hatchStep {
			at := vg.Point{X: start + d, Y: canvas.Min.Y + d}
			within := canvas.Contains(at) && c.below(across, up, at)
			if within && !open {
				from = at
			}
			if open && !within || within && d+hatchStep > size.Y {
				canvas.StrokeLines(hatchStroke, []vg.Point{from, at})
			}
			open = within
		}
	}
}

// places are the borders of cells on the canvas.
func places(borders []float64, on func(float64) vg.Length) []vg.Length {
	out := make([]vg.Length, len(borders))
	for i, b := range borders {
		out[i] = on(b)
	}
	return out
}

// below reports whether a point of the canvas lies in a cell below the edge.
func (c *cells) below(across, up []vg.Length, at vg.Point) bool {
	ix := sort.Search(len(across), func(i int) bool { return across[i] > at.X }) - 1
	iy := sort.Search(len(up), func(i int) bool { return up[i] > at.Y }) - 1
	return ix >= 0 && iy >= 0 && ix < len(c.X) && iy < len(c.Y) && c.Z[iy][ix] < c.Edge
}
