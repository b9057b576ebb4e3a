package plant

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// A tick is a straight line, so that cutting it changes nothing but the error.
// For α < 1 the rule is of second order: eight times finer is sixty-four times
// better, fifty where the first step does not resolve the damper. For α > 1 the
// damper is infinitely quick where its force passes zero, and the rule is
// between first and second order. Even of first order the error is 4/3 of the
// difference that a quarter of the step makes.
func TestMaxwellAgainstAnODESolver(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []struct {
			Alpha, K float64
			Count    int
			F        []float64
		}
	}
	load(t, "testdata/maxwell.json", &vectors)
	if len(vectors.Cases) != 42 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		run := func(cuts int) []float64 {
			var f []float64
			m := element(t, "maxwell", set{"stiffness": c.K, "force": 1, "speed": 1, "exponent": c.Alpha})
			m.Start(0)
			dt, was := 2*math.Pi/float64(c.Count), 0.0
			for k := 1; k <= 2*c.Count; k++ {
				phase := dt * float64(k)
				y := math.Sin(phase) * (1 - math.Exp(-phase))
				for i := 1; i <= cuts; i++ {
					m.Advance(was+(y-was)*float64(i)/float64(cuts), 0, dt/float64(cuts))
				}
				was = y
				if k%(c.Count/20) == 0 {
					f = append(f, m.Advance(y, 0, 0))
				}
			}
			return f
		}
		name := fmt.Sprintf("α = %v, k = %v, %d ticks", c.Alpha, c.K, c.Count)
		runs := map[int][]float64{}
		for _, n := range []int{1, 2, 4, 8, 16, 32} {
			runs[n] = run(n)
		}
		whole := largest(runs[1], c.F)
		if c.Alpha == 1 {
			near(t, name, whole, 0, 1e-9) // what the solver leaves
			continue
		}
		for _, n := range []int{1, 2, 4, 8} {
			off, bound := largest(runs[n], c.F), 1.5*largest(runs[n], runs[4*n])+1e-8
			if !(off <= bound) {
				t.Errorf("%s cut by %d: off by %.2g, bound %.2g", name, n, off, bound)
			}
		}
		better := 32.0
		if c.Alpha > 1 {
			better = 6
		}
		if off := largest(runs[8], c.F); !(off <= whole/better) {
			t.Errorf("%s: off by %.2g, cut by 8 by %.2g", name, whole, off)
		}
	}
}

// Storage k(ωτ)²/(1+(ωτ)²) and loss kωτ/(1+(ωτ)²), τ = c/k. At the ticks of a
// path of straight lines the answer k − k/(1+sτ) is sampled exactly.
func TestMaxwellStorageAndLoss(t *testing.T) {
	const h, k = 1.0 / 2048, 3e7
	for _, c := range []float64{1e4, 4e5, 5e6} {
		tau := c / k
		for _, hz := range []int{1, 7, 60, 700} {
			m := element(t, "maxwell", set{"stiffness": k, "damping": c})
			m.Start(0)
			got := measure(hz, 2048, 8*2048, func(u float64) float64 { return m.Advance(u, 0, h) })
			w := 2 * math.Pi * float64(hz)
			want := k - k*sampled(w, h, 3000, func(s complex128) complex128 { return 1 / (1 + s*complex(tau, 0)) })
			// Aliases beyond ±M leave h/(2π³M²τ), below 3e-9 here.
			if off := cmplx.Abs(got - want); !(off < 1e-8*k) {
				t.Errorf("c = %v at %d Hz: got %v, want %v", c, hz, got, want)
			}
			if hz > 7 {
				continue
			}
			x := w * tau
			tolerance := k * math.Pow(w*h, 2) / 6 // straight lines for a sine
			near(t, fmt.Sprintf("storage, c = %v at %d Hz", c, hz), real(got), k*x*x/(1+x*x), tolerance)
			near(t, fmt.Sprintf("loss, c = %v at %d Hz", c, hz), imag(got), k*x/(1+x*x), tolerance)
		}
	}
}

