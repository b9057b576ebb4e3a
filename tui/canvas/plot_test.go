package canvas

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

var threeKeys = []Key{{"target", Target, Solid}, {"command", Command, Dotted}, {"measured", Measured, Dashed}}

// decay is a dying oscillation in mm over 10 s, with amplitude and phase.
func decay(amplitude, phase float64) (xs, ys []float64) {
	for i := range 2001 {
		t := float64(i) / 200
		xs = append(xs, t+3.3)
		ys = append(ys, amplitude*math.Exp(-t/6)*math.Sin(4*t+phase))
	}
	return xs, ys
}

func drawThree(p *Plot, r Region) {
	p.Begin(r)
	for i, k := range p.Legend {
		xs, ys := decay(12+float64(i), 0.3*float64(i))
		p.DrawSeries(k, xs, ys)
	}
	p.Limit(Limit, 13, "stroke 13 mm")
	p.Limit(Limit, -13, "stroke -13 mm")
	p.Cursor(Cursor, 9.1, "9.1 s")
	p.End()
}

// From a large screen down to three rows: the legend leaves first, then the
// labels, then the axes.
func TestPlotAtManySizes(t *testing.T) {
	var out strings.Builder
	p := Plot{X: Axis{Lo: 3.3, Hi: 13.3, Unit: "s"}, Y: Axis{Lo: -15, Hi: 15, Unit: "mm"}, Legend: threeKeys}
	for _, size := range [][2]int{{100, 24}, {60, 14}, {40, 10}, {24, 7}, {20, 6}, {16, 5}, {12, 4}, {10, 3}, {4, 1}, {1, 1}, {0, 0}} {
		g := NewGrid(size[0], size[1])
		drawThree(&p, g.Whole())
		checkRows(t, g)
		fmt.Fprintf(&out, "%d × %d\n%s\n", size[0], size[1], g)
	}
	golden(t, "sizes", strings.TrimSuffix(out.String(), "\n"))
}

func TestLegendsInLittleRoom(t *testing.T) {
	var out strings.Builder
	p := Plot{X: Axis{Hi: 1}, Y: Axis{Hi: 1}, Legend: append(threeKeys[:3:3], Key{"error", Error, Solid}, Key{"追跡", Accent, Dotted})}
	for _, w := range []int{90, 70, 60, 52, 46, 40, 34, 28, 24} {
		g := NewGrid(w, 7)
		p.Begin(g.Whole())
		p.End()
		checkRows(t, g)
		head, _, _ := strings.Cut(g.String(), "\n")
		fmt.Fprintf(&out, "%d\t%s\n", w, head)
	}
	golden(t, "legends", strings.TrimSuffix(out.String(), "\n"))
}

func TestAxesOfManyRanges(t *testing.T) {
	var out strings.Builder
	milli := func(v float64) string { return fmt.Sprintf("%g", math.Round(1e6*v)/1e3) }
	for _, c := range []struct {
		name string
		x, y Axis
	}{
		{"zero inside", Axis{Lo: 0, Hi: 30, Unit: "s"}, Axis{Lo: -0.02, Hi: 0.02, Unit: "mm", Label: milli}},
		{"zero at the bottom", Axis{Lo: 0.1, Hi: 20, Unit: "Hz"}, Axis{Lo: 0, Hi: 1.2}},
		{"pointing the other way", Axis{Lo: 10, Hi: 0, Unit: "ms"}, Axis{Lo: 5, Hi: -5, Unit: "kN"}},
		{"large", Axis{Lo: 1e9, Hi: 1.5e9, Unit: "tick"}, Axis{Lo: -3e7, Hi: 3e7, Unit: "N/m"}},
		{"nothing to divide", Axis{Lo: 5, Hi: 5, Unit: "s"}, Axis{Lo: math.NaN(), Hi: math.Inf(1), Unit: "mm"}},
	} {
		g := NewGrid(48, 9)
		p := Plot{X: c.x, Y: c.y}
		p.Begin(g.Whole())
		p.End()
		fmt.Fprintf(&out, "%s\n%s\n", c.name, g)
	}
	golden(t, "axes", strings.TrimSuffix(out.String(), "\n"))
}

func TestSynchronizationSubspace(t *testing.T) {
	var out strings.Builder
	for _, size := range [][2]int{{44, 22}, {30, 12}, {60, 12}, {20, 20}, {12, 5}} {
		g := NewGrid(size[0], size[1])
		in := g.Whole().Frame("target, measured")
		p := Plot{Equal: true, X: Axis{Lo: -10, Hi: 10, Unit: "mm"}, Y: Axis{Lo: -10, Hi: 10, Unit: "mm"}}
		p.Begin(in)
		p.Line(Key{Ink: Dim, Style: Dotted}, -10, -10, 10, 10)
		p.Ellipse(Key{Ink: Measured}, 0, 0, 11, 2.5, 0.7)
		p.End()
		fmt.Fprintf(&out, "%d × %d\n%s\n", size[0], size[1], g)
	}
	golden(t, "subspace", strings.TrimSuffix(out.String(), "\n"))
}

