package plant

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

var holds = map[string]Hold{"ramp": Ramp, "step": Step}

func TestPerfectActuatorReturnsTheCommandBitForBit(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for name, hold := range holds {
		a := actuator(t, "lag-delay", Timing{1.0 / 2048, hold}, set{})
		s := NewSpecimen()
		a.Start(0.1, s)
		for k := range 1000 {
			u := r.NormFloat64() * math.Pow(10, float64(k%40-30))
			if k%7 == 0 {
				u = math.Copysign(0, -1)
			}
			if y, _ := a.Advance(u, s); !same(y, u) {
				t.Fatalf("%s, tick %d: %v became %v", name, k, u, y)
			}
		}
	}
}

func TestDelayOfWholeTicksShiftsBitForBit(t *testing.T) {
	for name, hold := range holds {
		// Ticks that are no power of two: n·tick/tick is not always n.
		for _, tick := range []float64{1.0 / 2048, 1e-3, 1.0 / 1000.3, 1.0 / 4096.7} {
			for _, n := range []int{1, 2, 3, 5, 16, 17, 49, 64, 977} {
				a := actuator(t, "lag-delay", Timing{tick, hold}, set{"delay": float64(n) * tick})
				r := rand.New(rand.NewPCG(3, uint64(n)))
				u := make([]float64, 2500)
				s := NewSpecimen()
				const before = 0.0625
				a.Start(before, s)
				for k := range u {
					u[k] = r.NormFloat64()
					want := before
					if k >= n {
						want = u[k-n]
					}
					if y, _ := a.Advance(u[k], s); !same(y, want) {
						t.Fatalf("%s, tick %v s, %d ticks, at %d: got %v, want %v", name, tick, n, k, y, want)
					}
				}
			}
		}
	}
}

func TestLagDelayAgainstMatrixExponentials(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []struct {
			Name, Hold             string
			Tick, Delay, Lag, Gain float64
			U, Y, V                []float64
		}
	}
	load(t, "testdata/lagdelay.json", &vectors)
	if len(vectors.Cases) != 22 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		t.Run(c.Name+", "+c.Hold, func(t *testing.T) {
			a := actuator(t, "lag-delay", Timing{c.Tick, holds[c.Hold]}, set{"delay": c.Delay, "lag": c.Lag, "gain": c.Gain})
			s := NewSpecimen()
			a.Start(0, s)
			most, fastest := 0.0, 0.0
			for k := range c.Y {
				most, fastest = max(most, math.Abs(c.U[k])), max(fastest, math.Abs(c.V[k]))
			}
			// The vectors carry the rounding of a matrix exponential, some
			// 1e-14 of its norm, for which 1e-12 of the motion is room. Their
			// velocity is a difference over the lag and carries that error too.
			tolY := 1e-12 * most
			tolV := 1e-12 * fastest
			if c.Lag > 0 {
				tolV += 1e-13 * most / c.Lag
			}
			for k, u := range c.U {
				y, v := a.Advance(u, s)
				near(t, fmt.Sprintf("y at %d", k), y, c.Y[k], tolY)
				near(t, fmt.Sprintf("v at %d", k), v, c.V[k], tolV)
			}
		})
	}
}

func TestLagDelayFrequencyResponse(t *testing.T) {
	const h = 1.0 / 2048
	for _, c := range []struct{ delay, lag, gain float64 }{
		{8e-3, 6e-3, 1}, {0, 6e-3, 1}, {0.7 * h, 1e-3, 0.8}, {13.25 * h, 2 * h, 1.2},
	} {
		for _, q := range []int{1, 20, 333, 900} { // periods in a second; Nyquist is 1024 Hz
			w := 2 * math.Pi * float64(q)
			a := actuator(t, "lag-delay", Timing{h, Ramp}, set{"delay": c.delay, "lag": c.lag, "gain": c.gain})
			s := NewSpecimen()
			a.Start(0, s)
			got := measure(q, 2048, 2048, func(u float64) float64 { y, _ := a.Advance(u, s); return y })
			model := func(s complex128) complex128 {
				return complex(c.gain, 0) * cmplx.Exp(-s*complex(c.delay, 0)) / (1 + s*complex(c.lag, 0))
			}
			// Aliases beyond ±M add less than h/(2π³·M²·T)·sin²: 1e-10 with
			// M = 1e4 and T ≥ 2h. What is left of the start is below e^(−160).
			want := sampled(w, h, 10000, model)
			if off := cmplx.Abs(got - want); !(off < 3e-10) {
				t.Errorf("%+v at %d Hz: got %v, want %v, off by %.2g", c, q, got, want, off)
			}
		}
	}
}

