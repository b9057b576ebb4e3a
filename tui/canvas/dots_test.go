package canvas

import (
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"
)

// Every pattern lit dot by dot is the one that Unicode names after these dots.
func TestBrailleBitsAreThoseOfUnicode(t *testing.T) {
	table, err := os.ReadFile("testdata/braille.txt")
	if err != nil {
		t.Fatal(err)
	}
	place := map[rune][2]int{'1': {0, 0}, '2': {0, 1}, '3': {0, 2}, '4': {1, 0}, '5': {1, 1}, '6': {1, 2}, '7': {0, 3}, '8': {1, 3}}
	n := 0
	for line := range strings.Lines(string(table)) {
		var code rune
		var named string
		if _, err := fmt.Sscanf(line, "%X %s", &code, &named); err != nil {
			t.Fatal(err)
		}
		d := dots{}
		d.resize(1, 1)
		for _, dot := range strings.Trim(named, "-") {
			d.set(place[dot][0], place[dot][1], Plain)
		}
		if got := brailleBlank + rune(d.bits[0]); got != code {
			t.Errorf("dots %s: %U, want %U", named, got, code)
		}
		n++
	}
	if n != 256 {
		t.Errorf("%d patterns of 256", n)
	}
}

// A point of the data lands on the dot where it belongs: values are dot columns
// and, upwards, dot rows.
func TestEveryDotCanBeHit(t *testing.T) {
	for x := range 6 {
		for y := range 8 {
			g, p := bare(3, 2)
			p.DrawPoints(Key{Ink: Good}, []float64{float64(x)}, []float64{float64(y)})
			p.End()
			want := map[[2]int]Ink{{x, 7 - y}: Good}
			if got := lit(g.Whole()); !maps.Equal(got, want) {
				t.Errorf("point %d, %d lights %v", x, y, got)
			}
		}
	}
}

// A dot stands for half a dot around it, also at the edges; what lies farther out
// is not pushed onto the edge.
func TestTheEdgeIsHalfADotWide(t *testing.T) {
	for _, c := range []struct {
		x, y float64
		want int
	}{{-0.4, 2, 1}, {5.4, 2, 1}, {3, -0.4, 1}, {3, 7.4, 1}, {-0.6, 2, 0}, {5.6, 2, 0}, {3, -0.6, 0}, {3, 7.6, 0}} {
		g, p := bare(3, 2)
		p.DrawPoints(Key{}, []float64{c.x}, []float64{c.y})
		p.End()
		if got := len(lit(g.Whole())); got != c.want {
			t.Errorf("%v, %v lights %d dots, want %d", c.x, c.y, got, c.want)
		}
	}
}

// A dot of a line is never more than half a dot from the line, measured along
// the lesser direction, and no step along the greater one is left out.
func TestLinesAreTheNearestDots(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for range 500 {
		x0, y0, x1, y1 := rng.IntN(14), rng.IntN(12), rng.IntN(14), rng.IntN(12)
		g, p := bare(7, 3)
		p.Line(Key{}, float64(x0), float64(11-y0), float64(x1), float64(11-y1))
		p.End()
		got := lit(g.Whole())
		dx, dy := float64(x1-x0), float64(y1-y0)
		if want := 1 + int(max(math.Abs(dx), math.Abs(dy))); len(got) != want {
			t.Fatalf("%d,%d to %d,%d: %d dots, want %d", x0, y0, x1, y1, len(got), want)
		}
		for d := range got {
			off := math.Abs(dx*float64(d[1]-y0) - dy*float64(d[0]-x0))
			if off > max(math.Abs(dx), math.Abs(dy))/2 {
				t.Errorf("%d,%d to %d,%d: dot %v is off the line", x0, y0, x1, y1, d)
			}
		}
	}
}

// A line that leaves the picture shows the dots of the same line on a picture
// large enough to hold it. Where it is cut it starts from a rounded dot, which can
// move it by one dot across: so each dot must have one of the other in reach.
func TestClippedLinesRunWhereTheWholeOnesDo(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 2))
	const w, h, margin = 16, 12, 200
	near := func(set dots, x, y int) bool {
		for dx := -1; dx <= 1; dx++ {
			for dy := -1; dy <= 1; dy++ {
				if x+dx >= 0 && y+dy >= 0 && x+dx < set.w && y+dy < set.h &&
					set.bits[(y+dy)/4*set.cols+(x+dx)/2]&brailleBit[(y+dy)&3][(x+dx)&1] != 0 {
					return true
				}
			}
		}
		return false
	}
	for range 2000 {
		var small, large dots
		small.resize(w/2, h/4)
		large.resize((w+2*margin)/2, (h+2*margin)/4)
		at := func(n int) float64 { return float64(rng.IntN(n+2*margin) - margin) }
		x0, y0, x1, y1 := at(w), at(h), at(w), at(h)
		small.line(x0, y0, x1, y1, Solid, Plain)
		large.line(x0+margin, y0+margin, x1+margin, y1+margin, Solid, Plain)
		lit := func(d dots, x, y int) bool { return d.bits[y/4*d.cols+x/2]&brailleBit[y&3][x&1] != 0 }
		for y := range h {
			for x := range w {
				if lit(small, x, y) && !near(large, x+margin, y+margin) {
					t.Fatalf("%v,%v to %v,%v: dot %d,%d is not on the whole line", x0, y0, x1, y1, x, y)
				}
				inner := x > 0 && y > 0 && x < w-1 && y < h-1
				if inner && lit(large, x+margin, y+margin) && !near(small, x, y) {
					t.Fatalf("%v,%v to %v,%v: dot %d,%d is missing", x0, y0, x1, y1, x, y)
				}
			}
		}
	}
}

