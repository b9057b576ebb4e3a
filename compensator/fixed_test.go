package compensator

import (
	"math"
	"math/cmplx"
	"testing"
)

// response drives a compensator with a sine of f Hz and fits gain and phase
// of the command against the target, by least squares over whole periods once
// the history is full. With e^(jωt) for the sine, and equal spacing over
// whole periods, the fit is the projection 2/N·Σ u·e^(−jωt).
func response(c Compensator, tick float64, period, lead int) complex128 {
	c.Start(0, 0)
	w := 2 * math.Pi / float64(period)
	n := 4 * period
	var sum complex128
	for k := range lead + n {
		theta := w * float64(k%period)
		in := Input{X: math.Cos(theta), V: -math.Sin(theta) * w / tick, A: -math.Cos(theta) * w * w / (tick * tick)}
		u := c.Command(in)
		if k >= lead {
			sum += complex(u, 0) * cmplx.Exp(complex(0, -theta))
		}
	}
	return sum * complex(2/float64(n), 0)
}

func binomial(n, k int) float64 {
	v := 1.0
	for i := range k {
		v = v * float64(n-i) / float64(i+1)
	}
	return v
}

func TestPolynomialWeights(t *testing.T) {
	// Horiuchi et al. 1999 for n = 1 to 3; n = 0 and 4 by the binomials.
	for order, want := range [][]float64{{1}, {2, -1}, {3, -3, 1}, {4, -6, 4, -1}, {5, -10, 10, -5, 1}} {
		c := build(t, 1e-3, "polynomial", "order", order, "delay", 0.012)
		got := c.Coefficients(nil)
		if len(got) != len(want)+1 || got[len(want)].Name != "delay" || got[len(want)].Value != 0.012 {
			t.Fatalf("order %d: coefficients %v", order, got)
		}
		for i, w := range want {
			if got[i].Value != w {
				t.Errorf("order %d: weight %d is %v, want %v", order, i, got[i].Value, w)
			}
		}
	}
}

func TestPolynomialResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, delay := range []float64{0, 0.0004, 0.001, 0.00203, 0.0083, 0.014, 0.0207, 0.1} {
		for order := 0; order <= maxOrder; order++ {
			c := build(t, tick, "polynomial", "order", order, "delay", delay)
			for _, period := range []int{1000, 200, 40, 9} {
				w := 2 * math.Pi / float64(period) / tick
				var want complex128
				for i := 0; i <= order; i++ {
					d := math.Floor(float64(i) * delay / tick * (1 + 1e-12))
					phi := float64(i)*delay/tick - d
					back := func(ticks float64) complex128 { return cmplx.Exp(complex(0, -w*ticks*tick)) }
					term := complex(1-phi, 0)*back(d) + complex(phi, 0)*back(d+1)
					want += complex(math.Pow(-1, float64(i))*binomial(order+1, i+1), 0) * term
				}
				// 1e-11: weights up to 10 on a cosine that is right to 1e-16,
				// thousands of terms in the projection, and phi to 1e-12.
				if got := response(c, tick, period, 450); cmplx.Abs(got-want) > 1e-11 {
					t.Errorf("order %d, delay %v s, %d ticks a period: response %v, want %v", order, delay, period, got, want)
				}
			}
		}
	}
}

// Behind a pure delay the response is 1 − (1 − e^(−jθ))^(n+1), θ = ωτ.
func TestPolynomialBehindAPureDelay(t *testing.T) {
	const tick, ticks = 1.0 / 1024, 15
	for order := 0; order <= maxOrder; order++ {
		c := build(t, tick, "polynomial", "order", order, "delay", ticks*tick)
		for _, period := range []int{2048, 512, 150, 90, 60, 45} {
			delayed := cmplx.Exp(complex(0, -2*math.Pi/float64(period)*ticks))
			want := 1 - cmplx.Pow(1-delayed, complex(float64(order+1), 0))
			// 1e-12: sums of up to five exact weights times rounded cosines.
			if got := response(c, tick, period, 100) * delayed; cmplx.Abs(got-want) > 1e-12 {
				t.Errorf("order %d at θ = %.3f: %v, want %v", order, 2*math.Pi*ticks/float64(period), got, want)
			}
		}
	}
}

func TestPolynomialPredictsPolynomialsOfItsOrderExactly(t *testing.T) {
	const tick = 1.0 / 1024
	for order := 0; order <= maxOrder; order++ {
		for _, ticks := range []int{1, 7, 40, 300} {
			delay := float64(ticks) * tick
			c := build(t, tick, "polynomial", "order", order, "delay", delay)
			// 0.3 + s − 2s² + 3s³ …, up to the order, s in units of 4 τ.
			at := func(k int) float64 {
				s, x := float64(k)/float64(4*ticks), 0.0
				for i := order; i >= 0; i-- {
					x = x*s + []float64{0.3, 1, -2, 3, -1}[i]
				}
				return x
			}
			for k := range 6 * ticks {
				u := c.Command(Input{X: at(k)})
				// 1e-12: |x| stays below 20, times weights that add up to 31.
				if want := at(k + ticks); k >= order*ticks && math.Abs(u-want) > 1e-12 {
					t.Fatalf("order %d, %d ticks: command %v in tick %d, want %v", order, ticks, u, k, want)
				}
			}
		}
	}
}

