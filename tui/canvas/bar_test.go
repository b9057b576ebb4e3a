package canvas

import (
	"math"
	"testing"
)

func TestSparkline(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	many := make([]float64, 80)
	many[33], many[61] = 1, -1
	for _, c := range []struct {
		name   string
		values []float64
		lo, hi float64
		want   string
	}{
		{"eight steps", []float64{0, 1, 2, 3, 4, 5, 6, 7}, 0, 8, "▁▂▃▄▅▆▇█"},
		{"its own range", []float64{2, 3, 4}, 0, 0, "     ▁▅█"},
		{"beyond", []float64{-9, 9, inf, -inf}, 0, 8, "    ▁██▁"},
		{"gaps", []float64{0, nan, 8}, 0, 8, "     ▁ █"},
		{"constant", []float64{3, 3}, 0, 0, "      ▅▅"},
		{"none", nil, 0, 1, ""},
		{"nothing finite", []float64{nan, inf}, 0, 0, "       █"},
		{"one peak and one dip of many", many, -1, 1, "▅▅▅█▅▅▁▅"},
	} {
		g := NewGrid(8, 1)
		g.Whole().Fill(Cell{'#', Plain})
		g.Whole().Sparkline(Plain, c.values, c.lo, c.hi)
		if got := g.String(); got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
}

func TestBar(t *testing.T) {
	for _, c := range []struct {
		name          string
		value, lo, hi float64
		marks         []float64
		want          string
	}{
		{"half", 5, 0, 10, nil, "█████·····"},
		{"eighths", 5.5, 0, 10, nil, "█████▌····"},
		{"none", 0, 0, 10, nil, "··········"},
		{"full", 10, 0, 10, nil, "██████████"},
		{"limit ahead", 5, 0, 10, []float64{8}, "█████···│·"},
		{"limit passed", 9, 0, 10, []float64{8}, "████████│·"},
		{"limit well passed", 10, 0, 10, []float64{8, 10}, "████████││"},
		{"limits off the bar", 5, 0, 10, []float64{-1, 11, math.NaN()}, "█████·····"},
		{"above", 11, 0, 10, nil, "█████████▶"},
		{"below", -1, 0, 10, nil, "◀·········"},
		{"from zero to the right", 6, -10, 10, nil, "·····███··"},
		{"from zero to the left", -6, -10, 10, nil, "··███·····"},
		{"half cells to the left", -5, -10, 10, nil, "··▐██·····"},
		{"far left", -11, -10, 10, nil, "◀████·····"},
		{"range below zero", -4, -10, 0, nil, "······████"},
		{"turned range", 5, 10, 0, nil, "█████·····"},
		{"NaN", math.NaN(), 0, 10, []float64{5}, "·····│····"},
		{"infinite", math.Inf(1), 0, 10, nil, "█████████▶"},
		{"no range", 0.5, math.NaN(), 1, nil, "█████·····"},
	} {
		g := NewGrid(10, 1)
		g.Whole().Bar(Plain, c.value, c.lo, c.hi, c.marks...)
		if got := g.String(); got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
}
