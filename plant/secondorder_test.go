package plant

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"
)

func TestSecondOrderAgainstLsim(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []struct {
			Name, Hold             string
			Tick, Delay, Frequency float64
			Zeta                   float64 `json:"damping_ratio"`
			Gain                   float64
			U, Y, V                []float64
		}
	}
	load(t, "testdata/secondorder.json", &vectors)
	if len(vectors.Cases) != 14 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		t.Run(c.Name+", "+c.Hold, func(t *testing.T) {
			a := actuator(t, "second-order", Timing{c.Tick, holds[c.Hold]},
				set{"frequency": c.Frequency, "damping_ratio": c.Zeta, "delay": c.Delay, "gain": c.Gain})
			s := NewSpecimen()
			a.Start(0, s)
			most := 0.0
			for _, u := range c.U {
				most = max(most, math.Abs(u))
			}
			// Matrix exponentials are good to some 1e-14 of their norm, which
			// is up to ωh; a velocity is ω times that.
			w := 2 * math.Pi * c.Frequency
			tolerance := 1e-13 * max(1, w*c.Tick) * most
			for k, u := range c.U {
				y, v := a.Advance(u, s)
				near(t, fmt.Sprintf("y at %d", k), y, c.Y[k], tolerance)
				near(t, fmt.Sprintf("v at %d", k), v, c.V[k], tolerance*w)
			}
		})
	}
}

func TestSecondOrderFrequencyResponse(t *testing.T) {
	const h = 1.0 / 2048
	for _, c := range []struct{ hz, zeta, delay, gain float64 }{
		{25, 0.7, 0, 1}, {40, 0.1, 8e-3, 1}, {10, 2, 0.7 * h, 0.8}, {200, 0.5, 13.25 * h, 1.2},
	} {
		for _, q := range []int{1, 20, 40, 333, 900} { // periods in a second; Nyquist is 1024 Hz
			w, wn := 2*math.Pi*float64(q), complex(2*math.Pi*c.hz, 0)
			a := actuator(t, "second-order", Timing{h, Ramp}, set{"frequency": c.hz, "damping_ratio": c.zeta, "delay": c.delay, "gain": c.gain})
			s := NewSpecimen()
			a.Start(0, s)
			got := measure(q, 2048, 4096, func(u float64) float64 { y, _ := a.Advance(u, s); return y })
			want := sampled(w, h, 3000, func(s complex128) complex128 {
				return complex(c.gain, 0) * cmplx.Exp(-s*complex(c.delay, 0)) / (1 + 2*complex(c.zeta, 0)*s/wn + s*s/(wn*wn))
			})
			// Aliases beyond ±M fall with the fourth power and add less than
			// M⁻³; what is left of the start is e^(−ζω·2 s) < e^(−50), and two
			// seconds of rounding.
			if off := cmplx.Abs(got - want); !(off < 1e-10) {
				t.Errorf("%+v at %d Hz: got %v, want %v, off by %.2g", c, q, got, want, off)
			}
		}
	}
}

func TestSecondOrderAtRestStaysExactly(t *testing.T) {
	const h = 1.0 / 2048
	for name, hold := range holds {
		for _, hz := range []float64{0.01, 1, 25, 1e5} {
			for _, delay := range []float64{0, 0.37 * h, 5.99 * h, 0.4} {
				a := actuator(t, "second-order", Timing{h, hold}, set{"frequency": hz, "delay": delay})
				s := NewSpecimen(&spring{k: 1e6})
				a.Start(0.0123, s)
				for range 3000 {
					if y, v := a.Advance(0.0123, s); y != 0.0123 || v != 0 {
						t.Fatalf("%s, %v Hz, delay %v s: moved to %v at %v m/s", name, hz, delay, y, v)
					}
				}
				if s.Force() != 1e6*0.0123 {
					t.Errorf("force %v", s.Force())
				}
			}
		}
	}
}

// A command held for ever leaves the actuator where its gain puts it, and it
// stays.
func TestActuatorsStartWhereTheCommandTakesThem(t *testing.T) {
	for name, given := range map[string]set{
		"lag-delay": {"gain": 0.83, "delay": 3.3e-3, "lag": 5e-3}, "second-order": {"gain": 0.83, "delay": 3.3e-3}, "servo-hydraulic": {},
	} {
		a := actuator(t, name, Timing{1e-3, Ramp}, given)
		s := NewSpecimen(&spring{k: 1e6})
		y := a.Start(0.0371, s)
		gain := 1.0
		if g, ok := given["gain"]; ok {
			gain = g
		}
		near(t, name, y, gain*0.0371, 0)
		near(t, "force", s.Force(), 1e6*y, 0)
		for range 500 {
			if now, v := a.Advance(0.0371, s); now != y || v != 0 {
				t.Fatalf("%s: from %v to %v m at %v m/s", name, y, now, v)
			}
		}
	}
}

// A first-order lag is a second-order one with a second root far away, and a
// frequency beyond the ticks is a pure delay.
func TestSecondOrderMeetsLagDelay(t *testing.T) {
	const h, lag = 1.0 / 2048, 6e-3
	for name, hold := range holds {
		for _, delay := range []float64{0, 2.3 * h, 4 * h} {
			// Roots −1/T and −1/(T·s): ω² = 1/(T²s), 2ζω = (1 + 1/s)/T.
			const far = 1e-6
			omega := 1 / (lag * math.Sqrt(far))
			p, err := newSecondOrder(Timing{h, hold}, num(set{"delay": delay, "gain": 1, "frequency": omega / (2 * math.Pi),
				"damping_ratio": (1 + 1/far) / (2 * lag * omega)}))
			if err != nil {
				t.Fatal(err)
			}
			b := actuator(t, "lag-delay", Timing{h, hold}, set{"delay": delay, "lag": lag})
			s := NewSpecimen()
			p.Start(0, s)
			b.Start(0, s)
			for k := range 200 {
				u := math.Sin(0.1 * float64(k))
				got, _ := p.Advance(u, s)
				want, _ := b.Advance(u, s)
				// The second root is late by T·s times the slope of the
				// answer, at most 0.1/h + jumps of 0.1 per T.
				near(t, fmt.Sprintf("%s, delay %v, tick %d", name, delay, k), got, want, lag*far*0.2/h)
			}
		}
	}
}
