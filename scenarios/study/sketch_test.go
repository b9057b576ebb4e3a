package study

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// Quantiles are those of the sorted values to half a bin, 1/8192, whatever the
// sign and size; ends are exact; infinities count.
func TestSketch(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, n := range []int{1, 2, 10, 5000} {
		s := newSketch()
		values := make([]float64, n)
		for i := range values {
			values[i] = rng.NormFloat64() * math.Exp(8*rng.NormFloat64())
			if i%10 == 9 {
				values[i] = math.Inf(1)
			}
			s.add(values[i])
		}
		slices.Sort(values)
		for _, q := range []float64{0, 0.01, 0.25, 0.5, 0.77, 0.95, 1} {
			want := values[max(0, int(math.Ceil(q*float64(n)))-1)]
			got := s.quantile(q)
			if got != want && !(math.Abs(got-want) <= math.Abs(want)/8192) {
				t.Errorf("n %d: quantile %v is %v, want %v", n, q, got, want)
			}
		}
		if s.least != values[0] || s.most != values[n-1] {
			t.Errorf("n %d: ends %v, %v", n, s.least, s.most)
		}
	}
	if !math.IsNaN(newSketch().quantile(0.5)) {
		t.Error("there is a median of nothing")
	}
}

// Memory hangs on the range of the values, not on their number: an octave has
// 4096 bins.
func TestSketchStaysSmall(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	s := newSketch()
	for range 500_000 {
		s.add(1 + 3*rng.Float64())
	}
	if len(s.counts) > 2*4096+1 {
		t.Errorf("%d bins for two octaves", len(s.counts))
	}
}
