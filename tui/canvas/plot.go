package canvas

// Axis is what one axis of a plot shows.
type Axis struct {
	// Lo and Hi are the values at the left or bottom and at the right or top edge.
	// Lo above Hi points the axis the other way.
	Lo, Hi float64
	// Label writes a tick value, without the unit. Nil writes the decimals that
	// tell the ticks apart.
	Label func(v float64) string
	// Unit is written once, beside the labels.
	Unit string
}

// Key is how one series is drawn and what the legend calls it.
type Key struct {
	Name  string
	Ink   Ink
	Style LineStyle
}

// Plot draws series over axes in a region. Set the fields, then for every frame
//
//	p.Begin(region)
//	p.DrawSeries(key, xs, ys) // and lines, limits, cursors, in any order
//	p.End()
//
// Keep a Plot from frame to frame: its memory is reused. The zero value is ready.
//
// Small regions lose the legend first, then the labels, then the axes. What lies
// outside the axes is clipped; infinite and NaN values break a line.
type Plot struct {
	X, Y Axis
	// Legend is the series named above the plot, as far as there is room.
	Legend []Key
	// Equal gives one unit the same length in both directions, for cells twice as
	// high as wide, by widening the range of one axis about its middle.
	Equal bool

	region Region // all that was given
	area   Region // where dots go
	dots   dots
	x, y   axis
	head   bool // there is a row for the legend
	notes  []note
}

// note is text on top of the dots.
type note struct {
	x, y, n int // column and row of the area, columns covered
	ink     Ink
	text    string
}

// Begin lays out the axes and starts a new picture.
func (p *Plot) Begin(r Region) {
	p.region = r
	p.notes = p.notes[:0]
	p.x.lo, p.x.hi = properRange(p.X.Lo, p.X.Hi)
	p.y.lo, p.y.hi = properRange(p.Y.Lo, p.Y.Hi)
	lo := [2]float64{p.x.lo, p.y.lo}
	hi := [2]float64{p.x.hi, p.y.hi}
	p.layout()
	if p.Equal {
		// Wider ranges may need wider labels, which leave less room, which changes
		// the ranges: settled after one more turn but for labels on the brink.
		for range 2 {
			p.equalize(lo, hi)
			p.layout()
		}
		p.equalize(lo, hi)
	}
	p.dots.resize(p.area.w, p.area.h)
	p.x.fit(p.dots.w, false)
	p.y.fit(p.dots.h, true)
}

// equalize widens one of the ranges so that a dot is the same in both.
func (p *Plot) equalize(lo, hi [2]float64) {
	p.x.lo, p.x.hi, p.y.lo, p.y.hi = lo[0], hi[0], lo[1], hi[1]
	nx, ny := float64(2*p.area.w-1), float64(4*p.area.h-1)
	if nx <= 0 || ny <= 0 {
		return
	}
	perDot := max(p.x.span()/nx, p.y.span()/ny)
	p.x.widen(perDot * nx)
	p.y.widen(perDot * ny)
}

// Area is the region inside the axes, from Begin on.
func (p *Plot) Area() Region { return p.area }

// Bounds are the ranges that the axes really show, from Begin on: those asked
// for, made divisible and, with Equal, widened.
func (p *Plot) Bounds() (x0, x1, y0, y1 float64) { return p.x.lo, p.x.hi, p.y.lo, p.y.hi }

// End writes the picture into the region, over all that stood there.
func (p *Plot) End() {
	p.background()
	p.clearMargins()
	p.drawDots()
	p.drawAxes()
	for _, n := range p.notes {
		p.area.Text(n.x, n.y, n.ink, n.text)
	}
	if p.head {
		p.drawLegend()
	}
}

func (p *Plot) clearMargins() {
	w, h := p.region.Size()
	left, top := p.area.x-p.region.x, p.area.y-p.region.y
	p.region.Sub(0, 0, w, top).Fill(Cell{})
	p.region.Sub(0, top, left, h).Fill(Cell{})
	p.region.Sub(left, top+p.area.h, w, h).Fill(Cell{})
}

// drawDots writes the lines and, in cells that no line touches, the background.
func (p *Plot) drawDots() {
	i := 0
	for y := range p.area.h {
		for x := range p.area.w {
			c := Cell{}
			if bits := p.dots.bits[i]; bits != 0 {
				c = Cell{brailleBlank + rune(bits), p.dots.inks[i]}
			} else if bits := p.dots.back[i]; bits != 0 {
				c = Cell{brailleBlank + rune(bits), Dim}
			}
			p.area.Set(x, y, c)
			i++
		}
	}
}

// background lights the zero lines, one dot a cell; with Equal both.
func (p *Plot) background() {
	d := &p.dots
	if d.w == 0 || d.h == 0 {
		return
	}
	if p.y.zeroInside() {
		row := nearest(p.y.at(0))
		for x := 0; x < d.w; x += 2 {
			d.behind(x, row)
		}
	}
	if p.Equal && p.x.zeroInside() {
		col := nearest(p.x.at(0))
		for y := 0; y < d.h; y += 2 {
			d.behind(col, y)
		}
	}
}
