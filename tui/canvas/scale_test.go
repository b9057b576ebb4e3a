package canvas

import (
	"math"
	"math/rand/v2"
	"testing"
)

// A frame of data and the bounds that must hold after it.
type frame struct {
	times  int // how often the same frame comes
	lo, hi float64
	wantLo float64
	wantHi float64
}

func TestScaleBehaviour(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		name   string
		scale  Scale
		frames []frame
	}{
		{"starts on round bounds", Scale{}, []frame{{1, 0.3, 7.2, 0, 8}}},
		{"symmetric starts on 1, 2 or 5", Scale{Symmetric: true}, []frame{{1, -0.3, 3.2, -5, 5}}},
		{"grows at once", Scale{}, []frame{{1, 0, 8, 0, 8}, {1, 0, 8.1, 0, 10}, {1, 0, 90, 0, 100}}},
		{"grows only where data leave", Scale{}, []frame{{1, 0, 8, 0, 8}, {1, 3, 9, 0, 10}}},
		{"symmetric grows both sides", Scale{Symmetric: true}, []frame{{1, 0, 1, -1, 1}, {1, -1.5, 0, -2, 2}}},
		{"stays while data breathe", Scale{}, []frame{{1, 0, 8, 0, 8}, {500, 1, 5, 0, 8}}},
		{"shrinks after 40 small frames, not before", Scale{}, []frame{
			{1, 0, 8, 0, 8}, {39, 0, 1, 0, 8}, {1, 0, 1, 0, 1}}},
		{"one large frame starts the count again", Scale{}, []frame{
			{1, 0, 8, 0, 8}, {39, 0, 1, 0, 8}, {1, 0, 6, 0, 8}, {39, 0, 1, 0, 8}, {1, 0, 1, 0, 1}}},
		{"shrinks to what all the small frames needed", Scale{}, []frame{
			{1, 0, 8, 0, 8}, {10, 0, 2, 0, 8}, {29, 0, 1, 0, 8}, {1, 0, 1, 0, 2}}},
		{"small frames that wander fill together", Scale{}, []frame{
			{1, 0, 8, 0, 8}, {39, 0, 1, 0, 8}, {1, 7, 8, 0, 8}, {39, 7, 8, 0, 8}, {1, 7, 8, 7, 8}}},
		{"share and frames can be set", Scale{Share: 0.2, Frames: 3}, []frame{
			{1, 0, 8, 0, 8}, {9, 0, 2, 0, 8}, {2, 0, 1, 0, 8}, {1, 0, 1, 0, 1}}},
		{"rest sets nothing to wait out", Scale{Symmetric: true}, []frame{
			{50, 0, 0, -1, 1}, {1, 0, 0.003, -0.005, 0.005}}},
		{"a constant is shown, then the motion", Scale{}, []frame{
			{5, 5, 5, 4.5, 5.5}, {1, 5, 6, 5, 6}}},
		{"smallest span", Scale{Symmetric: true, MinSpan: 0.2}, []frame{
			{1, 0, 0, -0.1, 0.1}, {90, 0, 0.001, -0.1, 0.1}}},
		{"smallest span keeps the zero of what is never negative", Scale{MinSpan: 10}, []frame{
			{1, 0, 0.1, 0, 10}, {1, 0, 11, 0, 15}}},
		{"no data, no change", Scale{}, []frame{{1, 0, 8, 0, 8}, {99, nan, nan, 0, 8}}},
		{"one side only", Scale{}, []frame{{1, nan, 8, 7, 9}}},
		{"given the wrong way round", Scale{}, []frame{{1, 8, 0, 0, 8}}},
		{"infinite", Scale{}, []frame{{1, 0, inf, 0, 1e150}, {1, -inf, 0, -1e150, 1e150}}},
		{"before any data", Scale{}, []frame{{1, nan, nan, 0, 1}}},
		{"symmetric before any data", Scale{Symmetric: true}, []frame{{1, nan, nan, -1, 1}}},
	} {
		s := c.scale
		for i, f := range c.frames {
			for range f.times {
				s.Update(f.lo, f.hi)
				if lo, hi := s.Bounds(); lo != f.wantLo || hi != f.wantHi {
					t.Errorf("%s, step %d: %g to %g, want %g to %g", c.name, i, lo, hi, f.wantLo, f.wantHi)
					break
				}
			}
		}
	}
}

func TestScaleReset(t *testing.T) {
	s := Scale{}
	s.Update(0, 8)
	s.Reset()
	if lo, hi := s.Update(0, 0.3); lo != 0 || hi != 0.3 {
		t.Errorf("%v to %v", lo, hi)
	}
}

// Whatever comes, the data are inside, the bounds are fresh multiples of a
// 1-2-5 step, and a range that was just set does not shrink at once.
func TestScaleAlwaysHoldsTheData(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 9))
	for trial := range 2000 {
		s := Scale{Symmetric: trial%2 == 0, Frames: 1}
		size := math.Pow(10, 8*rng.Float64()-6)
		for range 20 {
			a, b := size*rng.NormFloat64(), size*rng.NormFloat64()
			a, b = min(a, b), max(a, b)
			lo, hi := s.Update(a, b)
			if over := slack * (hi - lo); a < lo-over || b > hi+over {
				t.Fatalf("%g to %g does not hold %g to %g", lo, hi, a, b)
			}
		}
		s.Reset()
		a := size * (rng.Float64() - 0.5)
		b := a + size*(0.001+rng.Float64())
		lo, hi := s.Update(a, b)
		if lo2, hi2 := s.Update(a, b); lo2 != lo || hi2 != hi {
			t.Fatalf("%g to %g: %g to %g became %g to %g", a, b, lo, hi, lo2, hi2)
		}
	}
}
