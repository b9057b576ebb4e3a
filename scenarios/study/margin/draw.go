package margin

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

// shades are what cells of a drawn map look like: the less damped, the darker.
var shades = []struct {
	below float64 // damping ratio
	rune  rune
	ink   canvas.Ink
	word  string
}{
	{0, '█', canvas.Bad, "grows"},
	{0.01, '▓', canvas.Warn, "below 1 %"},
	{0.02, '▒', canvas.Warn, "below 2 %"},
	{0.05, '░', canvas.Plain, "below 5 %"},
	{math.Inf(1), '·', canvas.Dim, "more"},
}

// refusedRune is a cell whose settings make no test.
const refusedRune = ' '

// Draw draws the map in characters, so many columns wide.
func (g *Grid) Draw(w io.Writer, columns int) error {
	columns = max(columns, 40)
	rows := min(max(columns*3/10, 12), 32)
	grid := canvas.NewGrid(columns, rows)
	x, y := unitFor(&g.X), unitFor(&g.Y)
	plot := canvas.Plot{X: axisOf(&g.X, x), Y: axisOf(&g.Y, y)}
	plot.Begin(grid.Whole())
	plot.End()
	area := plot.Area()
	wide, high := area.Size()
	for r := range high {
		for c := range wide {
			ix, iy := nearest(c, wide, g.X.N), nearest(high-1-r, high, g.Y.N)
			area.Set(c, r, g.cell(ix, iy))
		}
	}
	if c, r, ok := g.place(wide, high); ok {
		area.Set(c, r, canvas.Cell{Rune: '◆', Ink: canvas.Cursor})
	}
	var b strings.Builder
	fmt.Fprintf(&b, "damping ratio of the least damped mode\nup     %s\nright  %s\n", g.Y.Path, g.X.Path)
	b.WriteString(grid.String())
	b.WriteByte('\n')
	g.legend(&b)
	_, err := io.WriteString(w, b.String())
	return err
}

// axisOf is the axis of a range; a logarithmic one is even in the logarithm.
func axisOf(r *Range, u unit) canvas.Axis {
	a := canvas.Axis{Lo: u.from(r.Low), Hi: u.from(r.High), Unit: u.name}
	if r.Log {
		a.Lo, a.Hi = math.Log10(a.Lo), math.Log10(a.Hi)
		a.Label = func(v float64) string { return strconv.FormatFloat(math.Pow(10, v), 'g', 2, 64) }
	}
	return a
}

func nearest(i, of, n int) int { return min(n-1, int((float64(i)+0.5)/float64(of)*float64(n))) }

func (g *Grid) cell(ix, iy int) canvas.Cell {
	stable, ok := g.Stable(ix, iy)
	if !ok {
		return canvas.Cell{Rune: refusedRune}
	}
	if !stable {
		return canvas.Cell{Rune: shades[0].rune, Ink: shades[0].ink}
	}
	for _, s := range shades[1:] {
		if g.Damping[iy][ix] < s.below {
			return canvas.Cell{Rune: s.rune, Ink: s.ink}
		}
	}
	return canvas.Cell{Rune: shades[len(shades)-1].rune, Ink: canvas.Dim}
}

// place is where the scenario itself stands, as far as that is on the map.
func (g *Grid) place(wide, high int) (c, r int, ok bool) {
	fx, fy := g.X.Part(g.AtX), g.Y.Part(g.AtY)
	if !(fx >= 0 && fx <= 1 && fy >= 0 && fy <= 1) || wide == 0 || high == 0 {
		return 0, 0, false
	}
	return min(wide-1, int(fx*float64(wide))), min(high-1, int((1-fy)*float64(high))), true
}

func (g *Grid) legend(b *strings.Builder) {
	for i, s := range shades {
		if i > 0 {
			b.WriteString("   ")
		}
		fmt.Fprintf(b, "%c %s", s.rune, s.word)
	}
	if _, _, ok := g.place(1, 1); ok {
		fmt.Fprintf(b, "   ◆ the scenario")
	}
	b.WriteByte('\n')
	if g.Refused > 0 {
		fmt.Fprintf(b, "%d of %d cells make no test and are blank: %v\n", g.Refused, g.X.N*g.Y.N, g.Reason)
	}
	if all := g.X.N * g.Y.N; g.Whole < all {
		fmt.Fprintf(b, "broken off: %d of %d cells\n", g.Whole, all)
	}
}

// unit is how values of a range are written.
type unit struct {
	name string
	u    quantity.Unit
}

func (u unit) from(si float64) float64 { return u.u.From(si) }

// unitFor takes the unit in which the largest value of a range is written shortest.
func unitFor(r *Range) unit {
	largest := max(math.Abs(r.Low), math.Abs(r.High))
	_, name, _ := strings.Cut(quantity.Format(largest, r.Setting.Dim), " ")
	u, err := quantity.ParseUnit(name)
	if err != nil {
		name = r.Setting.Dim.SI()
		u, _ = quantity.ParseUnit(name)
	}
	return unit{name, u}
}
