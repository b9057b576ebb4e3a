package figure

import (
	"bytes"
	"encoding/xml"
	"errors"
	"image/png"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

func render(t *testing.T, f Figure) string {
	t.Helper()
	svg, err := f.SVG()
	if err != nil {
		t.Fatal(err)
	}
	return string(svg)
}

// points are the coordinates of every stroked path, in the order of drawing.
func points(t *testing.T, svg, colour string) [][][2]float64 {
	t.Helper()
	var out [][][2]float64
	for _, m := range regexp.MustCompile(`<path d="([^"]*)" style="[^"]*stroke:`+colour+`[^"]*"`).FindAllStringSubmatch(svg, -1) {
		var path [][2]float64
		for _, p := range regexp.MustCompile(`[ML]([-\d.e]+),([-\d.e]+)`).FindAllStringSubmatch(m[1], -1) {
			x, _ := strconv.ParseFloat(p[1], 64)
			y, _ := strconv.ParseFloat(p[2], 64)
			path = append(path, [2]float64{x, y})
		}
		out = append(out, path)
	}
	return out
}

const blue = "#0072B2"

// second is a line drawn with the blue pen, behind one that is nowhere.
func second(x, y []float64) []Line { return []Line{{}, {X: x, Y: y}} }

func extent2(path [][2]float64) (wide, high float64) {
	low, top := [2]float64{math.Inf(1), math.Inf(1)}, [2]float64{math.Inf(-1), math.Inf(-1)}
	for _, p := range path {
		for k := range 2 {
			low[k], top[k] = math.Min(low[k], p[k]), math.Max(top[k], p[k])
		}
	}
	return top[0] - low[0], top[1] - low[1]
}

// A circle on axes of equal scale is as wide as it is high, to the fifth digit
// that the picture has.
func TestEqualAxes(t *testing.T) {
	var x, y []float64
	for i := range 181 {
		s, c := math.Sincos(2 * math.Pi * float64(i) / 180)
		x, y = append(x, 3*c), append(y, 3*s)
	}
	for _, size := range [][2]float64{{170, 60}, {60, 170}, {100, 100}} {
		f := Figure{Width: size[0], Height: size[1], Panels: []Panel{{Equal: true, Lines: second(x, y)}}}
		paths := points(t, render(t, f), blue)
		if len(paths) != 1 {
			t.Fatalf("%d paths", len(paths))
		}
		if wide, high := extent2(paths[0]); math.Abs(wide-high) > 0.05 || wide < 20 {
			t.Errorf("%v mm: the circle is %v by %v", size, wide, high)
		}
	}
}

// On logarithmic axes decades are equally long, and y = x² rises twice as many
// as it goes along.
func TestLogAxes(t *testing.T) {
	f := Figure{Panels: []Panel{{X: Axis{Log: true}, Y: Axis{Log: true}, Lines: second([]float64{0, 1, 10, 100, -3}, []float64{1, 1, 100, 10000, 1})}}}
	p := points(t, render(t, f), blue)
	if len(p) != 1 || len(p[0]) != 3 {
		t.Fatalf("drawn: %v", p)
	}
	a, b, c := p[0][0], p[0][1], p[0][2]
	for k := range 2 {
		if one, two := b[k]-a[k], c[k]-b[k]; math.Abs(one-two) > 0.05 || one <= 0 {
			t.Errorf("decades of %v and %v", one, two)
		}
	}
}

// NaN and infinity are gaps: the line goes on behind them as another piece.
func TestGaps(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	f := Figure{Panels: []Panel{{Lines: second([]float64{0, 1, 2, 3, 4, 5, 6, 7}, []float64{0, 1, nan, 1, 2, inf, 2, 1})}}}
	var lengths []int
	for _, p := range points(t, render(t, f), blue) {
		lengths = append(lengths, len(p))
	}
	if len(lengths) != 3 || lengths[0] != 2 || lengths[1] != 2 || lengths[2] != 2 {
		t.Errorf("pieces of %v points", lengths)
	}
}

// A limit near the data is a line across the panel; one far off is written at
// the edge and leaves the data their size.
func TestLimits(t *testing.T) {
	high := func(limit float64) (float64, string) {
		svg := render(t, Figure{Panels: []Panel{{Lines: second([]float64{0, 1, 2}, []float64{-1, 1, -1}), Levels: []Level{{Name: "limit", Value: limit}}}}})
		_, h := extent2(points(t, svg, blue)[0])
		return h, svg
	}
	bare, _ := high(math.NaN())
	near, svg := high(1.5)
	if lines := points(t, svg, "#A50026"); len(lines) != 1 || !strings.Contains(svg, ">limit<") {
		t.Errorf("a near limit is drawn %d times", len(lines))
	}
	if near >= bare {
		t.Error("no room was made for the limit")
	}
	far, svg := high(100)
	if lines := points(t, svg, "#A50026"); len(lines) != 0 || !strings.Contains(svg, ">limit ↑<") {
		t.Errorf("a far limit is drawn %d times", len(lines))
	}
	if far < 0.8*bare {
		t.Errorf("the data are %v high, %v without the far limit", far, bare)
	}
	if _, svg := high(-100); !strings.Contains(svg, ">limit ↓<") {
		t.Error("a limit far below is not written")
	}
}

// An SVG is well-formed XML that says what it shows and holds nothing that could
// run, whatever it is given for words.
func TestSVGIsSafe(t *testing.T) {
	evil := `<script>alert("1")</script>&amp;]]>` + "\x00\x1b\xff\u2028"
	f := Figure{Title: evil, Panels: []Panel{{Title: evil, X: Axis{Label: evil, Unit: evil}, Y: Axis{Label: evil},
		Lines: []Line{{Name: evil, X: []float64{0, 1}, Y: []float64{0, 1}}}, Marks: []Mark{{Name: evil, X: 0.5, Y: 0.5}},
		Levels: []Level{{Name: evil, Value: 0.5}, {Name: evil, Value: 1e9}, {Name: evil, Value: 0.2, Vertical: true}}}}}
	svg := render(t, f)
	elements := map[string]int{}
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		if e, ok := token.(xml.StartElement); ok {
			elements[e.Name.Local]++
			for _, a := range e.Attr {
				if strings.HasPrefix(a.Name.Local, "on") || a.Name.Local == "href" {
					t.Errorf("%s has %s", e.Name.Local, a.Name.Local)
				}
			}
		}
	}
	for name := range elements {
		if !strings.Contains(" svg title desc g path text ", " "+name+" ") {
			t.Errorf("an element %s", name)
		}
	}
	if elements["title"] != 1 || elements["desc"] != 1 || !strings.Contains(svg, `role="img" aria-label="`) {
		t.Error("it does not say what it shows")
	}
}