// With Equal, 45° in the data is 45° in dots, at any size.
func TestEqualAspect(t *testing.T) {
	for w := 1; w < 90; w++ {
		for _, h := range []int{1, 2, 3, 5, 8, 13, 30, 60} {
			g := NewGrid(w, h)
			p := Plot{Equal: true, X: Axis{Lo: -0.013, Hi: 0.02, Unit: "m"}, Y: Axis{Lo: 0.015, Hi: -0.011, Unit: "m"}}
			p.Begin(g.Whole())
			x0, x1, y0, y1 := p.Bounds()
			perX, perY := (x1-x0)/float64(p.dots.w-1), (y0-y1)/float64(p.dots.h-1)
			// Each comes of half a dozen rounded operations.
			if math.Abs(perX/perY-1) > 1e-12 {
				t.Fatalf("%d × %d: a dot is %g wide and %g high", w, h, perX, perY)
			}
			// What was asked for is still there; the bounds may have been rounded.
			if x0 > -0.013+1e-15 || x1 < 0.02-1e-15 || y1 > -0.011+1e-15 || y0 < 0.015-1e-15 {
				t.Fatalf("%d × %d: %v to %v and %v to %v", w, h, x0, x1, y0, y1)
			}
		}
	}
}

// Every dot of an ellipse is within a dot's diagonal of the curve, all round the
// curve has dots, and the box around them is the closed form.
func TestEllipseAgainstItsEquation(t *testing.T) {
	for _, c := range []struct{ cx, cy, a, b, tilt float64 }{
		{0, 0, 8, 3, 0}, {0, 0, 8, 3, math.Pi / 4}, {1, -1, 6, 6, 0.3}, {0, 1, 7, 1, -1.2}, {-2, 0, 5, 2, math.Pi / 2}, {0, 0, 9, 0, 0.6},
	} {
		g := NewGrid(120, 60)
		p := Plot{Equal: true, X: Axis{Lo: -10, Hi: 10}, Y: Axis{Lo: -10, Hi: 10}}
		p.Begin(g.Whole())
		p.Ellipse(Key{}, c.cx, c.cy, c.a, c.b, c.tilt)
		// Without End, so that the zero lines do not count.
		got := lit(dotsOnly(&p))
		sin, cos := math.Sincos(c.tilt)
		var curve [][2]float64
		for i := range 20000 {
			s, co := math.Sincos(2 * math.Pi * float64(i) / 20000)
			curve = append(curve, [2]float64{
				p.x.at(c.cx + c.a*co*cos - c.b*s*sin), p.y.at(c.cy + c.a*co*sin + c.b*s*cos)})
		}
		for d := range got {
			best := math.Inf(1)
			for _, q := range curve {
				best = min(best, math.Hypot(q[0]-float64(d[0]), q[1]-float64(d[1])))
			}
			// ½ by rounding ends of chords, ½ by the chord's own dots, and a fifth for
			// the chord itself, along one direction.
			if best > 1.2 {
				t.Errorf("%+v: dot %v is %.2f dots off", c, d, best)
			}
		}
		for i := 0; i < len(curve); i += 7 {
			x, y := nearest(curve[i][0]), nearest(curve[i][1])
			found := false
			for dx := -1; dx <= 1; dx++ {
				for dy := -1; dy <= 1; dy++ {
					_, ok := got[[2]int{x + dx, y + dy}]
					found = found || ok
				}
			}
			if !found {
				t.Fatalf("%+v: no dot near %d, %d", c, x, y)
			}
		}
		left, right := math.MaxInt, math.MinInt
		for d := range got {
			left, right = min(left, d[0]), max(right, d[0])
		}
		half := math.Sqrt(c.a*c.a*cos*cos + c.b*c.b*sin*sin)
		if math.Abs(float64(left)-p.x.at(c.cx-half)) > 1 || math.Abs(float64(right)-p.x.at(c.cx+half)) > 1 {
			t.Errorf("%+v: from %d to %d, want %.1f to %.1f", c, left, right, p.x.at(c.cx-half), p.x.at(c.cx+half))
		}
	}
}

// dotsOnly writes the dots of p alone on a grid of their own.
func dotsOnly(p *Plot) Region {
	g := NewGrid(p.area.w, p.area.h)
	for i, b := range p.dots.bits {
		if b != 0 {
			g.cells[i] = Cell{brailleBlank + rune(b), p.dots.inks[i]}
		}
	}
	return g.Whole()
}

