package figure

import (
	"image/color"

	stdfont "golang.org/x/image/font"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// The style of every picture. Lengths are in points (1/72 inch), sizes of a
// figure in millimetres.

const (
	defaultWidth = 170.0 // mm, the text width of an A4 page
	panelHeight  = 58.0  // mm, of a panel with curves
	squareHeight = 105.0 // mm, of a map or a panel of equal axes
	leastSize    = 40.0  // mm
	mostSize     = 2000.0

	margin   = vg.Length(4)
	lineStep = vg.Length(11) // from one line of text to the next
	lineThin = vg.Length(0.5)
	lineBold = vg.Length(1.1)

	// dpi of a PNG: sharp on paper and when enlarged on a screen.
	dpi = 192
)

var (
	ink   = color.NRGBA{0x1a, 0x1a, 0x1a, 0xff}
	quiet = color.NRGBA{0x55, 0x55, 0x55, 0xff} // axes and ticks
	faint = color.NRGBA{0xdd, 0xdd, 0xdd, 0xff} // the grid
	alert = color.NRGBA{0xa5, 0x00, 0x26, 0xff} // limits
	paper = color.NRGBA{0xff, 0xff, 0xff, 0xff}
)

// pen is how one line of a panel is told from the others: by colour, by dash
// and by marker.
type pen struct {
	colour color.NRGBA
	width  vg.Length
	dashes []vg.Length
	marker draw.GlyphDrawer
}

// pens are taken in order. The colours are those of Okabe and Ito (2008), which
// the colour-blind tell apart, the lightest of them made darker to stand out
// from white paper.
var pens = []pen{
	{color.NRGBA{0x1a, 0x1a, 0x1a, 0xff}, lineBold, nil, draw.CircleGlyph{}},
	{color.NRGBA{0x00, 0x72, 0xb2, 0xff}, lineBold, []vg.Length{4.5, 2}, draw.SquareGlyph{}},
	{color.NRGBA{0xd5, 0x5e, 0x00, 0xff}, lineBold, []vg.Length{6, 1.5, 1.2, 1.5}, draw.TriangleGlyph{}},
	{color.NRGBA{0x00, 0x86, 0x62, 0xff}, 1.4, []vg.Length{1.4, 1.6}, draw.CrossGlyph{}},
	{color.NRGBA{0x9c, 0x3f, 0x74, 0xff}, lineBold, []vg.Length{9, 3}, draw.RingGlyph{}},
	{color.NRGBA{0x6b, 0x5f, 0x00, 0xff}, lineBold, []vg.Length{6, 1.5, 1.2, 1.5, 1.2, 1.5}, draw.PyramidGlyph{}},
	{color.NRGBA{0x00, 0x5b, 0x8a, 0xff}, 1.6, []vg.Length{2.5, 2.5}, draw.PlusGlyph{}},
}

// penOf gives the pen of line i; beyond the last the lines grow wider.
func penOf(i int) pen {
	p := pens[i%len(pens)]
	p.width *= 1 + 0.6*vg.Length(i/len(pens))
	return p
}

func (p pen) stroke() draw.LineStyle {
	return draw.LineStyle{Color: p.colour, Width: p.width, Dashes: p.dashes}
}

func (p pen) glyph() draw.GlyphStyle {
	return draw.GlyphStyle{Color: p.colour, Radius: 2.5, Shape: p.marker}
}

// limitStroke draws limits.
var limitStroke = draw.LineStyle{Color: alert, Width: 0.9, Dashes: []vg.Length{2.5, 1.5}}

// stroke draws a level.
func (l Level) stroke() draw.LineStyle {
	s := limitStroke
	if l.Reference {
		s.Color, s.Dashes = quiet, []vg.Length{1.2, 1.2}
	}
	return s
}

// words names a level.
func (l Level) words() text.Style {
	s := limitWords
	if l.Reference {
		s.Color = quiet
	}
	return s
}

// bands are the colours of a map from low to high, light enough for lines and
// words on top; their lightness falls evenly, so that grey keeps their order.
// Interpolated from the sequential scheme YlGnBu of Brewer (2003).
var bands = []color.NRGBA{
	{0xff, 0xff, 0xe5, 0xff}, {0xf0, 0xf9, 0xc8, 0xff}, {0xdb, 0xf1, 0xbc, 0xff}, {0xbf, 0xe6, 0xb9, 0xff},
	{0x9f, 0xd8, 0xbb, 0xff}, {0x80, 0xca, 0xbf, 0xff}, {0x62, 0xb8, 0xc3, 0xff}, {0x4a, 0xa2, 0xc0, 0xff},
	{0x3e, 0x8a, 0xb6, 0xff}, {0x38, 0x70, 0xa8, 0xff},
}

// words gives the text style of a size in points.
func words(size float64, c color.Color, bold bool) text.Style {
	f := font.Font{Typeface: "Liberation", Variant: "Sans", Size: vg.Points(size)}
	if bold {
		f.Weight = stdfont.WeightBold
	}
	return text.Style{Color: c, Font: f, Handler: text.Plain{Fonts: font.DefaultCache}}
}

var (
	titleWords  = words(10, ink, true)
	panelWords  = words(8.5, ink, true)
	axisWords   = words(8.5, ink, false)
	tickWords   = words(7.5, quiet, false)
	legendWords = words(8, ink, false)
	limitWords  = words(7.5, alert, true)
	markWords   = words(8, ink, true)
	contWords   = words(7.5, ink, true)
)
