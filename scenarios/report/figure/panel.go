package figure

import (
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/plotter"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// drawing is a panel on its way to the canvas.
type drawing struct {
	Panel
	curves []*curve
	cells  *cells
	x, y   scale
	plot   *plot.Plot
	head   header
	box    draw.Canvas // what the panel may use, without its header
	// onlyTicks leaves out the words at X: they stand below the next panel.
	onlyTicks bool
}

// flattens is how many times the data's own span an axis may grow to show a
// limit.
const flattens = 2

func newDrawing(p Panel) *drawing {
	d := &drawing{Panel: p}
	for i, l := range p.Lines {
		d.curves = append(d.curves, &curve{line: l, pen: penOf(i), logX: p.X.Log, logY: p.Y.Log})
	}
	if p.Map != nil {
		d.cells = newCells(p.Map, p.X.Log, p.Y.Log)
	}
	d.scales()
	return d
}

// scales finds the ends of both axes from all that is to be seen.
func (d *drawing) scales() {
	x, y := newExtent(d.X.Log), newExtent(d.Y.Log)
	histories := false // that run along X, from one end to the other
	for _, c := range d.curves {
		histories = histories || c.history()
		for k := range c.line.X {
			if !c.shown(c.line.X[k], c.line.Y[k]) {
				continue
			}
			x.take(c.line.X[k])
			y.take(c.line.Y[k])
			if len(c.line.Low) > 0 {
				y.take(c.line.Low[k])
				y.take(c.line.High[k])
			}
		}
	}
	if d.cells != nil {
		x.take(d.cells.x...)
		y.take(d.cells.y...)
	}
	for _, m := range d.Marks {
		if x.can(m.X) && y.can(m.Y) {
			x.take(m.X)
			y.take(m.Y)
		}
	}
	for _, l := range d.Levels {
		if l.Vertical {
			x.reach(l.Value)
		} else {
			y.reach(l.Value)
		}
	}
	d.x = d.X.span(x.low, x.high, d.cells == nil && (d.Equal || !histories))
	d.y = d.Y.span(y.low, y.high, d.cells == nil)
	if d.cells == nil && !d.Equal {
		d.roomForNames()
	}
}

// roomForNames raises the top of the panel where the name of a limit needs it.
func (d *drawing) roomForNames() {
	if d.Y.High != 0 && finite(d.Y.High) {
		return
	}
	roof, s := d.y.high, d.y
	for _, l := range d.Levels {
		if l.Vertical || l.Value > s.high || l.Value > roof-0.15*(s.high-s.low) {
			s.high = roof + 0.15*(roof-s.low)
			if s.log {
				s.high = roof * math.Pow(roof/s.low, 0.15)
			}
		}
	}
	d.y = s
}

// extent is what an axis must show.
type extent struct {
	log       bool
	low, high float64
}

func newExtent(log bool) extent { return extent{log, math.Inf(1), math.Inf(-1)} }

func (e *extent) can(v float64) bool { return placeable(v, e.log) }

func (e *extent) take(values ...float64) {
	for _, v := range values {
		if e.can(v) {
			e.low, e.high = math.Min(e.low, v), math.Max(e.high, v)
		}
	}
}

// reach takes a limit in if the data stay readable.
func (e *extent) reach(v float64) {
	wider := *e
	wider.take(v)
	before, after := e.high-e.low, wider.high-wider.low
	if e.log {
		before, after = math.Log(e.high/e.low), math.Log(wider.high/wider.low)
	}
	if e.low > e.high || after <= flattens*before {
		*e = wider
	}
}

// prepare makes the plot for the box: ticks as many as there is room for.
func (d *drawing) prepare() {
	size := d.box.Size()
	d.x.divide(int(size.X / 62))
	d.y.divide(max(3, int(size.Y/26)))
	p := plot.New()
	p.BackgroundColor = nil
	grid := plotter.NewGrid()
	grid.Vertical.Color, grid.Horizontal.Color = faint, faint
	grid.Vertical.Width, grid.Horizontal.Width = lineThin, lineThin
	label := d.X.label(d.x.power)
	if d.onlyTicks {
		label = ""
	}
	d.axis(&p.X, d.x, label, size.X-60)
	d.axis(&p.Y, d.y, d.Y.label(d.y.power), size.Y-20)
	if d.cells == nil {
		p.Add(grid)
	} else {
		p.Add(d.cells)
	}
	for _, c := range d.curves {
		p.Add(c)
	}
	d.plot = p
	// plot.Add widened nothing: none of these gives a data range.
}

func (d *drawing) axis(a *plot.Axis, s scale, label string, room vg.Length) {
	a.Min, a.Max = s.low, s.high
	if s.log {
		a.Scale = logarithmic{}
	}
	a.Padding = 0
	a.LineStyle = draw.LineStyle{Color: quiet, Width: 0.6}
	a.Tick.LineStyle = a.LineStyle
	a.Tick.Length = 3
	a.Tick.Marker = plot.ConstantTicks(s.ticks)
	style := tickWords
	style.XAlign, style.YAlign = a.Tick.Label.XAlign, a.Tick.Label.YAlign
	a.Tick.Label = style
	style = axisWords
	if wide := style.Width(label); wide > room {
		style.Font.Size = max(5, style.Font.Size*room/wide)
	}
	style.XAlign, style.YAlign, style.Rotation = a.Label.TextStyle.XAlign, a.Label.TextStyle.YAlign, a.Label.TextStyle.Rotation
	a.Label.TextStyle = style
	a.Label.Text = label
	a.Label.Padding = 2
}

// logarithmic places values on a logarithmic axis, those of 0 and below far to
// the left; the library's own scale panics there.
type logarithmic struct{}

// Normalize implements plot.Normalizer.
func (logarithmic) Normalize(low, high, v float64) float64 {
	if v < smallest {
		return -10
	}
	return math.Log(v/low) / math.Log(high/low)
}

// equalize widens the axis that has too much room, so that lengths along X and
// Y mean the same.
func (d *drawing) equalize(data draw.Canvas) {
	if !d.Equal || d.x.log || d.y.log {
		return
	}
	size := data.Size()
	perX, perY := (d.x.high-d.x.low)/float64(size.X), (d.y.high-d.y.low)/float64(size.Y)
	if perX < perY {
		more := (perY*float64(size.X) - (d.x.high - d.x.low)) / 2
		d.x.low, d.x.high = d.x.low-more, d.x.high+more
	} else {
		more := (perX*float64(size.Y) - (d.y.high - d.y.low)) / 2
		d.y.low, d.y.high = d.y.low-more, d.y.high+more
	}
}

// draw puts the panel on its box.
func (d *drawing) draw() {
	d.plot.Draw(d.box)
	data := d.plot.DataCanvas(d.box)
	tx, ty := d.plot.Transforms(&data)
	if d.cells != nil {
		d.cells.hatch(data, tx, ty)
		frame(data)
		d.cells.bar(data)
	}
	var taken notes
	for _, l := range d.Levels {
		d.limit(data, l, tx, ty, &taken)
	}
	for _, l := range d.Levels {
		d.name(data, l, tx, ty, &taken)
	}
	for _, m := range d.Marks {
		d.mark(data, m, tx, ty, &taken)
	}
	if d.cells != nil {
		d.cells.contours(data, tx, ty, &taken)
	}
	if d.empty() {
		style := legendWords
		style.XAlign, style.YAlign = draw.XCenter, draw.YCenter
		data.FillText(style, data.Center(), "nothing to show")
	}
}

func (d *drawing) empty() bool {
	if d.cells != nil || len(d.Marks) > 0 {
		return false
	}
	for _, c := range d.curves {
		for k := range c.line.X {
			if c.shown(c.line.X[k], c.line.Y[k]) {
				return false
			}
		}
	}
	return true
}

func frame(c draw.Canvas) {
	style := draw.LineStyle{Color: quiet, Width: 0.6}
	c.StrokeLines(style, []vg.Point{c.Min, {X: c.Max.X, Y: c.Min.Y}, c.Max, {X: c.Min.X, Y: c.Max.Y}, c.Min})
}