func TestPolynomialRemembersTheLongestHistory(t *testing.T) {
	// The largest order and delay, on a straight line for the whole of it.
	c := build(t, 1.0/4096, "polynomial", "order", maxOrder, "delay", maxDelay)
	for k := range 4*2048 + 3 {
		u := c.Command(Input{X: float64(k)})
		if want := float64(k + 2048); k >= 4*2048 && u != want { // whole numbers: exact
			t.Fatalf("tick %d: %v, want %v", k, u, want)
		}
	}
}

func TestInverseResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, delay := range []float64{0, 0.0004, 0.0083, 0.05, maxDelay} {
		c := build(t, tick, "inverse", "delay", delay)
		alpha := 1 + delay/tick
		if got := value(t, c, "alpha"); got != alpha {
			t.Errorf("alpha %v, want %v", got, alpha)
		}
		for _, period := range []int{1000, 200, 40, 3} {
			theta := 2 * math.Pi / float64(period)
			want := complex(alpha, 0) - complex(alpha-1, 0)*cmplx.Exp(complex(0, -theta))
			// 1e-15 a unit of weight, over a projection of thousands of ticks.
			if got := response(c, tick, period, 5); cmplx.Abs(got-want) > 1e-13*(1+alpha) {
				t.Errorf("delay %v s, %d ticks a period: response %v, want %v", delay, period, got, want)
			}
		}
	}
}

func TestNonePassesTheTarget(t *testing.T) {
	c := build(t, 1e-3, "none")
	for _, in := range inputs(100, 1e-3, 0) {
		if u := c.Command(in); u != in.X {
			t.Fatalf("command %v of target %v", u, in.X)
		}
	}
	if got := c.Coefficients(nil); got != nil {
		t.Errorf("coefficients %v of none", got)
	}
}

// The fixed methods depend on their settings and past targets only, so once
// retuned they must be what a new one with those settings and that past is.
func TestFixedMethodsRetuneAsIfSetSoAllAlong(t *testing.T) {
	const tick = 1.0 / 1024
	for _, test := range []struct {
		kind string
		set  []any
	}{
		{"polynomial", []any{"order", 4, "delay", 0.2}},
		{"polynomial", []any{"order", 1, "delay", 0.0003}},
		{"polynomial", []any{"order", 0}},
		{"inverse", []any{"delay", 0.021}},
		{"linear-acceleration", []any{"delay", 0.0213}},
		{"linear-acceleration", []any{"delay", maxDelay}},
		{"taylor", []any{"delay", 0.021}},
		{"model-inverse", []any{"gain", 0.9, "delay", 0.008, "lag", 0.006, "order", 3}},
		{"model-inverse", []any{"order", 1}},
		{"least-squares-polynomial", []any{"order", 1, "points", 25, "delay", 0.003}},
		{"least-squares-polynomial", []any{"order", 5, "points", maxPoints, "delay", 0.1}},
	} {
		retuned, all := build(t, tick, test.kind), build(t, tick, test.kind, test.set...)
		for k, in := range inputs(3000, tick, 0) {
			if k == 1500 {
				if err := retuned.Retune(given(t, test.kind, test.set...)); err != nil {
					t.Fatal(err)
				}
			}
			a, b := retuned.Command(in), all.Command(in)
			if k >= 1500 && a != b {
				t.Fatalf("%s %v: tick %d gives %v, want %v", test.kind, test.set, k, a, b)
			}
		}
	}
}

// A small change of delay moves the next command by no more than the change
// times the steepest slope that the method sees.
func TestRetuneJumpsNoMoreThanTheChange(t *testing.T) {
	const tick, change = 1.0 / 1024, 1e-4
	// The target in motion() has at most a slope of Σ amplitude·ω = 0.325 m/s,
	// an acceleration of Σ amplitude·ω² = 4.1 m/s² and a jerk of 63 m/s³. The
	// command's slope in τ, in units of 0.325 m/s, with τ = 10.1 ms:
	for name, steepness := range map[string]float64{
		"polynomial":    17, // Σ i·|c_i| = 6+8+3 of the weights 4 −6 4 −1
		"delay-seeking": 17,
		"inverse":       1, "adaptive-inverse": 1,
		// v + τa
		"taylor": 1.13, "model-inverse": 1.13,
		// v + 2τ(2/3·a − 1/6·a(t−τ)) + τ²/6 times the jerk
		"linear-acceleration": 1.22,
		// Σ_i |Σ_{l≤i} dw_l/dτ|·dt for weights w of order 2, 40 points and
		// 10.1 ms: 2.903 by steepness in testdata/vectors.py.
		"least-squares-polynomial": 2.91,
	} {
		a, b := build(t, tick, name), build(t, tick, name)
		largest := 0.0
		for k, in := range inputs(3000, tick, 0.01) {
			if k%100 == 99 { // step the delay of b up for one tick, then back
				if err := b.Retune(given(t, name, "delay", startDelay+change)); err != nil {
					t.Fatal(err)
				}
			}
			ua, ub := a.Command(in), b.Command(in)
			jump := math.Abs(ub - ua)
			largest = max(largest, jump)
			if jump > steepness*0.325*change {
				t.Fatalf("%s: jump of %v m in tick %d", name, jump, k)
			}
			if k%100 == 99 {
				if err := b.Retune(given(t, name)); err != nil {
					t.Fatal(err)
				}
			}
		}
		if largest == 0 {
			t.Errorf("%s: the change of delay had no effect", name)
		}
	}
}
