package report

import (
	"math"
	"math/cmplx"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/scenarios/kind"
)

const tick = 1.0 / 2048

func bench(t *testing.T, comp string, cv kind.Values, act string, av kind.Values) *probe {
	t.Helper()
	c, err := compensator.Kinds.Find(comp)
	if err != nil {
		t.Fatal(err)
	}
	v, err := c.Resolve(cv)
	if err != nil {
		t.Fatal(err)
	}
	p := &probe{specimen: plant.NewSpecimen(), tick: tick}
	if p.compensator, err = c.New(tick, v); err != nil {
		t.Fatal(err)
	}
	a, err := plant.Actuators.Find(act)
	if err != nil {
		t.Fatal(err)
	}
	if v, err = a.Resolve(av); err != nil {
		t.Fatal(err)
	}
	if p.actuator, err = a.New(plant.Timing{Tick: tick}, v); err != nil {
		t.Fatal(err)
	}
	return p
}

// A lag behind a dead time has |G| = g/√(1+ω²T²) and the delay τ + atan(ωT)/ω.
// Between ticks commands are straight lines, which makes a sine of them smaller
// by (sin x/x)², x = ωh/2: 1 − x²/3; and of the sines that the corners add, the
// lag lets through about as much. Hence 2x² for both.
func TestResponseOfALag(t *testing.T) {
	const delay, lag, gain = 0.0083, 0.006, 0.97
	p := bench(t, "none", nil, "lag-delay", kind.Values{"delay": kind.Num(delay), "lag": kind.Num(lag), "gain": kind.Num(gain)})
	for _, hz := range []float64{0.2, 1, 3.7, 10, 20} {
		w := 2 * math.Pi * hz
		x := w * tick / 2
		a := p.at(hz, 0.01)
		if want := gain / math.Hypot(1, w*lag); math.Abs(a.actuator.amplitude/want-1) > 2*x*x+1e-9 {
			t.Errorf("%v Hz: amplitude %v, want %v", hz, a.actuator.amplitude, want)
		}
		// Within half a period, as a phase is.
		want := delay + math.Atan(w*lag)/w
		if off := math.Remainder(a.actuator.delay-want, 1/hz); math.Abs(off)*w > 2*x*x+1e-9 {
			t.Errorf("%v Hz: delay %v, want %v", hz, a.actuator.delay, want)
		}
		if math.Abs(a.compensator.amplitude-1) > 1e-9 || math.Abs(a.compensator.delay) > 1e-9 {
			t.Errorf("%v Hz: no compensation answers %+v", hz, a.compensator)
		}
	}
}

// The polynomial of order n = 3 answers a sine with C = 4 − 6q + 4q² − q³,
// q = e^(−jωτ) (Horiuchi et al. 1999); with τ a whole number of ticks exactly. And
// with a pure delay τ the two together make 1 − (1 − q)⁴.
func TestResponseOfAPredictor(t *testing.T) {
	const delay = 24 * tick
	p := bench(t, "polynomial", kind.Values{"order": kind.Num(3), "delay": kind.Num(delay)}, "lag-delay", kind.Values{"delay": kind.Num(delay)})
	for _, hz := range []float64{0.2, 1, 3.7, 10, 20} {
		w := 2 * math.Pi * hz
		q := cmplx.Exp(complex(0, -w*delay))
		a := p.at(hz, 0.01)
		check := func(what string, got phasor, want complex128) {
			t.Helper()
			h := cmplx.Rect(got.amplitude, -got.delay*w)
			if cmplx.Abs(h-want) > 1e-6*cmplx.Abs(want) { // rounding of the fit, and the sine that grew from rest
				t.Errorf("%v Hz: %s %v, want %v", hz, what, h, want)
			}
		}
		check("compensator", a.compensator, 4-6*q+4*q*q-q*q*q)
		check("together", a.together, 1-cmplx.Pow(1-q, 4))
	}
}

// Of a constant delay the curve is flat, also where it is longer than a period.
func TestDelaysGoOn(t *testing.T) {
	const delay = 0.3
	p := bench(t, "none", nil, "lag-delay", kind.Values{"delay": kind.Num(delay)})
	var all []answer
	for hz := 0.2; hz < 10; hz *= 1.1 {
		all = append(all, p.at(hz, 0.01))
	}
	unwrap(all, func(a *answer) *phasor { return &a.actuator })
	for _, a := range all {
		if math.Abs(a.actuator.delay-delay) > 1e-4 {
			t.Errorf("%v Hz: %v", a.hz, a.actuator.delay)
		}
	}
}
