package canvas

import "math"

// LineStyle is the pattern of a line, so that lines can be told apart without
// colour.
type LineStyle uint8

// The patterns, in dots on and off along the line.
const (
	Solid  LineStyle = iota
	Dotted           // 1 on, 2 off
	Dashed           // 5 on, 3 off
)

// on reports whether the pattern has a dot at position i.
func (s LineStyle) on(i int) bool {
	switch s {
	case Dotted:
		return i%3 == 0
	case Dashed:
		return i&7 < 5
	}
	return true
}

// Braille patterns from U+2800 carry the eight dots of a cell in the low byte of
// the code point, bit n−1 for dot n (The Unicode Standard, chapter "Braille
// Patterns", from memory). The dots of a cell are numbered
//
//	1 4
//	2 5
//	3 6
//	7 8
//
// so that the bits by row and column are:
var brailleBit = [4][2]uint8{{0x01, 0x08}, {0x02, 0x10}, {0x04, 0x20}, {0x40, 0x80}}

const brailleBlank = 0x2800

// dots is a picture of w×h dots in cells of 2×4. Column 0 is left, row 0 is the
// top. When lines meet in a cell their dots are or-ed and the later ink wins.
type dots struct {
	w, h  int // dots
	cols  int // cells in a row
	bits  []uint8
	inks  []Ink
	back  []uint8 // shown only in cells without bits
	clipX float64 // largest coordinates that still round to a dot
	clipY float64
}

// edge is how far outside a dot's middle a coordinate still belongs to it, a
// little less than one half so that rounding stays inside.
const edge = 0.499

func (d *dots) resize(cols, rows int) {
	d.cols, d.w, d.h = cols, 2*cols, 4*rows
	d.clipX, d.clipY = float64(d.w-1)+edge, float64(d.h-1)+edge
	n := cols * rows
	if cap(d.bits) < n {
		d.bits, d.inks, d.back = make([]uint8, n), make([]Ink, n), make([]uint8, n)
		return
	}
	d.bits, d.inks, d.back = d.bits[:n], d.inks[:n], d.back[:n]
	clear(d.bits)
	clear(d.back)
}

// behind lights a dot of the background.
func (d *dots) behind(x, y int) {
	d.back[(y>>2)*d.cols+x>>1] |= brailleBit[y&3][x&1]
}

// set lights one dot.
func (d *dots) set(x, y int, ink Ink) {
	if uint(x) >= uint(d.w) || uint(y) >= uint(d.h) {
		return
	}
	i := (y>>2)*d.cols + x>>1
	d.bits[i] |= brailleBit[y&3][x&1]
	d.inks[i] = ink
}

// line joins two points in dot coordinates, of any size, NaN excepted.
func (d *dots) line(x0, y0, x1, y1 float64, style LineStyle, ink Ink) {
	if !d.clip(&x0, &y0, &x1, &y1) {
		return
	}
	d.bresenham(nearest(x0), nearest(y0), nearest(x1), nearest(y1), style, ink)
}

// nearest rounds a coordinate that clip let through.
func nearest(v float64) int { return int(math.Floor(v + 0.5)) }

// clip cuts a line to the picture by the parameters of its entry and exit (Liang
// & Barsky 1984). It reports false when nothing is left.
func (d *dots) clip(x0, y0, x1, y1 *float64) bool {
	if *x0 >= -edge && *x1 >= -edge && *x0 <= d.clipX && *x1 <= d.clipX &&
		*y0 >= -edge && *y1 >= -edge && *y0 <= d.clipY && *y1 <= d.clipY {
		return d.w > 0 && d.h > 0
	}
	dx, dy := *x1-*x0, *y1-*y0
	enter, leave := 0.0, 1.0
	if !cut(-dx, *x0+edge, &enter, &leave) || !cut(dx, d.clipX-*x0, &enter, &leave) ||
		!cut(-dy, *y0+edge, &enter, &leave) || !cut(dy, d.clipY-*y0, &enter, &leave) {
		return false
	}
	if leave < 1 {
		*x1, *y1 = *x0+leave*dx, *y0+leave*dy
	}
	if enter > 0 {
		*x0, *y0 = *x0+enter*dx, *y0+enter*dy
	}
	return d.w > 0 && d.h > 0
}

// cut narrows [enter, leave] to where p·t ≤ q.
func cut(p, q float64, enter, leave *float64) bool {
	switch {
	case p == 0:
		return q >= 0
	case p < 0:
		*enter = math.Max(*enter, q/p)
	default:
		*leave = math.Min(*leave, q/p)
	}
	return *enter <= *leave
}

// bresenham lights the dots of a line between two dots (Bresenham 1965). The
// pattern is tied to the place on the picture, the column in flat lines and the
// row in steep ones, so that it stands still while data pass through. Pieces of a
// few dots, as dense data make them, count as flat: on a row of its own each would
// be wholly on or off.
func (d *dots) bresenham(x0, y0, x1, y1 int, style LineStyle, ink Ink) {
	dx, dy := abs(x1-x0), -abs(y1-y0)
	sx, sy := sign(x1-x0), sign(y1-y0)
	steep := -dy > dx && -dy >= 4
	for err := dx + dy; ; {
		at := x0
		if steep {
			at = y0
		}
		if style == Solid || style.on(at) {
			d.set(x0, y0, ink)
		}
		if x0 == x1 && y0 == y1 {
			return
		}
		twice := 2 * err
		if twice >= dy {
			err += dy
			x0 += sx
		}
		if twice <= dx {
			err += dx
			y0 += sy
		}
	}
}

func abs(v int) int { return max(v, -v) }

func sign(v int) int {
	switch {
	case v > 0:
		return 1
	case v < 0:
		return -1
	}
	return 0
}
