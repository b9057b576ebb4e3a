package canvas

import (
	"encoding/binary"
	"math"
	"testing"
)

// FuzzPlot draws whatever it is given and holds the plot to its region: no panic,
// nothing outside, nothing that would not be a row of the grid, and the same again
// when the memory is reused.
func FuzzPlot(f *testing.F) {
	nan, inf := math.NaN(), math.Inf(1)
	f.Add(80, 24, 0.0, 10.0, -1.0, 1.0, false, "target", []byte{})
	f.Add(10, 3, 10.0, 0.0, 1.0, -1.0, true, "日本語\x1b[2J", floats(0, 1, 2, nan, 3, inf, 4, -inf, 5, 1e308, -1e308))
	f.Add(1, 200, nan, inf, 1e308, -1e308, true, "", floats(1e-320, 0))
	f.Add(200, 1, 1.0, 1.0, 0.0, 5e-324, false, "a", floats(1, 1, 1))
	f.Add(40, 10, 1e15, 1e15+1, -1e-300, 1e-300, true, "mm", floats(1e15, 0, 1e15, 1))
	f.Fuzz(func(t *testing.T, w, h int, x0, x1, y0, y1 float64, equal bool, text string, data []byte) {
		w, h = between(w, -1, 250), between(h, -1, 100)
		values := make([]float64, len(data)/8)
		for i := range values {
			values[i] = math.Float64frombits(binary.LittleEndian.Uint64(data[8*i:]))
		}
		p := Plot{X: Axis{Lo: x0, Hi: x1, Unit: text}, Y: Axis{Lo: y0, Hi: y1, Unit: text}, Equal: equal,
			Legend: []Key{{Name: text}, {Name: "measured", Style: Dashed}, {Name: text, Style: Dotted}}}
		draw := func() *Grid {
			g := NewGrid(w+2, h+2)
			guard := Cell{'#', Bad}
			g.Whole().Fill(guard)
			g.Whole().Sub(1, 1, w, h).Fill(Cell{})
			p.Begin(g.Whole().Sub(1, 1, w, h))
			p.DrawSeries(Key{Style: Dotted}, nil, values)
			p.DrawSeries(Key{}, values[len(values)/2:], values)
			p.DrawPoints(Key{}, values, values)
			at := func(i int) float64 {
				if i < len(values) {
					return values[i]
				}
				return x0
			}
			p.Line(Key{}, at(0), at(1), at(2), at(3))
			p.Ellipse(Key{}, at(0), at(1), at(2), at(3), at(4))
			p.Limit(Limit, at(1), text)
			p.Cursor(Cursor, at(0), text)
			p.Note(int(between(at(0), -9, 300)), 1, Plain, text)
			p.End()
			checkRows(t, g)
			for y := range g.h {
				for x := range g.w {
					if (x < 1 || y < 1 || x > w || y > h) && g.At(x, y) != guard {
						t.Fatalf("cell %d, %d outside became %v", x, y, g.At(x, y))
					}
				}
			}
			return g
		}
		if first, again := draw().String(), draw().String(); first != again {
			t.Fatalf("drawn twice:\n%s\n%s", first, again)
		}
	})
}

func floats(vs ...float64) []byte {
	var out []byte
	for _, v := range vs {
		out = binary.LittleEndian.AppendUint64(out, math.Float64bits(v))
	}
	return out
}

// FuzzText writes any text at any place and reads back rows that fit.
func FuzzText(f *testing.F) {
	f.Add(0, 10, "delay")
	f.Add(-3, 5, "日本語\x1b\u202e\xff")
	f.Fuzz(func(t *testing.T, x, w int, s string) {
		g := NewGrid(between(w, 0, 100), 2)
		r := g.Whole()
		n := r.Text(x, 0, Plain, s)
		if x >= 0 && n > max(0, g.w-x) {
			t.Fatalf("%d columns of %d", n, g.w-x)
		}
		r.TextRight(x, 1, Plain, s)
		r.Sub(x, 1, w, 1).Frame(s)
		checkRows(t, g)
	})
}
