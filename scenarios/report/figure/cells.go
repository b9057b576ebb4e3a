package figure

import (
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// cells draws a Map: bands of colour between edges, low to high. It is a
// plot.Plotter.
type cells struct {
	*Map
	x, y  []float64 // borders of the cells, one more than there are cells
	edges []float64 // between the bands
}

const (
	mostBands = 8
	barWide   = vg.Length(11)
	barGap    = vg.Length(12)
)

func newCells(m *Map, logX, logY bool) *cells {
	return &cells{Map: m, x: borders(m.X, logX), y: borders(m.Y, logY), edges: m.edges()}
}

// borders lie half way between the points, on the scale that is drawn.
func borders(at []float64, log bool) []float64 {
	log = log && at[0] >= smallest
	on, back := func(v float64) float64 { return v }, func(v float64) float64 { return v }
	if log {
		on, back = math.Log, math.Exp
	}
	n := len(at)
	out := make([]float64, n+1)
	for i := 1; i < n; i++ {
		out[i] = back((on(at[i-1]) + on(at[i])) / 2)
	}
	out[0] = back(on(at[0]) - (on(at[1])-on(at[0]))/2)
	out[n] = back(on(at[n-1]) + (on(at[n-1])-on(at[n-2]))/2)
	return out
}

// edges are the contours, where they are enough to tell bands, or else round
// values over what all but the outermost hundredth of the map comes to.
func (m *Map) edges() []float64 {
	var given []float64
	for _, v := range m.Contours {
		if finite(v) {
			given = append(given, v)
		}
	}
	slices.Sort(given)
	if given = slices.Compact(given); len(given) >= 3 {
		return given
	}
	var all []float64
	for _, row := range m.Z {
		for _, z := range row {
			if finite(z) {
				all = append(all, z)
			}
		}
	}
	if len(all) == 0 {
		return given
	}
	slices.Sort(all)
	low, high := all[len(all)/100], all[len(all)-1-len(all)/100]
	if high <= low {
		return []float64{low}
	}
	step := niceStep((high - low) / mostBands)
	var out []float64
	for i := math.Floor(low/step) + 1; i*step < high-1e-9*step; i++ {
		out = append(out, round(i*step, 12))
	}
	return out
}

// band counts the edges at or below z.
func (c *cells) band(z float64) int {
	return sortSearch(c.edges, z)
}

func sortSearch(edges []float64, z float64) int {
	n := 0
	for n < len(edges) && z >= edges[n] {
		n++
	}
	return n
}

func (c *cells) colour(band int) color.NRGBA {
	if len(c.edges) == 0 {
		return bands[0]
	}
	return bands[int(math.Round(float64(band*(len(bands)-1))/float64(len(c.edges))))]
}

// Plot paints the bands from the lowest up, each over all cells that reach it,
// so that no gap shows between neighbours.
func (c *cells) Plot(canvas draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&canvas)
	for band := 0; band <= len(c.edges); band++ {
		var path vg.Path
		for _, r := range c.blocks(band) {
			x0, x1 := inside(tx(c.x[r.x0]), canvas.Min.X, canvas.Max.X), inside(tx(c.x[r.x1]), canvas.Min.X, canvas.Max.X)
			y0, y1 := inside(ty(c.y[r.y0]), canvas.Min.Y, canvas.Max.Y), inside(ty(c.y[r.y1]), canvas.Min.Y, canvas.Max.Y)
			if x1 <= x0 || y1 <= y0 {
				continue
			}
			path.Move(vg.Point{X: x0, Y: y0})
			path.Line(vg.Point{X: x1, Y: y0})
			path.Line(vg.Point{X: x1, Y: y1})
			path.Line(vg.Point{X: x0, Y: y1})
			path.Close()
		}
		if len(path) > 0 {
			canvas.SetColor(c.colour(band))
			canvas.Fill(path)
		}
	}
}

func inside(v, low, high vg.Length) vg.Length {
	if math.IsNaN(float64(v)) { // the border of a cell that a log axis cannot show
		return low
	}
	return min(max(v, low), high)
}

// block is a rectangle of cells, from x0, y0 to before x1, y1.
type block struct{ x0, x1, y0, y1 int }

// blocks gathers all cells of a band or above in rectangles: runs along the
// rows, put together with equal runs in the rows above.
func (c *cells) blocks(band int) []block {
	var done, open []block
	for iy, row := range c.Z {
		var next []block
		for ix := 0; ix < len(row); ix++ {
			if !c.in(row[ix], band) {
				continue
			}
			from := ix
			for ix < len(row) && c.in(row[ix], band) {
				ix++
			}
			b := block{from, ix, iy, iy + 1}
			if k := slices.IndexFunc(open, func(o block) bool { return o.x0 == from && o.x1 == ix }); k >= 0 {
				b.y0 = open[k].y0
				open = slices.Delete(open, k, k+1)
			}
			next = append(next, b)
		}
		done = append(done, open...)
		open = next
	}
	return append(done, open...)
}

func (c *cells) in(z float64, band int) bool { return !math.IsNaN(z) && c.band(z) >= band }

// undefined reports whether some cells are left blank.
func (c *cells) undefined() bool {
	for _, row := range c.Z {
		if slices.ContainsFunc(row, math.IsNaN) {
			return true
		}
	}
	return false
}

// title of the colour bar.
func (c *cells) title() string { return Axis{Label: clean(c.Label), Unit: clean(c.Unit)}.label(0) }

// barRoom is what the colour bar needs beside the diagram.
func (c *cells) barRoom() vg.Length {
	wide := vg.Length(0)
	for _, e := range c.edges {
		wide = max(wide, tickWords.Width(number(e)))
	}
	return barGap + barWide + 4 + wide + 6 + axisWords.Font.Size
}

// bar draws the colours with the values between them, right of the diagram.
func (c *cells) bar(data draw.Canvas) {
	x, n := data.Max.X+barGap, vg.Length(len(c.edges)+1)
	high := (data.Max.Y - data.Min.Y) / n
	wide := vg.Length(0)
	label := tickWords
	label.XAlign, label.YAlign = draw.XLeft, draw.YCenter
	for b := range len(c.edges) + 1 {
		y := data.Min.Y + high*vg.Length(b)
		fill(data, c.colour(b), vg.Rectangle{Min: vg.Point{X: x, Y: y}, Max: vg.Point{X: x + barWide, Y: y + high}})
		if b > 0 {
			text := number(c.edges[b-1])
			data.FillText(label, vg.Point{X: x + barWide + 4, Y: y}, text)
			wide = max(wide, label.Width(text))
		}
	}
	edge := draw.LineStyle{Color: quiet, Width: 0.6}
	for b := vg.Length(0); b <= n; b++ {
		y := data.Min.Y + high*b
		data.StrokeLines(edge, []vg.Point{{X: x, Y: y}, {X: x + barWide + 2*min(1, b)*min(1, n-b), Y: y}})
	}
	data.StrokeLines(edge, []vg.Point{{X: x, Y: data.Min.Y}, {X: x, Y: data.Max.Y}}, []vg.Point{{X: x + barWide, Y: data.Min.Y}, {X: x + barWide, Y: data.Max.Y}})
	title := axisWords
	title.XAlign, title.YAlign, title.Rotation = draw.XCenter, draw.YTop, math.Pi/2
	data.FillText(title, vg.Point{X: x + barWide + 4 + wide + 5, Y: data.Center().Y}, c.title())
}