func TestDescription(t *testing.T) {
	f := Figure{Panels: []Panel{{Title: "error", X: Axis{Label: "time", Unit: "s"}, Y: Axis{Label: "error", Unit: "mm"},
		Lines:  []Line{{Name: "measured", X: []float64{0, 30}, Y: []float64{-0.5, math.NaN()}}, {X: []float64{0, 30}, Y: []float64{1, 2}}},
		Levels: []Level{{Name: "accepted", Value: 3}, {Value: -3}, {Name: "mode 1", Value: 2, Vertical: true, Reference: true}},
		Marks:  []Mark{{Name: "here", X: 1, Y: 2}}}}}
	want := "error: error against time, time from 0 to 30 s. measured: from −0.5 to −0.5 mm. line 2: from 1 to 2 mm." +
		" Limit: accepted, at 3 mm. Reference: mode 1, at 2 s. here at 1 s, 2 mm."
	if got := f.Describe(); got != want {
		t.Errorf("%s\nwant %s", got, want)
	}
}

// Numbers of every size, and none, give a picture and no panic.
func TestNoNumbersAreTooOdd(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	odd := [][]float64{nil, {nan, nan}, {inf, -inf}, {0}, {5e-324, 1e-320}, {math.MaxFloat64, -math.MaxFloat64}, {1e99, -1e99}, {1e16, 1e16 + 2}, {1, 1 + 1e-15}, {-1, -2}, {0, 1e-300}, {1e-99, 1e99}}
	for i, x := range odd {
		for _, y := range [][]float64{x, odd[(i+1)%len(odd)], odd[(i+4)%len(odd)]} {
			n := min(len(x), len(y))
			for _, log := range []bool{false, true} {
				p := Panel{X: Axis{Log: log}, Y: Axis{Log: log}, Equal: !log, Lines: []Line{{X: x[:n], Y: y[:n], Low: y[:n], High: x[:n]}, {X: x[:n], Y: y[:n], Points: true}}}
				for _, v := range append(append([]float64{}, x...), y...) {
					p.Levels = append(p.Levels, Level{Name: "l", Value: v}, Level{Name: "l", Value: v, Vertical: true})
					p.Marks = append(p.Marks, Mark{Name: "m", X: v, Y: v})
				}
				svg := render(t, Figure{Panels: []Panel{p}, Width: 60, Height: 50})
				if strings.Contains(svg, "NaN") || strings.Contains(svg, "Inf") {
					t.Fatalf("x %v, y %v, log %v: %s", x, y, log, regexp.MustCompile(".*(NaN|Inf).*").FindString(svg))
				}
			}
		}
	}
	for _, m := range []*Map{
		field(3, func(x, y float64) float64 { return nan }), field(3, func(x, y float64) float64 { return inf }),
		field(3, func(x, y float64) float64 { return 4 }), field(2, func(x, y float64) float64 { return x * 1e99 }),
	} {
		m.Contours = []float64{4, nan, inf}
		render(t, Figure{Panels: []Panel{{Map: m}}})
		render(t, Figure{Panels: []Panel{{Map: m, X: Axis{Log: true}, Y: Axis{Log: true}}}})
	}
}

