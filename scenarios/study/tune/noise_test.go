package tune

import (
	"math"
	"testing"

	"antelag/compensator"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// The gain is |C| of the closed forms: of the polynomial of Horiuchi et al. (1999)
// |Σ (−1)^i C(n+1,i+1) e^(−jiωτ)|, where iτ is whole ticks; of the Taylor
// feedforward |1 + jωτ − (ωτ)²/2| with the acceleration a tick old. Measured by
// least squares on whole periods after the start has been forgotten: 1e-6.
func TestGainIsThatOfTheClosedForms(t *testing.T) {
	const rate, tau = 1024.0, 16.0 / 1024
	for _, f := range []float64{2, 7.3, 20, 31.25, 50} {
		w := 2 * math.Pi * f
		poly := func(c ...float64) float64 {
			re, im := 0.0, 0.0
			for i, v := range c {
				re += v * math.Cos(w*tau*float64(i))
				im -= v * math.Sin(w*tau*float64(i))
			}
			return math.Hypot(re, im)
		}
		a := w * w * tau * tau / 2
		for _, c := range []struct {
			kind  string
			order float64
			want  float64
		}{
			{"polynomial", 1, poly(2, -1)},
			{"polynomial", 2, poly(3, -3, 1)},
			{"polynomial", 3, poly(4, -6, 4, -1)},
			{"taylor", 0, math.Hypot(1-a*math.Cos(w/rate), w*tau+a*math.Sin(w/rate))},
			{"none", 0, 1},
		} {
			given := kind.Values{}
			if c.kind != "none" {
				given["delay"] = kind.Num(tau)
			}
			if c.order > 0 {
				given["order"] = kind.Num(c.order)
			}
			entry, err := compensator.Kinds.Find(c.kind)
			if err != nil {
				t.Fatal(err)
			}
			values, err := entry.Resolve(given)
			if err != nil {
				t.Fatal(err)
			}
			m, err := entry.New(1/rate, values)
			if err != nil {
				t.Fatal(err)
			}
			if got := gain(m, f, rate); math.Abs(got/c.want-1) > 1e-6 {
				t.Errorf("%s %v at %v Hz: %v, want %v", c.kind, c.order, f, got, c.want)
			}
		}
	}
}

// Every kind of compensator has a finite noise gain of 1 at least, with its
// defaults: adaptive ones learn nothing from so small a motion.
func TestNoiseGainOfEveryKind(t *testing.T) {
	for _, name := range compensator.Kinds.Names() {
		s := scene(t, scenarios.Change{Path: "spring.compensator.kind", Value: name})
		g, err := NoiseGain(s, scenarios.Configured)
		if err != nil || !(g >= 0.99 && g < 1000) {
			t.Errorf("%s: %v, %v", name, g, err)
		}
	}
}
