package canvas

// Region is a rectangle of a grid. Every call is relative to its top left and
// writes nothing outside it. The zero value has no cells and swallows everything.
type Region struct {
	grid       *Grid
	x, y, w, h int
}

// Size is the number of columns and rows.
func (r Region) Size() (w, h int) { return r.w, r.h }

// Sub is the part of the region from column x and row y, w wide and h high, as
// far as it lies inside: its Size is what can be drawn on.
func (r Region) Sub(x, y, w, h int) Region {
	x0, x1 := overlap(x, w, r.w)
	y0, y1 := overlap(y, h, r.h)
	return Region{grid: r.grid, x: r.x + x0, y: r.y + y0, w: x1 - x0, h: y1 - y0}
}

// overlap is the part of n cells from at that lies within 0 and size.
func overlap(at, n, size int) (from, to int) {
	const far = 1 << 28 // sums of two stay within 32 bits
	at, n = between(at, -far, far), between(n, 0, far)
	from = between(at, 0, size)
	return from, max(from, min(at+n, size))
}

func between[T int | float64](v, lo, hi T) T { return max(lo, min(v, hi)) }

// At is the cell in column x, row y; a blank outside.
func (r Region) At(x, y int) Cell {
	if !r.has(x, y) {
		return Cell{}
	}
	return r.grid.At(r.x+x, r.y+y)
}

// Set writes one cell, see Grid.Set.
func (r Region) Set(x, y int, c Cell) {
	if r.has(x, y) {
		r.grid.Set(r.x+x, r.y+y, c)
	}
}

// Fill writes the same cell everywhere.
func (r Region) Fill(c Cell) {
	for y := range r.h {
		for x := range r.w {
			r.Set(x, y, c)
		}
	}
}

// Tint changes the ink of n cells from column x of row y and leaves their runes.
func (r Region) Tint(x, y, n int, ink Ink) {
	row := r.Sub(x, y, n, 1)
	for i := range row.w {
		if row.h == 1 && r.grid.has(row.x+i, row.y) {
			r.grid.cells[row.y*r.grid.w+row.x+i].Ink = ink
		}
	}
}

// Text writes s from column x of row y and returns how many columns it covers.
// When s is too long it is cut and ends in "…". Control characters are replaced,
// combining marks dropped.
func (r Region) Text(x, y int, ink Ink, s string) int {
	room := r.w - x
	if x < 0 {
		room = r.w // what stands left of the region is cut without a mark
	}
	if room <= 0 {
		return 0
	}
	full := Width(s)
	if x < 0 {
		full += max(x, -full)
	}
	if full <= room {
		return r.write(x, y, ink, s, r.w)
	}
	n := r.write(x, y, ink, s, r.w-1)
	for ; x+n < r.w-1; n++ { // a wide rune that would not fit whole
		r.Set(x+n, y, Cell{' ', ink})
	}
	r.Set(r.w-1, y, Cell{ellipsis, ink})
	return n + 1
}

// TextRight writes s so that it ends before column x and returns how many
// columns it covers. When s is longer than x its beginning is kept, ending in "…".
func (r Region) TextRight(x, y int, ink Ink, s string) int {
	n := Width(s)
	if x >= n {
		return r.Text(x-n, y, ink, s)
	}
	return r.Sub(0, y, x, 1).Text(0, 0, ink, s)
}

// write sets the runes of s that lie whole between columns 0 and end.
func (r Region) write(x, y int, ink Ink, s string, end int) int {
	n := 0
	for _, c := range s {
		c = printable(c)
		w := width(c)
		if w == 0 {
			continue
		}
		if x+n+w > end {
			break
		}
		at := x + n
		n += w
		if at < 0 || !r.has(at, y) || !r.grid.has(r.x+at+w-1, r.y+y) {
			continue
		}
		r.grid.put(r.x+at, r.y+y, Cell{c, ink})
		if w == 2 {
			r.grid.put(r.x+at+1, r.y+y, Cell{Tail, ink})
		}
	}
	return n
}

func (r Region) has(x, y int) bool {
	return r.grid != nil && uint(x) < uint(r.w) && uint(y) < uint(r.h)
}

// Frame heads the region with a titled rule and returns what is below it, less
// the last column, so that neighbours do not touch. With less than two rows there
// is no rule and the whole region is returned.
func (r Region) Frame(title string) Region { return r.rule(title, '─', Frame) }

// FrameSelected is Frame with a heavy rule: the panel that has the keys.
func (r Region) FrameSelected(title string) Region { return r.rule(title, '━', Selected) }

func (r Region) rule(title string, line rune, ink Ink) Region {
	if r.h < 2 {
		return r
	}
	head := r.Sub(0, 0, max(r.w-1, 1), 1)
	head.Fill(Cell{line, ink})
	if title != "" && head.w >= 5 {
		n := head.Sub(2, 0, head.w-3, 1).Text(0, 0, ink, title)
		head.Set(1, 0, Cell{' ', ink})
		head.Set(2+n, 0, Cell{' ', ink})
	}
	return r.Sub(0, 1, max(r.w-1, 1), r.h-1)
}
