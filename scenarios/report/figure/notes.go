package figure

import (
	"image/color"
	"math"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// notes are the words written into a panel so far: where they stand, no other
// may.
type notes []vg.Rectangle

func (n notes) free(r vg.Rectangle) bool {
	for _, o := range n {
		if r.Min.X < o.Max.X && o.Min.X < r.Max.X && r.Min.Y < o.Max.Y && o.Min.Y < r.Max.Y {
			return false
		}
	}
	return true
}

// write puts words at the first of some places (their lower left corners) that
// lies inside and is free, or at the first.
func (n *notes) write(c draw.Canvas, style text.Style, words string, places ...vg.Point) {
	n.place(c, style, words, true, places)
}

// place is write; without must it leaves the words out where no place is free.
func (n *notes) place(c draw.Canvas, style text.Style, words string, must bool, places []vg.Point) {
	wide, high := style.Width(words), style.Font.Size
	at := func(p vg.Point) vg.Rectangle {
		return vg.Rectangle{Min: vg.Point{X: p.X - 1.5, Y: p.Y - 0.25*high}, Max: vg.Point{X: p.X + wide + 1.5, Y: p.Y + 0.9*high}}
	}
	box, corner := at(places[0]), places[0]
	for _, p := range places {
		r := at(p)
		if r.Min.X >= c.Min.X && r.Max.X <= c.Max.X && r.Min.Y >= c.Min.Y && r.Max.Y <= c.Max.Y && n.free(r) {
			box, corner, must = r, p, true
			break
		}
	}
	if !must {
		return
	}
	*n = append(*n, box)
	back := paper
	back.A = 0xd0
	fill(c, back, box)
	style.XAlign, style.YAlign = draw.XLeft, draw.YBottom
	c.FillText(style, vg.Point{X: corner.X, Y: corner.Y - 0.2*high}, words)
}

func fill(c draw.Canvas, colour color.Color, r vg.Rectangle) {
	c.FillPolygon(colour, []vg.Point{r.Min, {X: r.Max.X, Y: r.Min.Y}, r.Max, {X: r.Min.X, Y: r.Max.Y}})
}

// scaleOf is the axis that a limit lies on.
func (d *drawing) scaleOf(l Level) scale {
	if l.Vertical {
		return d.x
	}
	return d.y
}

// limit draws the line of a limit that lies within its axis.
func (d *drawing) limit(c draw.Canvas, l Level, tx, ty func(float64) vg.Length, taken *notes) {
	s := d.scaleOf(l)
	if !(l.Value >= s.low && l.Value <= s.high) {
		return
	}
	line := vg.Rectangle{Min: vg.Point{X: c.Min.X, Y: ty(l.Value)}, Max: vg.Point{X: c.Max.X, Y: ty(l.Value)}}
	if l.Vertical {
		line = vg.Rectangle{Min: vg.Point{X: tx(l.Value), Y: c.Min.Y}, Max: vg.Point{X: tx(l.Value), Y: c.Max.Y}}
	}
	c.StrokeLines(l.stroke(), []vg.Point{line.Min, line.Max})
	*taken = append(*taken, line)
}

// name writes what a limit is called; of one beyond the axis, at that edge.
func (d *drawing) name(c draw.Canvas, l Level, tx, ty func(float64) vg.Length, taken *notes) {
	s, name := d.scaleOf(l), clean(l.Name)
	if name == "" || !placeable(l.Value, s.log) {
		return
	}
	wide := l.words().Width(name)
	switch {
	case l.Value > s.high || l.Value < s.low:
		d.beyond(c, l, name, l.Value > s.high, taken)
	case l.Vertical:
		x, top := tx(l.Value), c.Max.Y-9
		taken.write(c, l.words(), name, vg.Point{X: x + 3, Y: top}, vg.Point{X: x - 3 - wide, Y: top}, vg.Point{X: x + 3, Y: top - 10}, vg.Point{X: x - 3 - wide, Y: top - 10})
	default:
		y, right, left := ty(l.Value), c.Max.X-wide-3, c.Min.X+4
		taken.write(c, l.words(), name, vg.Point{X: right, Y: y + 3}, vg.Point{X: left, Y: y + 3}, vg.Point{X: right, Y: y - 8.5}, vg.Point{X: left, Y: y - 8.5})
	}
}

func (d *drawing) beyond(c draw.Canvas, l Level, name string, above bool, taken *notes) {
	arrows := map[[2]bool]string{{false, true}: " ↑", {false, false}: " ↓", {true, true}: " →", {true, false}: " ←"}
	name += arrows[[2]bool{l.Vertical, above}]
	wide := l.words().Width(name)
	left, right, top, low := c.Min.X+4, c.Max.X-wide-3, c.Max.Y-9, c.Min.Y+4
	switch {
	case !l.Vertical && !above:
		taken.write(c, l.words(), name, vg.Point{X: right, Y: low}, vg.Point{X: left, Y: low}, vg.Point{X: right, Y: low + 10})
	case l.Vertical && !above:
		taken.write(c, l.words(), name, vg.Point{X: left, Y: top}, vg.Point{X: left, Y: low})
	default:
		taken.write(c, l.words(), name, vg.Point{X: right, Y: top}, vg.Point{X: right, Y: top - 10}, vg.Point{X: left, Y: top}, vg.Point{X: left, Y: top - 10})
	}
}

// mark draws a ring with a point in it, white around so that it stands out from
// anything, and its name beside it.
func (d *drawing) mark(c draw.Canvas, m Mark, tx, ty func(float64) vg.Length, taken *notes) {
	if !placeable(m.X, d.x.log) || !placeable(m.Y, d.y.log) {
		return
	}
	at := vg.Point{X: tx(m.X), Y: ty(m.Y)}
	if !c.Contains(at) {
		return
	}
	c.DrawGlyphNoClip(draw.GlyphStyle{Color: paper, Radius: 5.5, Shape: draw.CircleGlyph{}}, at)
	c.SetLineStyle(draw.LineStyle{Color: ink, Width: 1.3})
	var ring vg.Path
	ring.Move(vg.Point{X: at.X + 4.2, Y: at.Y})
	ring.Arc(at, 4.2, 0, 2*math.Pi)
	ring.Close()
	c.Stroke(ring)
	c.DrawGlyphNoClip(draw.GlyphStyle{Color: ink, Radius: 1.5, Shape: draw.CircleGlyph{}}, at)
	*taken = append(*taken, vg.Rectangle{Min: vg.Point{X: at.X - 6, Y: at.Y - 6}, Max: vg.Point{X: at.X + 6, Y: at.Y + 6}})
	name := clean(m.Name)
	if name == "" {
		return
	}
	wide := markWords.Width(name)
	taken.write(c, markWords, name,
		vg.Point{X: at.X + 8, Y: at.Y + 4}, vg.Point{X: at.X + 8, Y: at.Y - 11}, vg.Point{X: at.X - 8 - wide, Y: at.Y + 4},
		vg.Point{X: at.X - 8 - wide, Y: at.Y - 11}, vg.Point{X: at.X - wide/2, Y: at.Y + 9}, vg.Point{X: at.X - wide/2, Y: at.Y - 16})
}
