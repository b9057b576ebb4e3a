package canvas

import "strings"

// Grid is a rectangle of cells, row after row. The zero value has no cells.
type Grid struct {
	w, h  int
	cells []Cell
}

// NewGrid makes a grid of blanks. Negative sizes count as zero.
func NewGrid(w, h int) *Grid {
	g := &Grid{}
	g.Resize(w, h)
	return g
}

// Resize gives the grid a new size and blanks it. Memory is reused when it is
// large enough. Regions taken before keep their place and size; what of them lies
// outside the new grid is not drawn.
func (g *Grid) Resize(w, h int) {
	g.w, g.h = max(w, 0), max(h, 0)
	n := g.w * g.h
	if cap(g.cells) < n {
		g.cells = make([]Cell, n)
		return
	}
	g.cells = g.cells[:n]
	g.Clear()
}

// Size is the number of columns and rows.
func (g *Grid) Size() (w, h int) { return g.w, g.h }

// At is the cell in column x, row y, counted from the top left; a blank outside
// the grid.
func (g *Grid) At(x, y int) Cell {
	if !g.has(x, y) {
		return Cell{}
	}
	return g.cells[y*g.w+x]
}

// Set writes one cell; outside the grid it does nothing. The rune must be one
// cell wide, others become the replacement character: Region.Text sets wide ones.
// Half of a wide rune that loses its other half becomes a blank.
func (g *Grid) Set(x, y int, c Cell) {
	if !g.has(x, y) {
		return
	}
	if c.Rune != 0 && width(c.Rune) != 1 {
		c.Rune = replacement
	}
	g.put(x, y, c)
}

// Clear blanks every cell.
func (g *Grid) Clear() { clear(g.cells) }

// Whole is the region of all cells.
func (g *Grid) Whole() Region { return Region{grid: g, w: g.w, h: g.h} }

// String is the rows joined by newlines, blanks at the end of a row trimmed: a
// picture for tests and for screenshots.
func (g *Grid) String() string {
	var b strings.Builder
	for y := range g.h {
		if y > 0 {
			b.WriteByte('\n')
		}
		blanks := 0
		for _, c := range g.cells[y*g.w : (y+1)*g.w] {
			switch c.Rune {
			case 0, ' ':
				blanks++
				continue
			case Tail:
				continue
			}
			for ; blanks > 0; blanks-- {
				b.WriteByte(' ')
			}
			b.WriteRune(c.Rune)
		}
	}
	return b.String()
}

func (g *Grid) has(x, y int) bool { return uint(x) < uint(g.w) && uint(y) < uint(g.h) }

// put writes a cell that is known to be inside and mends what it tears: the
// other half of a wide rune.
func (g *Grid) put(x, y int, c Cell) {
	i := y*g.w + x
	if g.cells[i].Rune == Tail && c.Rune != Tail && x > 0 {
		g.cells[i-1].Rune = 0
	}
	if x+1 < g.w && g.cells[i+1].Rune == Tail {
		g.cells[i+1].Rune = 0
	}
	g.cells[i] = c
}
