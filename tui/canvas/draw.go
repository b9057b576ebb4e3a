package canvas

import "math"

// DrawSeries joins the points (xs[i], ys[i]) by lines. Without xs the points are
// 0, 1, 2 … A series of any length is drawn whole: points that fall into one
// column of dots become the stroke from their lowest to their highest, which is
// what lines between them would light, so no peak is lost.
func (p *Plot) DrawSeries(k Key, xs, ys []float64) {
	pen := pen{dots: &p.dots, key: k}
	n := len(ys)
	if xs != nil {
		n = min(n, len(xs))
	}
	for i := range n {
		x := float64(i)
		if xs != nil {
			x = xs[i]
		}
		pen.to(p.place(x, ys[i]))
	}
	pen.lift()
}

// DrawPoints lights one dot at each point.
func (p *Plot) DrawPoints(k Key, xs, ys []float64) {
	for i := range min(len(xs), len(ys)) {
		x, y := p.place(xs[i], ys[i])
		p.dots.line(x, y, x, y, Solid, k.Ink)
	}
}

// Line joins two points.
func (p *Plot) Line(k Key, x0, y0, x1, y1 float64) {
	pen := pen{dots: &p.dots, key: k}
	pen.to(p.place(x0, y0))
	pen.to(p.place(x1, y1))
	pen.lift()
}

// Ellipse draws the ellipse about (cx, cy) with semi-axes major and minor, the
// major one turned by tilt, rad, from the x axis towards the y axis.
func (p *Plot) Ellipse(k Key, cx, cy, major, minor, tilt float64) {
	sin, cos := math.Sincos(tilt)
	size := max(math.Abs(major), math.Abs(minor))
	across := size * max(math.Abs(p.x.perUnit), math.Abs(p.y.perUnit))
	if !(across < 1e6) {
		across = 1e6 // from here on what can be seen is straight
	}
	// A chord of 2π/n leaves the arc by 1−cos(π/n) ≈ π²/2n² of the radius: with this
	// n by a fifth of a dot.
	n := 24 + int(5*math.Sqrt(across))
	pen := pen{dots: &p.dots, key: k}
	for i := range n + 1 {
		s, c := math.Sincos(2 * math.Pi * float64(i%n) / float64(n))
		pen.to(p.place(cx+major*c*cos-minor*s*sin, cy+major*c*sin+minor*s*cos))
	}
	pen.lift()
}

// Limit draws a dashed horizontal line at y with the label at its right end, or
// at its left one when another label is there. It reports whether the line is on the axis; when not, nothing is drawn.
func (p *Plot) Limit(ink Ink, y float64, label string) bool {
	if !p.y.holds(y) || p.dots.h == 0 {
		return false
	}
	row := p.y.at(y)
	p.dots.line(0, row, float64(p.dots.w-1), row, Dashed, ink)
	line := between(nearest(row)/4, 0, p.area.h-1)
	if n := Width(label); n > 0 {
		_ = p.note(p.area.w-n, line, ink, label) || p.note(0, line, ink, label)
	}
	return true
}

// Cursor draws a vertical line at x, every second dot, with the label beside its
// top. It reports whether the line is on the axis; when not, nothing is drawn.
func (p *Plot) Cursor(ink Ink, x float64, label string) bool {
	if !p.x.holds(x) || p.dots.w == 0 {
		return false
	}
	col := nearest(p.x.at(x))
	for y := 0; y < p.dots.h; y += 2 {
		p.dots.set(col, y, ink)
	}
	if n := Width(label); n > 0 {
		right := col/2 + 1
		if right+n > p.area.w {
			right = col/2 - n
		}
		_ = p.note(right, 0, ink, label) || p.note(right, 1, ink, label)
	}
	return true
}

// Note writes text on top of the dots, from a column and row of the area. It is
// left out where it does not fit whole or would cover an earlier note; it reports
// whether it is there.
func (p *Plot) Note(column, row int, ink Ink, text string) bool {
	return p.note(column, row, ink, text)
}

func (p *Plot) note(x, y int, ink Ink, text string) bool {
	n := Width(text)
	// In a small plot labels would be all there is.
	if x < 0 || y < 0 || y >= p.area.h || x > p.area.w-n || 3*n > 2*p.area.w || p.area.h < 5 {
		return false
	}
	for _, o := range p.notes {
		if o.y == y && x <= o.x+o.n && o.x <= x+n {
			return false
		}
	}
	p.notes = append(p.notes, note{x, y, n, ink, text})
	return true
}

// place is where a point lies, in dots; NaN for what cannot be placed.
func (p *Plot) place(x, y float64) (float64, float64) {
	if x-x != 0 || y-y != 0 { // NaN and Inf
		return math.NaN(), math.NaN()
	}
	return p.x.at(x), p.y.at(y)
}

// pen draws a line from point to point. As long as points stay in one column of
// dots it only keeps their extent.
type pen struct {
	dots *dots
	key  Key

	down   bool    // there is a last point
	x, y   float64 // it
	column int     // its column; outside the picture −1
	lo, hi float64 // extent of y in this column
}

// to moves the pen, drawing; NaN lifts it.
func (n *pen) to(x, y float64) {
	if x != x || y != y {
		n.lift()
		return
	}
	column := -1
	if x >= -edge && x <= n.dots.clipX {
		column = nearest(x)
	}
	switch {
	case !n.down:
		n.lo, n.hi = y, y
	case column == n.column && column >= 0:
		n.lo, n.hi = min(n.lo, y), max(n.hi, y)
	default:
		n.stroke()
		n.dots.line(n.x, n.y, x, y, n.key.Style, n.key.Ink)
		n.lo, n.hi = y, y
	}
	n.down, n.x, n.y, n.column = true, x, y, column
}

// stroke draws what was kept of the last column.
func (n *pen) stroke() {
	if n.column >= 0 {
		x := float64(n.column)
		n.dots.line(x, n.lo, x, n.hi, n.key.Style, n.key.Ink)
	}
}

// lift ends the line.
func (n *pen) lift() {
	if n.down {
		n.stroke()
	}
	n.down = false
}