// Thousands of points a column light the same dots as all lines between them
// drawn one by one, so a single peak among them is seen.
func TestLongSeriesLoseNothing(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 4))
	for trial := range 60 {
		n := 1 + rng.IntN(3000)
		xs, ys := make([]float64, n), make([]float64, n)
		y := 6.0
		for i := range n {
			xs[i] = 16*float64(i)/float64(n) - 1 // one dot beyond either edge
			y += rng.NormFloat64() / 4
			ys[i] = y
			if rng.IntN(500) == 0 {
				ys[i] += 10 * rng.NormFloat64()
			}
			if rng.IntN(300) == 0 {
				ys[i] = math.NaN()
			}
			if trial%3 == 0 {
				xs[i] = 14 * rng.Float64() // no order at all
			}
		}
		g1, p1 := bare(7, 3)
		p1.DrawSeries(Key{}, xs, ys)
		p1.End()
		g2, p2 := bare(7, 3)
		for i := range n {
			from := max(i-1, 0)
			if ys[from] != ys[from] {
				from = i
			}
			if ys[i] == ys[i] {
				p2.dots.line(p2.x.at(xs[from]), p2.y.at(ys[from]), p2.x.at(xs[i]), p2.y.at(ys[i]), Solid, Plain)
			}
		}
		p2.End()
		if g1.String() != g2.String() {
			t.Fatalf("trial %d, %d points:\n%s\nall lines:\n%s", trial, n, g1, g2)
		}
	}
}

func TestOneSpikeAmongThousandsIsSeen(t *testing.T) {
	ys := make([]float64, 100000)
	xs := make([]float64, len(ys))
	for i := range xs {
		xs[i] = 13 * float64(i) / float64(len(xs)-1)
	}
	ys[70000] = 11
	g, p := bare(7, 3)
	p.DrawSeries(Key{}, xs, ys)
	p.End()
	// 70000/99999·13 = 9.1: column 9, from the bottom row 11 up to row 0.
	got := lit(g.Whole())
	for row := range 12 {
		if _, ok := got[[2]int{9, row}]; !ok {
			t.Errorf("no dot in row %d", row)
		}
	}
	if len(got) != 14+11 {
		t.Errorf("%d dots, want a base of 14 and a spike of 11 above it", len(got))
	}
}

func TestLineStyles(t *testing.T) {
	for style, want := range map[LineStyle]string{Solid: "##############", Dotted: "#..#..#..#..#.", Dashed: "#####...#####."} {
		g, p := bare(7, 3)
		p.Line(Key{Style: style}, 0, 5, 13, 5)
		p.End()
		got := []byte("..............")
		for d := range lit(g.Whole()) {
			got[d[0]] = '#'
		}
		if string(got) != want {
			t.Errorf("style %d: %s, want %s", style, got, want)
		}
	}
	// A dense and nearly level series keeps its pattern: 2 of 3 columns are dark.
	var xs, ys []float64
	for i := range 1400 {
		xs, ys = append(xs, float64(i)/100), append(ys, 5.5+0.4*math.Sin(float64(i)))
	}
	g, p := bare(7, 3)
	p.DrawSeries(Key{Style: Dotted}, xs, ys)
	p.End()
	for d := range lit(g.Whole()) {
		if d[0]%3 != 0 {
			t.Errorf("dot %v of a dotted level series", d)
		}
	}
}

func TestGapsAndInk(t *testing.T) {
	g, p := bare(7, 1)
	p.DrawSeries(Key{Ink: Target}, nil, []float64{0, 0, 0, math.NaN(), 0, math.Inf(1), 0, 0})
	p.DrawSeries(Key{Ink: Measured}, []float64{2, 2}, []float64{3, 3})
	p.End()
	if got, want := g.String(), "⣀⡁⡀⣀"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	for x, want := range []Ink{Target, Measured, Target} {
		if got := g.At(x, 0).Ink; got != want {
			t.Errorf("cell %d has the ink %v, want %v", x, got, want)
		}
	}
}

func TestEmptyAndUnequalSeries(t *testing.T) {
	g, p := bare(3, 1)
	p.DrawSeries(Key{}, nil, nil)
	p.DrawSeries(Key{}, []float64{}, []float64{1})
	p.DrawPoints(Key{}, nil, []float64{1})
	p.DrawSeries(Key{}, []float64{0, 1}, []float64{0, 0, 3, 3})
	p.End()
	if got := g.String(); got != "⣀" {
		t.Errorf("%q", got)
	}
}
