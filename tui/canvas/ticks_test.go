package canvas

import (
	"fmt"
	"math"
	"slices"
	"testing"
)

func TestTicksAreRoundAndExact(t *testing.T) {
	for _, c := range []struct {
		lo, hi, apart float64 // apart as a share of the span
		want          []float64
	}{
		{0, 1, 0.2, []float64{0, 0.2, 0.4, 0.6, 0.8, 1}},
		{0, 1, 0.05, []float64{0, 0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.35, 0.4, 0.45, 0.5, 0.55, 0.6, 0.65, 0.7, 0.75, 0.8, 0.85, 0.9, 0.95, 1}},
		{-15, 15, 0.3, []float64{-10, 0, 10}},
		{-15, 15, 0.45, []float64{-10, 0, 10}}, // 20 would leave one tick
		{0.2, 4.7, 0.45, []float64{2, 4}},      // 5 would leave none
		{3.3, 13.3, 0.25, []float64{5, 10}},    //
		{-0.3, 0.3, 0.3, []float64{-0.2, 0, 0.2}},
		{1e-9, 3e-9, 0.3, []float64{1e-9, 2e-9, 3e-9}},
		{10, 0, 0.3, []float64{0, 5, 10}}, // pointing downwards
		{1e6, 1e6 + 3, 0.3, []float64{1e6, 1e6 + 1, 1e6 + 2, 1e6 + 3}},
	} {
		a := axis{lo: c.lo, hi: c.hi}
		a.mark(&Axis{}, c.apart, true)
		// The decimal literals are the nearest floats; so must the ticks be.
		if !slices.Equal(a.ticks, c.want) {
			t.Errorf("%v to %v: %v, want %v", c.lo, c.hi, a.ticks, c.want)
		}
	}
}

func TestTickLabels(t *testing.T) {
	for _, c := range []struct {
		lo, hi float64
		want   []string
	}{
		{0, 1, []string{"0.0", "0.5", "1.0"}},
		{-20, 20, []string{"-20", "0", "20"}},
		{0, 0.002, []string{"0.000", "0.001", "0.002"}},
		{0, 2e-9, []string{"0", "1e-09", "2e-09"}},
		{0, 2e9, []string{"0", "1e+09", "2e+09"}},
	} {
		a := axis{lo: c.lo, hi: c.hi}
		a.mark(&Axis{}, 0.4, true)
		if !slices.Equal(a.labels, c.want) {
			t.Errorf("%v to %v: %q, want %q", c.lo, c.hi, a.labels, c.want)
		}
	}
	a := axis{lo: 0, hi: 0.02}
	a.mark(&Axis{Label: func(v float64) string { return fmt.Sprintf("%g", 1e3*v) }}, 0.4, true)
	if want := []string{"0", "10", "20"}; !slices.Equal(a.labels, want) {
		t.Errorf("the caller's labels: %q, want %q", a.labels, want)
	}
}

func TestStepsAre125(t *testing.T) {
	for _, c := range []struct {
		v    float64
		want step
	}{
		{1, step{1, 0}}, {1.01, step{2, 0}}, {2, step{2, 0}}, {2.1, step{5, 0}}, {5, step{5, 0}},
		{5.1, step{1, 1}}, {1000, step{1, 3}}, {0.001, step{1, -3}}, {0.3, step{5, -1}}, {7e22, step{1, 23}},
		{0, step{1, -300}}, {-3, step{1, -300}}, {math.NaN(), step{1, -300}}, {math.Inf(1), step{1, 300}},
	} {
		if got := stepAbove(c.v); got != c.want {
			t.Errorf("above %g: %v, want %v", c.v, got, c.want)
		}
	}
	for s := (step{1, -3}); s != (step{1, 3}); s = s.next() {
		if got := s.next().previous(); got != s {
			t.Errorf("next of %v and back is %v", s, got)
		}
	}
}

func TestProperRange(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range [][4]float64{
		{0, 10, 0, 10},
		{10, 0, 10, 0},
		{0, 0, -1, 1},
		{5, 5, 4.5, 5.5},
		{-5, -5, -5.5, -4.5},
		{nan, 1, 0, 1}, {1, nan, 0, 1},
		{-inf, inf, -hugeValue, hugeValue},
		{0, 1e-320, -1, 1},
		{1, 1 + 1e-12, 0.9, 1.1},
	} {
		// Midpoint and half-width each round once: two parts in 10¹⁶.
		if lo, hi := properRange(c[0], c[1]); math.Abs(lo-c[2]) > 1e-11*math.Abs(c[2]) || math.Abs(hi-c[3]) > 1e-11*math.Abs(c[3]) {
			t.Errorf("%g to %g: %g to %g, want %g to %g", c[0], c[1], lo, hi, c[2], c[3])
		}
	}
}

func TestExtentCountsFiniteValuesOnly(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	if lo, hi := Extent([]float64{nan, 3, inf}, nil, []float64{-2, -inf}); lo != -2 || hi != 3 {
		t.Errorf("%v to %v", lo, hi)
	}
	if lo, hi := Extent([]float64{nan, inf}); lo == lo || hi == hi {
		t.Errorf("of nothing: %v to %v", lo, hi)
	}
}