func TestLimitLinesAndCursors(t *testing.T) {
	g := NewGrid(40, 9)
	p := Plot{X: Axis{Lo: 0, Hi: 10, Unit: "s"}, Y: Axis{Lo: -15, Hi: 15, Unit: "mm"}}
	p.Begin(g.Whole())
	if !p.Limit(Limit, 12, "stroke") || !p.Limit(Warn, 11.5, "near") || !p.Cursor(Cursor, 3, "3 s") || !p.Cursor(Cursor, 9.8, "9.8 s") {
		t.Error("what is on the axis is not drawn")
	}
	for _, v := range []float64{15.1, -99, math.NaN(), math.Inf(1), math.Inf(-1)} {
		if p.Limit(Limit, v, "beyond") || p.Cursor(Cursor, v, "beyond") && v != 15.1 {
			t.Errorf("%v is beyond the axis and drawn", v)
		}
	}
	p.End()
	golden(t, "limits", g.String())
}

func TestNotesDoNotCoverEachOther(t *testing.T) {
	g := NewGrid(40, 9)
	p := Plot{X: Axis{Hi: 1}, Y: Axis{Hi: 1}}
	p.Begin(g.Whole())
	w, h := p.Area().Size()
	for _, c := range []struct {
		x, y int
		text string
		want bool
	}{
		{0, 0, "first", true}, {3, 0, "over it", false}, {5, 0, "touching", false}, {6, 0, "beside", true},
		{0, 1, "below", true}, {w - 3, 2, "abcd", false}, {w - 4, 2, "abcd", true}, {-1, 3, "a", false}, {math.MaxInt, 3, "a", false}, {0, math.MinInt, "a", false}, {0, h, "a", false},
		{0, 3, strings.Repeat("long ", 9), false},
	} {
		if got := p.Note(c.x, c.y, Plain, c.text); got != c.want {
			t.Errorf("%q at %d, %d: %v, want %v", c.text, c.x, c.y, got, c.want)
		}
	}
}

// Sliding a window of time along keeps the step of its ticks.
func TestTicksOfASlidingWindowStay(t *testing.T) {
	for w := 16; w < 100; w += 3 {
		p := Plot{Y: Axis{Hi: 1}}
		var first step
		for i := range 300 {
			p.X = Axis{Lo: 0.05 * float64(i), Hi: 0.05*float64(i) + 10, Label: func(v float64) string { return fmt.Sprintf("%5.1f", v) }}
			p.Begin(NewGrid(w, 10).Whole())
			if i == 0 {
				first = p.x.step
			}
			if p.x.step != first || len(p.x.ticks) < 2 {
				t.Fatalf("width %d, window from %g: step %v, then %v; %d ticks", w, p.X.Lo, first, p.x.step, len(p.x.ticks))
			}
		}
	}
}

// A tick's label stands in the row of the value: the dot of a point at a tick's
// value lies in the row that has the tick.
func TestLabelsStandWhereTheirValuesAre(t *testing.T) {
	for _, h := range []int{6, 9, 14, 25} {
		g := NewGrid(50, h)
		p := Plot{X: Axis{Lo: 0, Hi: 10, Unit: "s"}, Y: Axis{Lo: -7, Hi: 12, Unit: "mm"}}
		p.Begin(g.Whole())
		for _, v := range p.y.ticks {
			p.DrawPoints(Key{Ink: Good}, []float64{5}, []float64{v})
		}
		p.End()
		for y, row := range strings.Split(g.String(), "\n") {
			inked := false
			for x := range 50 {
				inked = inked || g.At(x, y).Ink == Good
			}
			if tick := strings.Contains(row, "┤"); tick != inked {
				t.Errorf("%d rows, row %d: tick %v, point %v", h, y, tick, inked)
			}
		}
	}
}

func TestPlotWithoutBegin(t *testing.T) {
	var p Plot
	p.DrawSeries(Key{}, nil, []float64{1, 2})
	p.Ellipse(Key{}, 0, 0, 1, 1, 0)
	p.Limit(Limit, 0, "a")
	p.Cursor(Cursor, 0, "a")
	p.End()
	p.Begin(Region{})
	p.DrawSeries(Key{}, nil, []float64{1, 2})
	p.End()
}

func TestPlotReplacesWhatStoodThere(t *testing.T) {
	p := Plot{X: Axis{Hi: 10, Unit: "s"}, Y: Axis{Lo: -15, Hi: 15, Unit: "mm"}, Legend: threeKeys}
	clean, dirty := NewGrid(60, 14), NewGrid(60, 14)
	dirty.Whole().Fill(Cell{'#', Bad})
	drawThree(&p, clean.Whole())
	drawThree(&p, dirty.Whole())
	if clean.String() != dirty.String() {
		t.Errorf("on a used grid:\n%s\non a new one:\n%s", dirty, clean)
	}
}