func TestLagDelayGainAndPhaseBelowTheRate(t *testing.T) {
	const h = 1.0 / 2048
	const delay, lag, gain = 8.3e-3, 6e-3, 1.1
	for _, hz := range []int{1, 2, 5, 10} {
		w := 2 * math.Pi * float64(hz)
		a := actuator(t, "lag-delay", Timing{h, Ramp}, set{"delay": delay, "lag": lag, "gain": gain})
		s := NewSpecimen()
		a.Start(0, s)
		g := measure(hz, 2048, 2048, func(u float64) float64 { y, _ := a.Advance(u, s); return y })
		// The ramp takes sinc²(wh/2) of the sine. Its first two aliases have
		// (wh/2π)² of that and pass the lag with less than h/(2πT).
		hold := math.Pow(math.Sin(w*h/2)/(w*h/2), 2)
		tolerance := 3 * math.Pow(w*h/(2*math.Pi), 2)
		near(t, fmt.Sprintf("|G| at %d Hz", hz), cmplx.Abs(g), hold*gain/math.Sqrt(1+w*w*lag*lag), tolerance)
		near(t, fmt.Sprintf("phase at %d Hz", hz), cmplx.Phase(g), -w*delay-math.Atan(w*lag), tolerance)
	}
}

// The velocity is that of the equation, (g·u(t−τ) − y)/T, for whatever φ.
func TestLagDelayVelocityObeysTheEquation(t *testing.T) {
	const h, lag, gain = 1e-3, 5e-3, 1.3
	for name, hold := range holds {
		for _, phi := range []float64{0, 1e-6, 0.3, 0.999999} {
			a := actuator(t, "lag-delay", Timing{h, hold}, set{"delay": (2 + phi) * h, "lag": lag, "gain": gain})
			s := NewSpecimen()
			near(t, "start", a.Start(0.02/gain, s), 0.02, 1e-17)
			u := make([]float64, 300)
			r := rand.New(rand.NewPCG(5, 6))
			for k := range u {
				u[k] = 0.02 / gain
				if k >= 3 {
					u[k] = u[k-1] + 1e-3*r.NormFloat64()
				}
				y, v := a.Advance(u[k], s)
				if k < 3 {
					continue
				}
				in := u[k-2]
				if hold == Ramp {
					in = phi*u[k-3] + (1-phi)*u[k-2]
				}
				// Rounding of φ from the delay, 1e-16·3/φ-wise below 1e-13.
				near(t, fmt.Sprintf("%s, φ=%v, tick %d", name, phi, k), v, (gain*in-y)/lag, 1e-11)
			}
		}
	}
}

func TestLagDelayAtRestStaysExactly(t *testing.T) {
	const h = 1.0 / 2048
	for name, hold := range holds {
		for _, lag := range []float64{0, 1e-9, h, 6e-3, 1, 1e9} {
			for _, delay := range []float64{0, 0.37 * h, 5.99 * h, 0.4} {
				p, err := newLagDelay(Timing{h, hold}, num(set{"delay": delay, "lag": lag, "gain": 1}))
				if err != nil {
					t.Fatal(err)
				}
				s := NewSpecimen(&spring{k: 1e6})
				p.Start(0.0123, s)
				for range 3000 {
					if y, v := p.Advance(0.0123, s); y != 0.0123 || v != 0 {
						t.Fatalf("%s, lag %v s, delay %v s: moved to %v at %v m/s", name, lag, delay, y, v)
					}
				}
				if s.Force() != 1e6*0.0123 {
					t.Errorf("force %v", s.Force())
				}
			}
		}
	}
}

// A lag that vanishes, and a knot that comes up to a tick from either side,
// must lead to the same answer as none, and never to anything not finite.
func TestLagDelayHasNoEdges(t *testing.T) {
	const h = 1e-3
	answer := func(hold Hold, delay, lag float64) (y, v []float64) {
		p, err := newLagDelay(Timing{h, hold}, num(set{"delay": delay, "lag": lag, "gain": 1}))
		if err != nil {
			t.Fatal(err)
		}
		s := NewSpecimen()
		p.Start(0, s)
		for k := range 100 {
			yk, vk := p.Advance(math.Sin(0.3*float64(k)), s)
			y, v = append(y, yk), append(v, vk)
		}
		return y, v
	}
	for _, c := range []struct {
		name         string
		hold         Hold
		delay, lag   float64
		delay0, lag0 float64
		tolY, tolV   float64 // what the change of lag or delay itself may do: slope 300/s, jumps 0.3
	}{
		{"no lag, ramp", Ramp, 2.3 * h, 1e-12, 2.3 * h, 0, 300 * 1e-12, 1e-9},
		{"denormal lag, ramp", Ramp, 2.3 * h, 5e-324, 2.3 * h, 0, 1e-15, 1e-12},
		{"no lag, step", Step, 2.3 * h, 1e-12, 2.3 * h, 0, 1e-15, math.Inf(1)},
		{"denormal lag, step", Step, 2.3 * h, 5e-324, 2.3 * h, 0, 1e-15, math.Inf(1)},
		{"knot right behind the tick, ramp", Ramp, (2 + 1e-8) * h, 5e-3, 2 * h, 5e-3, 3e-9, 1e-6},
		{"knot right before the tick, ramp", Ramp, (3 - 1e-8) * h, 5e-3, 3 * h, 5e-3, 3e-9, 1e-6},
		{"knot right before the tick, no lag, ramp", Ramp, (3 - 1e-8) * h, 0, 3 * h, 0, 4e-9, math.Inf(1)},
		{"knot right behind the tick, step", Step, (2 + 1e-8) * h, 5e-3, 2 * h, 5e-3, 3e-9, 1e-6},
		{"knot right before the tick, step", Step, (3 - 1e-8) * h, 5e-3, 3 * h, 5e-3, 3e-9, math.Inf(1)},
		{"within a nanotick", Ramp, (3 - 5e-10) * h, 5e-3, 3 * h, 5e-3, 0, 0},
		{"endless lag, ramp", Ramp, 2.5 * h, 1e12, 0, 1e15, 1e-12, 1e-11},
	} {
		y, v := answer(c.hold, c.delay, c.lag)
		y0, v0 := answer(c.hold, c.delay0, c.lag0)
		for k := range y {
			near(t, fmt.Sprintf("%s: y at %d", c.name, k), y[k], y0[k], c.tolY)
			near(t, fmt.Sprintf("%s: v at %d", c.name, k), v[k], v0[k], c.tolV)
			if math.IsNaN(v[k]) || math.IsInf(v[k], 0) {
				t.Errorf("%s: v at %d is %v", c.name, k, v[k])
			}
		}
	}
}