func TestMistakesAreNamed(t *testing.T) {
	square := field(3, func(x, y float64) float64 { return x })
	broken := func(change func(m *Map)) *Map {
		m := *square
		change(&m)
		return &m
	}
	for want, f := range map[string]Figure{
		"a figure needs a panel":                                {},
		"a figure is 40 to 2000 mm wide and high, not 3":        {Width: 3, Panels: []Panel{{}}},
		`panel 2: line "a" has 1 values of X and 2 of Y`:        {Panels: []Panel{{}, {Lines: []Line{{Name: "a", X: []float64{1}, Y: []float64{1, 2}}}}}},
		`panel 1: line "b" has 1 points and a band of 1 and 0`:  {Panels: []Panel{{Lines: []Line{{Name: "b", X: []float64{1}, Y: []float64{1}, Low: []float64{1}}}}}},
		"panel 1: a map needs two values each way, not 1":       {Panels: []Panel{{Map: broken(func(m *Map) { m.X = m.X[:1] })}}},
		"panel 1: a map's values along an axis must increase":   {Panels: []Panel{{Map: broken(func(m *Map) { m.Y = []float64{0, 0, 1} })}}},
		"panel 1: a map has 2 rows for 3 values of Y":           {Panels: []Panel{{Map: broken(func(m *Map) { m.Z = m.Z[:2] })}}},
		"panel 1: row 0 of a map has 3 cells for 2 values of X": {Panels: []Panel{{Map: broken(func(m *Map) { m.X = m.X[:2] })}}},
	} {
		for _, format := range []string{"svg", "png"} {
			if err := f.Write(io.Discard, format); err == nil || err.Error() != want {
				t.Errorf("%v, want %s", err, want)
			}
		}
	}
	if err := (Figure{}).Write(io.Discard, "gif"); err == nil || !strings.Contains(err.Error(), `"gif" is not known; allowed are png and svg`) {
		t.Error(err)
	}
}

func TestSave(t *testing.T) {
	dir, f := filepath.Join(t.TempDir(), "with spaces"), samples()["constant"]
	if err := os.Mkdir(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	at := func(name string) string { return filepath.Join(dir, name) }
	for _, name := range []string{"a.png", "b.SVG"} {
		if err := Save(at(name), f, false); err != nil {
			t.Fatal(err)
		}
		before, _ := os.ReadFile(at(name))
		err := Save(at(name), samples()["empty"], false)
		if !errors.Is(err, fs.ErrExist) || !strings.Contains(err.Error(), "--force overwrites it") {
			t.Errorf("an existing file: %v", err)
		}
		if after, _ := os.ReadFile(at(name)); !bytes.Equal(before, after) {
			t.Error("an existing file was touched")
		}
		if err := Save(at(name), f, true); err != nil {
			t.Errorf("under force: %v", err)
		}
	}
	picture, err := os.Open(at("a.png"))
	if err != nil {
		t.Fatal(err)
	}
	defer picture.Close()
	if c, err := png.DecodeConfig(picture); err != nil || c.Width != 680 { // 90 mm at 192 dots an inch
		t.Errorf("%+v, %v", c, err)
	}
	if err := Save(at("c.pdf"), f, false); err == nil || !strings.Contains(err.Error(), "ends in .png or .svg") {
		t.Error(err)
	}
	if err := os.Mkdir(at("d.svg"), 0o755); err != nil {
		t.Fatal(err)
	}
	for _, force := range []bool{false, true} {
		if err := Save(at("d.svg"), f, force); err == nil || !strings.Contains(err.Error(), "is a directory") {
			t.Errorf("a directory: %v", err)
		}
	}
	if err := Save(filepath.Join(at("a.png"), "e.svg"), f, false); err == nil {
		t.Error("a file was taken for a directory")
	}
}