// Behind a spring that hardly gives, the damper is a viscous one at the mean
// velocity of the tick, less the Δf/k that the spring takes of the way, and as
// much again that the step makes of it.
func TestMaxwellWithAStiffSpringIsViscous(t *testing.T) {
	const dt = 1.0 / 2048
	for _, alpha := range []float64{0.1, 0.3, 0.5, 1, 1.5, 2} {
		m := element(t, "maxwell", set{"stiffness": 1e12, "force": 1e5, "speed": 0.2, "exponent": alpha})
		d := element(t, "viscous", set{"force": 1e5, "speed": 0.2, "exponent": alpha})
		m.Start(0)
		last := 0.0
		for k := range 1000 {
			y, was := 0.03*math.Sin(0.01*float64(k+1)), 0.03*math.Sin(0.01*float64(k))
			got, want := m.Advance(y, 0, dt), d.Advance(y, (y-was)/dt, dt)
			law := d.(*viscous)
			w, slack := (y-was)/dt, 3*math.Abs(got-last)/(1e12*dt)+1e-15
			if !(got >= law.force(w-slack) && got <= law.force(w+slack)) {
				t.Errorf("α = %v at %d: %v N, not the %v N of %v m/s ± %.2g", alpha, k, got, want, w, slack)
			}
			last = got
		}
		if stored, gone := m.Energy(); !(stored < 1e-3*gone) {
			t.Errorf("α = %v: stored %v J, dissipated %v J", alpha, stored, gone)
		}
	}
}

// A stop lets the force go to zero without passing it, however stiff the
// spring and however long the tick, and the motion's turning point does not
// make it swing.
func TestMaxwellDoesNotChatter(t *testing.T) {
	for _, alpha := range []float64{0.1, 0.3, 0.5, 0.9, 1, 1.1, 1.5, 2} {
		for _, k := range []float64{1e3, 1e6, 1e9, 1e12} {
			for _, dt := range []float64{1e-4, 1e-2, 1} {
				m := element(t, "maxwell", set{"stiffness": k, "force": 1e5, "speed": 0.2, "exponent": alpha})
				m.Start(0)
				last := 0.0
				for i := range 5 {
					last = m.Advance(1e-3*float64(i+1), 0, dt)
				}
				for i := range 200 {
					f := m.Advance(5e-3, 0, dt)
					if !(f >= 0 && f <= last) {
						t.Fatalf("α = %v, k = %v, dt = %v: %v N after %v N, %d ticks into the stop", alpha, k, dt, f, last, i)
					}
					last = f
				}
				// Steady motion: the force of the damper alone, from below.
				m.Start(0)
				end := 1e5 * math.Pow(0.1/0.2, alpha)
				for i := range 100 {
					if f := m.Advance(0.1*dt*float64(i+1), 0, dt); !(f <= end*(1+1e-12)) {
						t.Fatalf("α = %v, k = %v, dt = %v: %v N beyond %v N", alpha, k, dt, f, end)
					}
				}
			}
		}
	}
}

func TestMaxwellSuddenMoveIsElastic(t *testing.T) {
	for _, alpha := range []float64{0.3, 1, 2} {
		m := element(t, "maxwell", set{"stiffness": 2e7, "force": 1e5, "speed": 0.2, "exponent": alpha})
		m.Start(0.1)
		near(t, "at rest", m.Advance(0.1, 0, 1), 0, 0)
		near(t, "jump", m.Advance(0.11, 0, 0), 2e5, 1e-9) // rounding of 0.11 − 0.1
		near(t, "stiffness", m.Stiffness(), 2e7, 0)
		stored, gone := m.Energy()
		near(t, "stored", stored, 0.5*2e5*0.01, 1e-9)
		near(t, "dissipated", gone, 0, 1e-9)
	}
}

func TestPowerRoot(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for range 20000 {
		a, b := math.Pow(10, 20*r.Float64()-8), math.Pow(10, 20*r.Float64()-8)
		s, p := math.Pow(10, 20*r.Float64()-8), 1.01+9*r.Float64()
		if r.IntN(4) == 0 {
			p = 2
		}
		x, xp := powerRoot(a, b, p, s)
		// The root is as good as the power is, an ulp or two for each of p.
		if off := (a*x + b*math.Pow(x, p)) / s; !(math.Abs(off-1) < 1e-14*p) || !(math.Abs(xp/math.Pow(x, p)-1) < 1e-14*p) {
			t.Fatalf("%v·x + %v·x^%v = %v: x = %v leaves %v, x^p = %v", a, b, p, s, x, off-1, xp)
		}
	}
	if x, xp := powerRoot(1, 1, 3, 0); x != 0 || xp != 0 {
		t.Errorf("root of zero: %v, %v", x, xp)
	}
}
