package canvas

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

func TestText(t *testing.T) {
	for _, c := range []struct {
		name string
		x    int
		s    string
		want string
		n    int
	}{
		{"fits", 0, "delay", "delay", 5},
		{"fits to the last column", 3, "delay", "   delay", 5},
		{"too long", 4, "delay", "    del…", 4},
		{"one column left", 7, "delay", "       …", 1},
		{"beyond the right edge", 8, "delay", "", 0},
		{"cut at the left", -2, "delay", "lay", 5},
		{"cut at both", -2, "energy margin", "ergy ma…", 10},
		{"all left of it", -9, "delay", "", 5},
		{"wide fits", 0, "日本語", "日本語", 6},
		{"wide too long", 3, "日本語", "   日本…", 5},
		{"wide cut between halves", 2, "日本語日", "  日本 …", 6},
		{"wide cut at the left", -1, "日本語", " 本語", 6},
		{"combining marks are dropped", 0, "e\u0301x", "ex", 2},
		{"controls", 0, "a\x1b[2J\nb", "a�[2J b", 7},
		{"not UTF-8", 0, "a\xffb", "a�b", 3},
		{"format characters", 0, "a\u202eb\u200bc", "abc", 3},
		{"Greek, signs", 0, "τ ≤ 8 ms", "τ ≤ 8 ms", 8},
		{"nothing", 0, "", "", 0},
	} {
		g := NewGrid(8, 1)
		n := g.Whole().Text(c.x, 0, Plain, c.s)
		if got := g.String(); got != c.want || n != c.n {
			t.Errorf("%s: %q, %d columns; want %q, %d", c.name, got, n, c.want, c.n)
		}
		checkRows(t, g)
	}
}

func TestTextRight(t *testing.T) {
	for _, c := range []struct {
		x    int
		s    string
		want string
	}{
		{8, "12.5", "    12.5"}, {4, "12.5", "12.5"}, {3, "12.5", "12…"}, {1, "12.5", "…"},
		{0, "12.5", ""}, {-4, "12.5", ""}, {10, "12.5", "      1…"}, {99, "12.5", ""},
	} {
		g := NewGrid(8, 1)
		g.Whole().TextRight(c.x, 0, Plain, c.s)
		if got := g.String(); got != c.want {
			t.Errorf("before column %d: %q, want %q", c.x, got, c.want)
		}
	}
}

func TestSubIsTheOverlap(t *testing.T) {
	g := NewGrid(10, 6)
	r := g.Whole().Sub(1, 1, 8, 4)
	for _, c := range []struct{ in, want [4]int }{
		{[4]int{0, 0, 8, 4}, [4]int{1, 1, 8, 4}},
		{[4]int{2, 1, 3, 2}, [4]int{3, 2, 3, 2}},
		{[4]int{-2, -1, 5, 3}, [4]int{1, 1, 3, 2}},
		{[4]int{6, 3, 9, 9}, [4]int{7, 4, 2, 1}},
		{[4]int{9, 0, 1, 1}, [4]int{9, 1, 0, 1}},
		{[4]int{0, 0, -1, -1}, [4]int{1, 1, 0, 0}},
		{[4]int{math.MinInt, math.MinInt, math.MaxInt, math.MaxInt}, [4]int{1, 1, 0, 0}},
		{[4]int{math.MaxInt, 0, math.MaxInt, 1}, [4]int{9, 1, 0, 1}},
	} {
		s := r.Sub(c.in[0], c.in[1], c.in[2], c.in[3])
		if got := [4]int{s.x, s.y, s.w, s.h}; got != c.want {
			t.Errorf("Sub%v: %v, want %v", c.in, got, c.want)
		}
	}
}

func TestFrames(t *testing.T) {
	var out strings.Builder
	for _, size := range [][2]int{{24, 3}, {12, 2}, {6, 2}, {4, 2}, {1, 2}, {9, 1}} {
		for _, selected := range []bool{false, true} {
			g := NewGrid(size[0], size[1])
			frame := g.Whole().Frame
			if selected {
				frame = g.Whole().FrameSelected
			}
			in := frame("Energy margin")
			in.Fill(Cell{'x', Plain})
			fmt.Fprintf(&out, "%v\n%s\n", size, g)
		}
	}
	golden(t, "frames", strings.TrimSuffix(out.String(), "\n"))
}

func TestTintKeepsRunes(t *testing.T) {
	g := NewGrid(5, 2)
	r := g.Whole().Sub(1, 0, 3, 2)
	r.Text(0, 1, Plain, "abc")
	r.Tint(-1, 1, 3, Selected)
	r.Tint(0, 9, 3, Selected)
	r.Tint(0, -1, 3, Selected)
	for x, want := range []Cell{{}, {'a', Selected}, {'b', Selected}, {'c', Plain}, {}} {
		if got := g.At(x, 1); got != want {
			t.Errorf("column %d: %v, want %v", x, got, want)
		}
		if got := g.At(x, 0); got != (Cell{}) {
			t.Errorf("column %d of the row above: %v", x, got)
		}
	}
}

// Every call on a region, with arguments of any kind, leaves the cells around it
// as they were.
func TestNothingIsDrawnOutsideARegion(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 1))
	wild := []float64{0, 1, -1, 1e308, -1e308, math.NaN(), math.Inf(1), math.Inf(-1), 1e-320, 0.3}
	number := func() float64 {
		if rng.IntN(2) == 0 {
			return wild[rng.IntN(len(wild))]
		}
		return rng.NormFloat64()
	}
	texts := []string{"", "delay", "日本語の題", "a\x1b[31m", "energy margin over the last five periods", "\xff\xfe"}
	p := Plot{}
	for trial := range 3000 {
		g := NewGrid(rng.IntN(60), rng.IntN(25))
		guard := Cell{'#', Bad}
		g.Whole().Fill(guard)
		r := g.Whole().Sub(rng.IntN(20)-3, rng.IntN(10)-3, rng.IntN(50), rng.IntN(20))
		r.Fill(Cell{})
		text := texts[rng.IntN(len(texts))]
		x, y := rng.IntN(80)-20, rng.IntN(40)-10
		switch trial % 8 {
		case 0:
			r.Text(x, y, Plain, text)
		case 1:
			r.TextRight(x, y, Plain, text)
		case 2:
			r.Frame(text).Text(x, y, Plain, text)
		case 3:
			r.Bar(Plain, number(), number(), number(), number(), number())
		case 4:
			r.Sparkline(Plain, []float64{number(), number(), number()}, number(), number())
		default:
			p.X, p.Y = Axis{Lo: number(), Hi: number(), Unit: text}, Axis{Lo: number(), Hi: number(), Unit: "mm"}
			p.Equal, p.Legend = rng.IntN(2) == 0, []Key{{Name: text}, {Name: "measured", Style: Dashed}}
			p.Begin(r)
			p.DrawSeries(Key{}, []float64{number(), number(), number()}, []float64{number(), number(), number()})
			p.Ellipse(Key{}, number(), number(), number(), number(), number())
			p.Limit(Limit, number(), text)
			p.Cursor(Cursor, number(), text)
			p.Note(x, y, Plain, text)
			p.End()
		}
		checkRows(t, g)
		for y := range g.h {
			for x := range g.w {
				inside := x >= r.x && x < r.x+r.w && y >= r.y && y < r.y+r.h
				if !inside && g.At(x, y) != guard {
					t.Fatalf("trial %d: cell %d, %d outside %+v became %v\n%s", trial, x, y, r, g.At(x, y), g)
				}
			}
		}
	}
}
