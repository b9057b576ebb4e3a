package canvas

import (
	"math"
	"testing"
)

// fourSeries are 4 × 2000 points, as a window of a run gives them.
func fourSeries() (xs []float64, ys [4][]float64) {
	for i := range 2000 {
		t := float64(i) / 200
		xs = append(xs, t)
		for j := range ys {
			ys[j] = append(ys[j], float64(10+j)*math.Sin(9*t-0.2*float64(j))*math.Sin(0.7*t))
		}
	}
	return xs, ys
}

func redraw(p *Plot, g *Grid, xs []float64, ys [4][]float64) {
	g.Clear()
	p.Begin(g.Whole())
	for j, k := range p.Legend {
		p.DrawSeries(k, xs, ys[j])
	}
	p.Limit(Limit, 12, "stroke 12 mm")
	p.Cursor(Cursor, 4, "4 s")
	p.End()
}

func fullPlot() *Plot {
	label := func(v float64) string { return decimalLabel(v, step{1, 0}) }
	return &Plot{X: Axis{Hi: 10, Unit: "s", Label: label}, Y: Axis{Lo: -15, Hi: 15, Unit: "mm", Label: label},
		Legend: append(threeKeys[:3:3], Key{"error", Error, Solid})}
}

// A redraw allocates the labels' text and nothing else.
func TestRedrawAllocatesOnlyLabels(t *testing.T) {
	g, p := NewGrid(200, 60), fullPlot()
	xs, ys := fourSeries()
	p.X.Label = func(float64) string { return "0" }
	p.Y.Label = p.X.Label
	if n := testing.AllocsPerRun(20, func() { redraw(p, g, xs, ys) }); n != 0 {
		t.Errorf("%v allocations with labels that need none", n)
	}
}

func BenchmarkPlot200x60(b *testing.B) {
	g, p := NewGrid(200, 60), fullPlot()
	xs, ys := fourSeries()
	b.ReportAllocs()
	for b.Loop() {
		redraw(p, g, xs, ys)
	}
}

func BenchmarkSubspace40x20(b *testing.B) {
	g := NewGrid(40, 20)
	_, ys := fourSeries()
	p := &Plot{Equal: true, X: Axis{Lo: -12, Hi: 12}, Y: Axis{Lo: -12, Hi: 12}}
	b.ReportAllocs()
	for b.Loop() {
		p.Begin(g.Whole())
		p.DrawPoints(Key{}, ys[0], ys[1])
		p.Line(Key{}, -12, -12, 12, 12)
		p.Ellipse(Key{}, 0, 0, 10, 3, 0.7)
		p.End()
	}
}
