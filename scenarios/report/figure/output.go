package figure

import (
	"bytes"
	"fmt"
	"html"
	"strings"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"
)

// PNG draws the figure in pixels.
func (f Figure) PNG() ([]byte, error) {
	if err := f.check(); err != nil {
		return nil, err
	}
	f = f.sized()
	c := vgimg.NewWith(vgimg.UseWH(vg.Length(f.Width)*mm, vg.Length(f.Height)*mm), vgimg.UseDPI(dpi))
	f.draw(draw.New(c))
	var out bytes.Buffer
	_, err := vgimg.PngCanvas{Canvas: c}.WriteTo(&out)
	return out.Bytes(), err
}

// families are the fonts that a browser may take, the same width first. Every
// text also says how wide it is meant to be.
const families = "'Liberation Sans', Arial, Helvetica, sans-serif"

// SVG draws the figure as one <svg> element, without an XML declaration, so
// that it stands in a page as well as alone. Its title and description say to
// a screen reader what is drawn.
func (f Figure) SVG() ([]byte, error) {
	if err := f.check(); err != nil {
		return nil, err
	}
	f = f.sized()
	wide, high := vg.Length(f.Width)*mm, vg.Length(f.Height)*mm
	c := &measured{Canvas: vgsvg.New(wide, high)}
	f.draw(draw.New(c))
	var drawn bytes.Buffer
	if _, err := c.WriteTo(&drawn); err != nil {
		return nil, err
	}
	return f.dress(drawn.String(), c.widths, wide, high), nil
}

// measured is an SVG canvas that remembers how wide each text is.
type measured struct {
	*vgsvg.Canvas
	widths []vg.Length
}

// FillString draws a text.
func (m *measured) FillString(face font.Face, at vg.Point, text string) {
	m.widths = append(m.widths, face.Width(text))
	m.Canvas.FillString(face, at, text)
}

// dress gives the drawn picture its own head, fonts and widths of texts.
func (f Figure) dress(drawn string, widths []vg.Length, wide, high vg.Length) []byte {
	_, body, _ := strings.Cut(drawn, "<svg ")
	_, body, _ = strings.Cut(body, ">\n")
	body = strings.ReplaceAll(body, "font-family:Liberation Sans;font-variant:normal;font-weight:normal;font-style:normal;", "")
	body = strings.ReplaceAll(body, "font-family:Liberation Sans;font-variant:normal;font-weight:bold;font-style:normal;", "font-weight:bold;")
	body = strings.ReplaceAll(body, "\n\tstyle=", " style=")
	title, about := html.EscapeString(f.name()), html.EscapeString(f.Describe())
	var out bytes.Buffer
	fmt.Fprintf(&out, `<svg xmlns="http://www.w3.org/2000/svg" width="%.5gmm" height="%.5gmm" viewBox="0 0 %.5g %.5g" role="img" aria-label="%s" font-family="%s">`+"\n",
		f.Width, f.Height, wide.Points(), high.Points(), title, families)
	fmt.Fprintf(&out, "<title>%s</title>\n<desc>%s</desc>\n", title, about)
	for i, piece := range strings.Split(body, "<text ") {
		if i > 0 {
			fmt.Fprintf(&out, `<text textLength="%.4g" lengthAdjust="spacingAndGlyphs" `, widths[i-1].Points())
		}
		out.WriteString(piece)
	}
	return out.Bytes()
}
