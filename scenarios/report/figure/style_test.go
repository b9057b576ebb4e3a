package figure

import (
	"fmt"
	"image/color"
	"math"
	"testing"

	"gonum.org/v1/plot/vg"
)

// luminance is the relative luminance of WCAG 2.2.
func luminance(c color.NRGBA) float64 {
	f := func(v uint8) float64 {
		x := float64(v) / 255
		if x <= 0.04045 {
			return x / 12.92
		}
		return math.Pow((x+0.055)/1.055, 2.4)
	}
	return 0.2126*f(c.R) + 0.7152*f(c.G) + 0.0722*f(c.B)
}

// contrast is the ratio of WCAG 2.2.
func contrast(a, b color.NRGBA) float64 {
	x, y := luminance(a), luminance(b)
	return (math.Max(x, y) + 0.05) / (math.Min(x, y) + 0.05)
}

// over is a colour that lies over another.
func over(top, below color.NRGBA) color.NRGBA {
	mix := func(a, b uint8) uint8 { return uint8((int(a)*int(top.A) + int(b)*(255-int(top.A))) / 255) }
	return color.NRGBA{mix(top.R, below.R), mix(top.G, below.G), mix(top.B, below.B), 0xff}
}

// Black and white: red of full strength has 21/(0.2126·20+1) against white.
func TestContrastIsThatOfWCAG(t *testing.T) {
	black, white, red := color.NRGBA{0, 0, 0, 255}, color.NRGBA{255, 255, 255, 255}, color.NRGBA{255, 0, 0, 255}
	if got := contrast(black, white); math.Abs(got-21) > 1e-12 {
		t.Errorf("black on white has %v, not 21", got)
	}
	if got, want := contrast(red, white), 1.05/(0.2126+0.05); math.Abs(got-want) > 1e-12 {
		t.Errorf("red on white has %v, not %v", got, want)
	}
}

// WCAG 2.2 asks for 4.5 of words (1.4.3) and for 3 of what a picture is read by
// (1.4.11); words stand on paper or, inside a map, on its veil over any band.
func TestEverythingStandsOut(t *testing.T) {
	veil := paper
	veil.A = 0xd0
	darkest := over(veil, bands[len(bands)-1])
	for name, c := range map[string]color.NRGBA{"ink": ink, "quiet": quiet, "alert": alert} {
		for where, back := range map[string]color.NRGBA{"paper": paper, "the veil over the darkest band": darkest} {
			if got := contrast(c, back); got < 4.5 {
				t.Errorf("%s on %s has a contrast of %.2f", name, where, got)
			}
		}
	}
	for i, p := range pens {
		if got := contrast(p.colour, paper); got < 3 {
			t.Errorf("pen %d has a contrast of %.2f", i, got)
		}
	}
	if got := contrast(ink, bands[len(bands)-1]); got < 3 {
		t.Errorf("a contour on the darkest band has a contrast of %.2f", got)
	}
}

// A grey copy must tell lines apart: no two have the same dashes, nor markers.
func TestPensDifferInGrey(t *testing.T) {
	dashes, markers := map[string]int{}, map[string]int{}
	for i, p := range pens {
		dashes[fmt.Sprint(p.dashes, p.width)]++
		markers[fmt.Sprintf("%T", p.marker)]++
		if again := penOf(i + len(pens)); again.width == p.width {
			t.Errorf("line %d looks like line %d", i+len(pens), i)
		}
	}
	if len(dashes) != len(pens) || len(markers) != len(pens) {
		t.Errorf("%d pens, %d kinds of dashes, %d of markers", len(pens), len(dashes), len(markers))
	}
}

// Bands keep their order in grey: each is darker than the one below it.
func TestBandsDarkenEvenly(t *testing.T) {
	for i := 1; i < len(bands); i++ {
		if luminance(bands[i]) >= luminance(bands[i-1])-0.02 {
			t.Errorf("band %d is not darker than the one below it", i)
		}
	}
}

// Where a figure is a curve of a million points, the picture has no more than it
// can show, and all that stands out.
func TestThinKeepsExtremes(t *testing.T) {
	path := make([]vg.Point, 1_000_000)
	for i := range path {
		path[i] = vg.Point{X: vg.Length(i) * 400 / vg.Length(len(path)), Y: vg.Length(100 * math.Sin(float64(i)/50))}
	}
	path[123456].Y, path[654321].Y = 170, -180
	out := thin(path)
	if len(out) > 4*1334 { // 400 points of width in columns of 0.3
		t.Errorf("%d points are left", len(out))
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, p := range out {
		low, high = math.Min(low, float64(p.Y)), math.Max(high, float64(p.Y))
	}
	if low != -180 || high != 170 || out[0] != path[0] || out[len(out)-1] != path[len(path)-1] {
		t.Errorf("from %v to %v, beginning at %v, ending at %v", low, high, out[0], out[len(out)-1])
	}
}

// Of a trail that goes to and fro no point is further from what is drawn than
// finest.
func TestThinTrailStaysClose(t *testing.T) {
	path := make([]vg.Point, 5000)
	for i := range path {
		s, c := math.Sincos(float64(i) / 100)
		path[i] = vg.Point{X: vg.Length(80 * c), Y: vg.Length(60 * s * (1 + 0.1*c))}
	}
	out := thin(path)
	if len(out) > len(path)/3 {
		t.Errorf("%d of %d points are left", len(out), len(path))
	}
	next := 0
	for i := 1; i < len(out); i++ {
		from := next
		for path[next] != out[i] {
			next++
		}
		if !straight(path[from : next+1]) {
			t.Fatalf("the chord from %d to %d strays", from, next)
		}
	}
}
