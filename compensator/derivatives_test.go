package compensator

import (
	"math"
	"math/cmplx"
	"testing"
)

// near compares a measured frequency response with its closed form.
// 1e-12 of the largest part: a thousand terms of 1e-16 in the projection.
func near(t *testing.T, what string, got, want complex128, scale float64) {
	t.Helper()
	if cmplx.Abs(got-want) > 1e-12*max(1, scale) {
		t.Errorf("%s: response %v, want %v", what, got, want)
	}
}

func TestLinearAccelerationResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, delay := range []float64{0, 0.0004, 0.002, 0.0083, 0.014, 0.0207, maxDelay} {
		c := build(t, tick, "linear-acceleration", "delay", delay)
		for _, period := range []int{1000, 200, 40, 9} {
			w := 2 * math.Pi / float64(period) / tick
			d := math.Floor(delay / tick * (1 + 1e-12))
			phi := delay/tick - d
			back := func(ticks float64) complex128 { return cmplx.Exp(complex(0, -w*ticks*tick)) }
			before := complex(1-phi, 0)*back(d) + complex(phi, 0)*back(d+1)
			square := complex(w*w*delay*delay, 0)
			want := complex(1, w*delay) - square*(2.0/3-before/6)
			near(t, "linear-acceleration", response(c, tick, period, 520), want, real(square))
		}
	}
}

func TestLinearAccelerationPredictsConstantJerkExactly(t *testing.T) {
	const tick = 1.0 / 1024
	for _, delay := range []float64{0, 0.0003, 0.0077, 0.1} {
		c := build(t, tick, "linear-acceleration", "delay", delay)
		at := func(s float64) (x, v, a float64) {
			return 0.02 + 0.1*s - 0.4*s*s + 0.7*s*s*s, 0.1 - 0.8*s + 2.1*s*s, -0.8 + 4.2*s
		}
		for k := range 600 {
			s := float64(k) * tick
			x, v, a := at(s)
			u := c.Command(Input{X: x, V: v, A: a})
			// 1e-15: displacements below 0.1 and rounding of 1e-16.
			if want, _, _ := at(s + delay); s > delay+tick && math.Abs(u-want) > 1e-15 {
				t.Fatalf("delay %v: command %v in tick %d, want %v", delay, u, k, want)
			}
		}
	}
}

func TestTaylorResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, delay := range []float64{0, 0.0004, 0.0083, 0.014, maxDelay} {
		c := build(t, tick, "taylor", "delay", delay)
		for _, period := range []int{1000, 200, 40, 9} {
			w := 2 * math.Pi / float64(period) / tick
			theta := w * delay
			near(t, "taylor", response(c, tick, period, 10), complex(1-theta*theta/2, theta), theta*theta)
		}
	}
}

func TestModelInverseResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, model := range []struct{ gain, delay, lag float64 }{
		{1, 0, 0}, {1, 0.014, 0}, {1, 0, 0.006}, {0.95, 0.008, 0.006}, {2, 0.02, 0.1},
	} {
		for order := 1; order <= 3; order++ {
			c := build(t, tick, "model-inverse", "gain", model.gain, "delay", model.delay, "lag", model.lag, "order", order)
			for _, period := range []int{1000, 200, 40, 9} {
				w := 2 * math.Pi / float64(period) / tick
				// The series of (1 + Ts)·e^(sτ), term by term.
				series := []float64{
					1, model.lag + model.delay,
					model.lag*model.delay + model.delay*model.delay/2,
					model.lag*model.delay*model.delay/2 + math.Pow(model.delay, 3)/6,
				}
				jw := complex(0, w)
				difference := (1 - cmplx.Exp(complex(0, -w*tick))) / tick
				powers := []complex128{1, jw, jw * jw, jw * jw * difference}
				want, scale := complex(0, 0), 0.0
				for i := 0; i <= order; i++ {
					term := powers[i] * complex(series[i]/model.gain, 0)
					want += term
					scale += cmplx.Abs(term)
				}
				near(t, "model-inverse", response(c, tick, period, 10), want, scale)
			}
		}
	}
}

// Each order leaves the next term of the series of the inverse: behind its own
// actuator the response is off 1 by that term, within twice it at low
// frequency, and more than half of it.
func TestModelInverseInvertsItsModelToItsOrder(t *testing.T) {
	const tick, gain, delay, lag = 1.0 / 8000, 0.9, 0.008, 0.006
	for order := 1; order <= 3; order++ {
		c := build(t, tick, "model-inverse", "gain", gain, "delay", delay, "lag", lag, "order", order)
		// 2 Hz: ω(T+τ) = 0.18, so further terms are small beside the next.
		const w = 2 * math.Pi * 2
		actuator := gain * cmplx.Exp(complex(0, -w*delay)) / complex(1, w*lag)
		off := cmplx.Abs(response(c, tick, 4000, 10)*actuator - 1)
		next := []float64{
			lag*delay + delay*delay/2,
			lag*delay*delay/2 + math.Pow(delay, 3)/6,
			lag*math.Pow(delay, 3)/6 + math.Pow(delay, 4)/24,
		}[order-1] * math.Pow(w, float64(order+1))
		if off < next/2 || off > 2*next {
			t.Errorf("order %d: off by %v, the next term is %v", order, off, next)
		}
	}
}

func TestModelInverseCoefficients(t *testing.T) {
	// By hand, g = 1/2, τ = 20 ms, T = 10 ms: 2·(1, 0.03, 0.0004, 2e-6 + 1.3333e-6).
	c := build(t, 1e-3, "model-inverse", "gain", 0.5, "delay", 0.02, "lag", 0.01, "order", 3)
	for name, want := range map[string]float64{"a0": 2, "a1": 0.06, "a2": 8e-4, "a3": 2 * (2e-6 + 4e-6/3), "delay": 0.03, "gain": 0.5} {
		if got := value(t, c, name); math.Abs(got-want) > 1e-15 {
			t.Errorf("%s = %v, want %v", name, got, want)
		}
	}
	if n := len(build(t, 1e-3, "model-inverse", "order", 1).Coefficients(nil)); n != 4 {
		t.Errorf("order 1 has %d coefficients, want a0, a1, delay, gain", n)
	}
}

// After Start the acceleration counts as 0 for ever: the first jerk is that
// of a step, and a(t−τ) is 0 for τ.
func TestDerivativesBeforeTheStart(t *testing.T) {
	const tick = 1e-3
	m := build(t, tick, "model-inverse", "delay", 0.006, "order", 3)
	m.Start(0.1, 0.1)
	want := 0.1 + 0.006*0.006/2*2 + math.Pow(0.006, 3)/6*2/tick
	if u := m.Command(Input{X: 0.1, A: 2}); math.Abs(u-want) > 1e-16 {
		t.Errorf("model-inverse: %v, want %v", u, want)
	}
	l := build(t, tick, "linear-acceleration", "delay", 0.006)
	l.Start(0.1, 0.1)
	for k := range 10 {
		factor := 2.0 / 3
		if k >= 6 {
			factor = 0.5
		}
		want := 0.1 + 0.006*0.006*factor*2
		if u := l.Command(Input{X: 0.1, A: 2}); math.Abs(u-want) > 1e-16 {
			t.Errorf("linear-acceleration: %v in tick %d, want %v", u, k, want)
		}
	}
}
