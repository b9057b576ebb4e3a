package figure

import (
	"math"
	"regexp"
	"strings"
	"unicode"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

const mm = vg.Millimeter

// sized fills in the size that was left open.
func (f Figure) sized() Figure {
	if f.Width == 0 {
		f.Width = defaultWidth
	}
	if f.Height == 0 {
		for _, p := range f.Panels {
			high := panelHeight
			if p.Map != nil || p.Equal {
				high = squareHeight
			}
			if p.Share > 0 {
				high *= p.Share
			}
			f.Height += high
		}
		f.Height = min(f.Height, mostSize)
	}
	return f
}

// draw lays the figure out and draws it on a canvas of its size.
func (f Figure) draw(c draw.Canvas) {
	fill(c, paper, c.Rectangle)
	c = draw.Crop(c, margin, -margin, margin, -margin)
	if f.Title != "" {
		rows := wrap(titleWords, clean(f.Title), c.Size().X)
		for _, row := range rows {
			c.Max.Y -= lineStep + 2
			c.FillText(titleWords, vg.Point{X: c.Min.X, Y: c.Max.Y + 2}, row)
		}
		c.Max.Y -= 2
	}
	var drawings []*drawing
	heads, shares := vg.Length(0), 0.0
	for _, p := range f.Panels {
		d := newDrawing(p)
		d.head = newHeader(d, c.Size().X)
		heads += d.head.height
		shares += share(p)
		drawings = append(drawings, d)
	}
	together(drawings)
	room := max(c.Size().Y-heads, 10*vg.Length(len(drawings)))
	for _, d := range drawings {
		top := c.Max.Y
		c.Max.Y -= d.head.height
		d.box = c
		d.box.Min.Y = c.Max.Y - room*vg.Length(share(d.Panel)/shares)
		c.Max.Y = d.box.Min.Y
		d.head.top = top
	}
	align(drawings)
	for _, d := range drawings {
		d.draw()
		d.head.draw(d.plot.DataCanvas(d.box))
	}
}

func share(p Panel) float64 {
	if p.Share > 0 && finite(p.Share) {
		return p.Share
	}
	return 1
}

// together gives panels of the same X, one below the other, the same ends, and
// the words only once.
func together(drawings []*drawing) {
	for from := 0; from < len(drawings); {
		to := from + 1
		for to < len(drawings) && drawings[to].X == drawings[from].X && drawings[to].Equal == drawings[from].Equal && (drawings[to].cells == nil) == (drawings[from].cells == nil) {
			to++
		}
		group := drawings[from:to]
		low, high := math.Inf(1), math.Inf(-1)
		for _, d := range group {
			if !d.empty() {
				low, high = min(low, d.x.low), max(high, d.x.high)
			}
		}
		for i, d := range group {
			d.onlyTicks = i < len(group)-1
			if low < high {
				d.x.low, d.x.high = low, high
			}
		}
		from = to
	}
}

// align gives all panels the same left end, and each the room that it needs on
// the right: for the last tick label, or for a map's colour bar.
func align(drawings []*drawing) {
	right := vg.Length(10)
	for _, d := range drawings {
		if d.cells != nil {
			right = max(right, d.cells.barRoom())
		}
	}
	for _, d := range drawings {
		d.box = draw.Crop(d.box, 0, -right, 0, -4)
		d.prepare()
	}
	// Axes of equal scale change their ends with the room, and the room with
	// the width of their tick labels: twice is enough.
	left := vg.Length(0)
	for range 2 {
		left = 0
		for _, d := range drawings {
			left = max(left, d.plot.DataCanvas(d.box).Min.X-d.box.Min.X)
		}
		for _, d := range drawings {
			data := d.plot.DataCanvas(d.box)
			data.Min.X = d.box.Min.X + left
			d.equalize(data)
			d.prepare()
		}
	}
	for _, d := range drawings {
		d.box = draw.Crop(d.box, left-(d.plot.DataCanvas(d.box).Min.X-d.box.Min.X), 0, 0, 0)
	}
}

// header is what stands above a panel: its title and its legend.
type header struct {
	d      *drawing
	title  []string
	rows   [][]entry
	top    vg.Length
	height vg.Length
}

// entry is one item of a legend.
type entry struct {
	name  string
	curve *curve // nil: of a map
	hatch bool
	wide  vg.Length
}

const sampleWide = vg.Length(24)

func newHeader(d *drawing, wide vg.Length) header {
	h := header{d: d}
	if d.Title != "" {
		h.title = wrap(panelWords, clean(d.Title), wide)
	}
	var entries []entry
	for _, c := range d.curves {
		if name := clean(c.line.Name); name != "" {
			entries = append(entries, entry{name: name, curve: c})
		}
	}
	if d.cells != nil && clean(d.cells.Below) != "" {
		entries = append(entries, entry{name: clean(d.cells.Below), hatch: true})
	}
	if d.cells != nil && d.cells.undefined() {
		entries = append(entries, entry{name: "blank: undefined"})
	}
	used := vg.Length(0)
	for _, e := range entries {
		e.wide = legendWords.Width(e.name) + 14
		if e.curve != nil || e.hatch {
			e.wide += sampleWide + 4
		}
		if len(h.rows) == 0 || used+e.wide > wide-50 {
			h.rows, used = append(h.rows, nil), 0
		}
		h.rows[len(h.rows)-1] = append(h.rows[len(h.rows)-1], e)
		used += e.wide
	}
	h.height = lineStep * vg.Length(len(h.title)+len(h.rows))
	if h.height > 0 {
		h.height += 3
	}
	return h
}

// draw writes the header; the legend begins where the diagram does.
func (h header) draw(data draw.Canvas) {
	y := h.top
	for _, row := range h.title {
		y -= lineStep
		data.FillText(panelWords, vg.Point{X: margin, Y: y + 2}, row)
	}
	for _, row := range h.rows {
		y -= lineStep
		x := data.Min.X
		for _, e := range row {
			words := x
			if e.curve != nil || e.hatch {
				e.sample(data, vg.Point{X: x, Y: y + 5})
				words += sampleWide + 4
			}
			data.FillText(legendWords, vg.Point{X: words, Y: y + 2}, e.name)
			x += e.wide
		}
	}
}

// sample draws a piece of the line as it looks in the diagram.
func (e entry) sample(c draw.Canvas, at vg.Point) {
	if e.hatch {
		for x := vg.Length(0); x+6 <= sampleWide; x += 6 {
			c.StrokeLine2(hatchStroke, at.X+x, at.Y-3, at.X+x+6, at.Y+3)
		}
		c.StrokeLine2(draw.LineStyle{Color: ink, Width: 2}, at.X, at.Y-3, at.X+sampleWide, at.Y-3)
		return
	}
	l := e.curve.line
	if len(l.Low) > 0 {
		shade := e.curve.pen.colour
		shade.A = 0x38
		fill(c, shade, vg.Rectangle{Min: vg.Point{X: at.X, Y: at.Y - 3}, Max: vg.Point{X: at.X + sampleWide, Y: at.Y + 3}})
	}
	if !l.Points || l.Joined {
		c.StrokeLine2(e.curve.pen.stroke(), at.X, at.Y, at.X+sampleWide, at.Y)
	}
	if l.Points {
		c.DrawGlyphNoClip(e.curve.pen.glyph(), vg.Point{X: at.X + sampleWide/2, Y: at.Y})
	}
}

// wrap breaks words into rows of a width.
func wrap(style text.Style, words string, wide vg.Length) []string {
	var rows []string
	row := ""
	for _, word := range strings.Fields(words) {
		if row != "" && style.Width(row+" "+word) > wide {
			rows, row = append(rows, row), word
			continue
		}
		row = strings.TrimSpace(row + " " + word)
	}
	return append(rows, row)
}

// clean takes out what cannot be printed, nor stand in XML, and writes raised
// digits that the font has not as it can.
func clean(s string) string {
	s = strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return ' '
	}, strings.ToValidUTF8(s, "\ufffd"))
	return raised.ReplaceAllStringFunc(s, func(power string) string {
		if !strings.ContainsAny(power, "⁻⁰⁹") {
			return power
		}
		if digits, ok := strings.CutPrefix(power, "10"); ok {
			return "1e" + level.Replace(digits)
		}
		return "^" + level.Replace(power)
	})
}

var (
	raised = regexp.MustCompile(`(\b10)?[⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+`)
	level  = strings.NewReplacer("⁻", "−", "⁰", "0", "¹", "1", "²", "2", "³", "3", "⁴", "4", "⁵", "5", "⁶", "6", "⁷", "7", "⁸", "8", "⁹", "9")
)
