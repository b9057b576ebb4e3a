package compensator

import (
	"math"
	"math/rand/v2"
	"testing"
)

// list gives the sums in one order, to compare them.
func (s *sums) list() [10]float64 {
	return [10]float64{s.yy, s.yv, s.ya, s.vv, s.va, s.aa, s.uy, s.uv, s.ua, s.y}
}

// direct adds up the last n rows afresh.
func direct(rows []row, n int) *sums {
	s := &sums{}
	for i := max(0, len(rows)-n); i < len(rows); i++ {
		s.add(&rows[i])
	}
	return s
}

func randomRow(rng *rand.Rand) row {
	return row{rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()}
}

// differ reports the largest difference of two sets of sums, relative to the
// sum of squares that bounds the products.
func differ(a, b *sums) float64 {
	scale := b.yy + b.vv + b.aa
	worst := 0.0
	x, y := a.list(), b.list()
	for i := range x {
		worst = max(worst, math.Abs(x[i]-y[i])/scale)
	}
	return worst
}

func TestRunningSumsEqualSumsMadeAfresh(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, size := range []int{8, 100, 128} {
		var w window
		w.resize(size)
		var rows []row
		for k := range 3000 * size {
			r := randomRow(rng)
			rows = append(rows, r)
			w.push(r)
			if len(rows) > 4*size {
				rows = rows[2*size:]
			}
			// 1e-12: one window of additions and removals at 1e-16 each,
			// however many windows have passed.
			if k < 3*size || k%(7*size+1) == 0 {
				if d := differ(&w.run, direct(rows, size)); d > 1e-12 {
					t.Fatalf("size %d: sums off by %v in tick %d", size, d, k)
				}
			}
		}
	}
}

func TestAHugeRowLeavesNoTraceAfterTwoWindows(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	const size = 50
	var w window
	w.resize(size)
	var rows []row
	for k := range 5*size + 7 {
		r := randomRow(rng)
		if k == 2*size+3 { // its square is 1e16, whose rounding is of size 1
			r.y, r.u = 1e8, 1e8
		}
		rows = append(rows, r)
		w.push(r)
		if d := differ(&w.run, direct(rows, size)); k >= 4*size+3 && d > 1e-13 {
			t.Fatalf("sums off by %v, %d ticks after the huge row", d, k-2*size-3)
		}
	}
}

func TestResizeKeepsTheNewestRows(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	var w window
	w.resize(40)
	var rows []row
	held := 0 // rows the window should hold
	for _, size := range []int{40, 13, 100, 64, 8, 41} {
		w.resize(size)
		held = min(held, size)
		for range 55 {
			if d := differ(&w.run, direct(rows, held)); held > 0 && d > 1e-13 {
				t.Fatalf("size %d with %d rows: sums off by %v", size, held, d)
			}
			r := randomRow(rng)
			rows = append(rows, r)
			w.push(r)
			held = min(held+1, size)
			if w.count != held {
				t.Fatalf("size %d: %d rows, want %d", size, w.count, held)
			}
		}
	}
}

func TestLowpassIsAButterworthOfFourthOrder(t *testing.T) {
	// |H|² = 1/(1 + (tan(πf·dt)/tan(πf_c·dt))⁸), the Butterworth magnitude
	// under the bilinear transform with prewarped cutoff.
	for _, test := range []struct{ cutoff, rate float64 }{{20, 256}, {20, 2048}, {5, 1000}, {100, 256}, {500, 4096}} {
		f := newLowpass(test.cutoff, 1/test.rate)
		var s lowpassState
		n := int(40 / test.cutoff * test.rate) // e^(−0.383·2π·40) is nothing
		impulse := make([]float64, n)
		for k := range impulse {
			x := 0.0
			if k == 0 {
				x = 1
			}
			impulse[k] = f.step(&s, x)
		}
		for _, hz := range []float64{0, 0.3 * test.cutoff, test.cutoff, 0.4 * test.rate} {
			re, im := 0.0, 0.0
			for k, h := range impulse {
				sin, cos := math.Sincos(2 * math.Pi * hz / test.rate * float64(k))
				re, im = re+h*cos, im-h*sin
			}
			ratio := math.Tan(math.Pi*hz/test.rate) / math.Tan(math.Pi*test.cutoff/test.rate)
			want := 1 / math.Sqrt(1+math.Pow(ratio, 8))
			// 1e-9: the poles are within 2π·cutoff/rate = 0.03 of 1, so that
			// rounding of their coefficients counts a million times.
			if got := math.Hypot(re, im); math.Abs(got-want) > 1e-9 {
				t.Errorf("cutoff %v Hz at %v Hz: |H(%v Hz)| = %v, want %v", test.cutoff, test.rate, hz, got, want)
			}
		}
		rest := f.at(0.7)
		for k := range n {
			if y := f.step(&rest, 0.7); math.Abs(y-0.7) > 1e-9 { // as above
				t.Fatalf("cutoff %v Hz at %v Hz: %v in tick %d at rest at 0.7", test.cutoff, test.rate, y, k)
			}
		}
	}
}
