package compensator

import (
	"math"
	"testing"
)

// The vectors are NumPy's interp in the past targets and the law of the delay
// word by word, in a closed loop: testdata/vectors.py.
func TestDelaySeekingAgainstVectors(t *testing.T) {
	for _, test := range []struct {
		file string
		set  []any
	}{
		{"free", []any{"order", 3, "delay_min", 0, "delay_max", 0.05}},
		{"bounded", []any{"order", 1, "delay_min", 0.008, "delay_max", 0.014}},
	} {
		set := append([]any{"rate", 4, "speed_floor", 0.02}, test.set...)
		followsVectors(t, "delay_seeking_"+test.file+".csv", build(t, 1.0/256, "delay-seeking", set...), false)
	}
}

// With a rate of 0 it is the polynomial of the same order and delay.
func TestDelaySeekingAtRateZeroIsPolynomial(t *testing.T) {
	const tick = 1.0 / 1024
	for order := 0; order <= maxOrder; order++ {
		for _, delay := range []float64{0, 0.0003, 0.0083, 14 * tick, maxDelay} {
			set := []any{"order", order, "delay", delay}
			c := build(t, tick, "delay-seeking", append([]any{"rate", 0, "delay_max", maxDelay}, set...)...)
			p := build(t, tick, "polynomial", set...)
			for k, in := range inputs(3000, tick, 0.02) {
				// 1e-14: weights up to 10 on targets of 0.05 m, rounded at
				// 1e-16, and instants right to 1e-12 ticks.
				if a, b := c.Command(in), p.Command(in); math.Abs(a-b) > 1e-14 {
					t.Fatalf("order %d, delay %v: command %v in tick %d, polynomial %v", order, delay, a, k, b)
				}
			}
		}
	}
}

// On a ramp all is known in closed form: the target has speed v, a measurement
// that lags by a fixed time L leaves e = L·v, so τ grows by κ·dt·L·v²/(v²+v₀²)
// a tick, to the bound; when the measurement leads, it falls.
func TestDelaySeekingOnARamp(t *testing.T) {
	const tick, late, rate, floor = 1.0 / 1024, 0.004, 2.0, 0.02
	for _, speed := range []float64{0.002, 0.02, 0.2, -0.2} {
		for _, sign := range []float64{1, -1} {
			c := build(t, tick, "delay-seeking", "rate", rate, "speed_floor", floor)
			slope := sign * rate * late * speed * speed / (speed*speed + floor*floor)
			for k := range 8000 {
				s := float64(k) * tick
				in := Input{X: speed * (s + tick), V: speed, Y: speed * (s - sign*late)}
				if k == 0 {
					in.Y = 0 // target and measured have been 0 up to here
				}
				c.Command(in)
				// At t_0 nothing had moved.
				want := clamp(startDelay+slope*s, 0, 0.05)
				// 1e-11: 8000 sums of increments whose error of 1e-12 comes of
				// small differences of displacements up to 1.6 m.
				if got := value(t, c, "delay"); math.Abs(got-want) > 1e-11 {
					t.Fatalf("speed %v, late by %v: delay %v in tick %d, want %v", speed, sign*late, got, k, want)
				}
			}
		}
	}
}

func TestDelaySeekingRetune(t *testing.T) {
	const tick = 1.0 / 1024
	for _, test := range []struct {
		set  []any
		want func(before float64) float64
	}{
		{[]any{"rate", 0}, func(d float64) float64 { return d }},
		{[]any{"rate", 20, "speed_floor", 1e-6, "order", 1}, func(d float64) float64 { return d }},
		{[]any{"delay", 0.012}, func(d float64) float64 { return d + 0.002 }},
		{[]any{"delay_max", 0.011}, func(float64) float64 { return 0.011 }},
		{[]any{"delay", 0.03, "delay_min", 0.03}, func(d float64) float64 { return d + 0.02 }},
	} {
		c := build(t, tick, "delay-seeking", "delay", startDelay)
		before := startDelay
		for _, in := range inputs(700, tick, 0.005) {
			c.Command(in)
			before = value(t, c, "delay")
		}
		want := test.want(before)
		if err := c.Retune(given(t, "delay-seeking", test.set...)); err != nil {
			t.Fatal(err)
		}
		if got := value(t, c, "delay"); math.Abs(got-want) > 1e-16 || before < 0.0105 {
			t.Errorf("%v: delay %v, was %v, want %v", test.set, got, before, want)
		}
	}
}

// The law alone, in one tick each: κ·dt = 0.1, q₀ = 2, bounds 0 and 1, from ½.
func TestFollowerTick(t *testing.T) {
	for _, test := range []struct {
		name          string
		e, q, w, want float64
	}{
		{"half the weight at the floor", 0.4, 2, 1, 0.5 + 0.1*0.1},
		{"most of it above", 6.5, 13, 1, 0.5 + 0.1*6.5*13/173},
		{"error against the motion", 0.4, -2, 1, 0.5 - 0.1*0.1},
		{"half the weight", 0.4, 2, 0.5, 0.5 + 0.05*0.1},
		{"no motion", 1e9, 0, 1, 0.5},
		{"late by more than the range", 1e9, 2, 1, 0.5 + 0.1},
		{"early by more than the range", -math.MaxFloat64, 3, 1, 0.5 - 0.1},
		{"no number", 1e200, 1e200, 1, 0.5},
	} {
		var f follower
		f.retune(0.5, 0.1, 2, 0, 1)
		f.follow(test.e, test.q, test.w)
		if !(math.Abs(f.value-test.want) <= 1e-16) { // a rounding of ½; NaN is none
			t.Errorf("%s: %v, want %v", test.name, f.value, test.want)
		}
	}
}