// straight against the textbook form on both sides of where the series takes
// over, and against the first terms of the series for small r.
func TestStraightLine(t *testing.T) {
	for _, r := range []float64{0.2, 0.249999999, 0.25, 0.3, 1, 10, 100} {
		e, a, b := straight(r, 1)
		p := (1 - math.Exp(-r)) / r
		// The textbook form cancels: a few ulp of 1.
		near(t, "E", e, math.Exp(-r), 1e-16)
		near(t, "A", a, p-math.Exp(-r), 2e-15)
		near(t, "B", b, 1-p, 2e-15)
	}
	for _, r := range []float64{1e-3, 1e-6, 1e-12, 1e-300} {
		_, a, b := straight(r, 1)
		// A = r/2 − r²/3 + r³/8 − r⁴/30 …, B = r/2 − r²/6 + r³/24 − r⁴/120 …
		near(t, "A", a/r, 0.5-r/3+r*r/8, r*r*r/30+1e-16)
		near(t, "B", b/r, 0.5-r/6+r*r/24, r*r*r/120+1e-16)
	}
}

func TestLagDelayRefusesWhatNoTableCatches(t *testing.T) {
	good := func() kind.Values { return num(set{"delay": 0, "lag": 0, "gain": 1}) }
	for _, c := range []struct {
		timing Timing
		name   string
		value  float64
		says   string
	}{
		{Timing{Tick: 0}, "", 0, "tick: "},
		{Timing{Tick: math.NaN()}, "", 0, "tick: "},
		{Timing{Tick: math.Inf(1)}, "", 0, "tick: "},
		{Timing{Tick: 1, Hold: 7}, "", 0, "hold: "},
		{Timing{Tick: 1e-9}, "delay", 1, "delay: "}, // a history of 8 GB
		{Timing{Tick: 1e-3}, "delay", math.NaN(), "delay: "},
		{Timing{Tick: 1e-3}, "lag", math.Inf(1), "lag: "},
		{Timing{Tick: 1e-3}, "gain", 0, "gain: "},
	} {
		v := good()
		if c.name != "" {
			v[c.name] = kind.Num(c.value)
		}
		if _, err := newLagDelay(c.timing, v); err == nil || !strings.HasPrefix(err.Error(), c.says) {
			t.Errorf("%+v, %s = %v: error %v, want %q", c.timing, c.name, c.value, err, c.says)
		}
	}
}

// witness keeps what an element is told.
type witness struct {
	spring
	moves           int
	y, v, dt, start float64
}

func (w *witness) Start(y float64) { w.start = y }

func (w *witness) Advance(y, v, dt float64) float64 {
	w.moves++
	w.y, w.v, w.dt = y, v, dt
	return w.spring.Advance(y, v, dt)
}

func TestLagDelayMovesTheSpecimenOnceATick(t *testing.T) {
	const h = 1.0 / 2048
	for name, hold := range holds {
		for _, given := range []set{{}, {"delay": 0.4 * h}, {"delay": 8e-3, "lag": 6e-3, "gain": 0.9}} {
			a := actuator(t, "lag-delay", Timing{h, hold}, given)
			w := &witness{spring: spring{k: 1000}}
			s := NewSpecimen(w)
			y0 := a.Start(0.03, s)
			if w.start != y0 || s.Force() != 1000*y0 {
				t.Errorf("%s: started at %v m with %v N", name, w.start, s.Force())
			}
			w.moves = 0
			for k := range 100 {
				y, v := a.Advance(0.03+0.01*math.Sin(0.2*float64(k)), s)
				if w.moves != k+1 || w.y != y || w.v != v || w.dt != h || s.Force() != 1000*y {
					t.Fatalf("%s, tick %d: the specimen was told %+v, not %v m, %v m/s", name, k, *w, y, v)
				}
			}
		}
	}
}
