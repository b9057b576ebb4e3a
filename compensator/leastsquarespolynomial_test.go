package compensator

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"
)

// weightsOf reads the weights of a fixed method from its answer to a target
// that is 1 for one tick.
func weightsOf(c Compensator, points int) []float64 {
	c.Start(0, 0)
	w := make([]float64, points+1)
	w[0] = c.Command(Input{X: 1})
	for i := range points {
		w[i+1] = c.Command(Input{})
	}
	return w
}

// The vectors are NumPy's lstsq on the same points: testdata/vectors.py.
func TestLeastSquaresWeightsAgainstVectors(t *testing.T) {
	const tick = 1.0 / 2048
	want := columns(t, "least_squares_weights.csv")
	for k := 0; k < len(want["w"]); {
		order, points, ahead := want["order"][k], int(want["points"][k]), want["ahead"][k]
		what := fmt.Sprintf("order %v, %d points, %v ticks ahead", order, points, ahead)
		c := build(t, tick, "least-squares-polynomial", "order", order, "points", float64(points), "delay", ahead*tick)
		w := want["w"][k : k+points]
		largest, square := 0.0, 0.0
		for _, x := range w {
			largest = max(largest, math.Abs(x))
			square += x * x
		}
		got := weightsOf(c, points)
		for i, x := range w {
			// 1e-12 of the largest: lstsq on plain powers of order 5, whose
			// condition is some 1e3, from rounding of 1e-16.
			if math.Abs(got[i]-x) > 1e-12*max(1, largest) {
				t.Errorf("%s: weight %d is %v, want %v", what, i, got[i], x)
			}
		}
		if got[points] != 0 {
			t.Errorf("%s: the target %d ticks ago has weight %v", what, points, got[points])
		}
		if noise := value(t, c, "noise_gain"); math.Abs(noise-math.Sqrt(square)) > 1e-12*max(1, noise) {
			t.Errorf("%s: noise gain %v, want %v", what, noise, math.Sqrt(square))
		}
		// What adapts works the fit out anew each tick: the same with rate 0.
		a := build(t, tick, "least-squares-polynomial", "order", order, "points", float64(points), "delay", ahead*tick,
			"adapt", "delay-and-amplitude", "rate", 0, "delay_max", maxDelay)
		for i, x := range weightsOf(a, points)[:points] {
			if math.Abs(x-w[i]) > 1e-12*max(1, largest) {
				t.Errorf("%s, adaptive: weight %d is %v, want %v", what, i, x, w[i])
			}
		}
		k += points
	}
}

// Order 0 is the mean of M targets, with the response
// e^(−jθ(M−1)/2)·sin(Mθ/2)/(M·sin(θ/2)), θ = ω·dt; order 1 adds the slope,
// Σ s_i²= M(M²−1)/12, and so (s_e/Σs²)·Σ s_i·e^(−jω…), which is s_e·12/(M²−1)
// times j·d/dθ of the mean about the middle.
func TestLeastSquaresResponse(t *testing.T) {
	const tick = 1.0 / 1000
	for _, points := range []int{2, 5, 16, 41} {
		for _, ahead := range []float64{0, 3, 13.7} {
			for _, period := range []int{1000, 200, 40, 9} {
				theta, m := 2*math.Pi/float64(period), float64(points)
				sin, cos := math.Sincos(theta / 2)
				sinM, cosM := math.Sincos(m * theta / 2)
				mean := sinM / (m * sin)
				slope := (m*cosM*sin - sinM*cos) / (2 * m * sin * sin) // d mean/dθ
				middle := cmplx.Exp(complex(0, -theta*(m-1)/2))
				edge := (m-1)/2 + ahead
				for order, want := range []complex128{
					middle * complex(mean, 0),
					middle * complex(mean, -edge*12/(m*m-1)*slope),
				} {
					c := build(t, tick, "least-squares-polynomial", "order", order, "points", points, "delay", ahead*tick)
					// Weights of up to 1 + 2·ahead.
					what := fmt.Sprintf("order %d, %d points, %v ticks ahead, %d ticks a period", order, points, ahead, period)
					near(t, what, response(c, tick, period, 50), want, 1+2*ahead)
				}
			}
		}
	}
}

func TestLeastSquaresPredictsPolynomialsOfItsOrderExactly(t *testing.T) {
	const tick = 1.0 / 1024
	for order := 0; order <= maxFitOrder; order++ {
		for _, points := range []int{order + 2, 40, maxPoints} {
			for _, ahead := range []float64{0, 0.3, 14.6} {
				c := build(t, tick, "least-squares-polynomial", "order", order, "points", points, "delay", ahead*tick)
				at := func(k float64) float64 {
					s, x := k/400-0.5, 0.0
					for i := order; i >= 0; i-- {
						x = x*s + []float64{0.3, 1, -2, 3, -1, 2}[i]
					}
					return x
				}
				noise := value(t, c, "noise_gain")
				for k := range 400 {
					u := c.Command(Input{X: at(float64(k))})
					// 1e-14 times the amplification: targets of size 1 are right
					// to 1e-16, and weights as well.
					if want := at(float64(k) + ahead); k >= points && math.Abs(u-want) > 1e-14*max(1, noise)*float64(points) {
						t.Fatalf("order %d, %d points, %v ticks: command %v in tick %d, want %v", order, points, ahead, u, k, want)
					}
				}
			}
		}
	}
}

func TestLeastSquaresAgainstVectors(t *testing.T) {
	wide := []any{"delay_min", 0, "delay_max", 0.05}
	for _, test := range []struct {
		file string
		set  []any
	}{
		{"delay", append([]any{"order", 2, "points", 12, "adapt", "delay"}, wide...)},
		{"both", append([]any{"order", 3, "points", 17, "adapt", "delay-and-amplitude"}, wide...)},
		{"bounded", []any{"order", 1, "points", 7, "adapt", "delay-and-amplitude",
			"delay_min", 0.008, "delay_max", 0.014, "amplitude_min", 0.98, "amplitude_max", 1.03}},
	} {
		set := append([]any{"rate", 4, "speed_floor", 0.02, "displacement_floor", 0.002}, test.set...)
		followsVectors(t, "least_squares_"+test.file+".csv", build(t, 1.0/256, "least-squares-polynomial", set...), true)
	}
}

// followsVectors drives a compensator with the inputs of a closed loop that
// was worked out by NumPy (testdata/vectors.py) and compares tick by tick.
func followsVectors(t *testing.T, file string, c Compensator, amplitude bool) {
	t.Helper()
	want := columns(t, file)
	for k, x := range want["x"] {
		u := c.Command(Input{X: x, V: want["v"][k], Y: want["y"][k]})
		// 1e-12: 900 sums of rounded terms; in the loop that made the vectors a
		// difference does not grow, because their measurements are given here.
		if got := value(t, c, "delay"); math.Abs(got-want["delay"][k]) > 1e-14 {
			t.Fatalf("%s: delay %.17g in tick %d, want %.17g", file, got, k, want["delay"][k])
		}
		if amplitude {
			if got := value(t, c, "amplitude"); math.Abs(got-want["amplitude"][k]) > 1e-13 {
				t.Fatalf("%s: amplitude %.17g in tick %d, want %.17g", file, got, k, want["amplitude"][k])
			}
		}
		if math.Abs(u-want["u"][k]) > 1e-13 {
			t.Fatalf("%s: command %.17g in tick %d, want %.17g", file, u, k, want["u"][k])
		}
	}
}

// What no longer adapts goes back to what is set; with rate 0 it stays; and
// the next command shows it.
func TestLeastSquaresRetunesWhatAdapts(t *testing.T) {
	const tick = 1.0 / 1024
	both := variant{"least-squares-polynomial", []any{"adapt", "delay-and-amplitude"}}
	learned := func() Compensator {
		c := both.build(t, tick)
		for k := range 2000 {
			x, v, _ := motion(float64(k+1) * tick)
			y, _, _ := motion(max(0, float64(k)*tick-0.002))
			c.Command(Input{X: x, V: v, Y: 0.97 * y})
		}
		return c
	}
	c := learned()
	delay, amplitude := value(t, c, "delay"), value(t, c, "amplitude")
	// The measurements do not answer, so both went on growing.
	if delay < 0.012 || amplitude < 1.02 {
		t.Fatalf("learned a delay of %v s and an amplitude of %v", delay, amplitude)
	}
	for _, test := range []struct {
		set              []any
		delay, amplitude float64
	}{
		{both.with("rate", 0), delay, amplitude},
		{both.with("rate", 9, "speed_floor", 1, "points", 10, "order", 1), delay, amplitude},
		{both.with("delay", startDelay+0.001), delay + 0.001, amplitude},
		{both.with("delay_max", 0.011), 0.011, amplitude},
		{both.with("amplitude_max", 1.01), delay, 1.01},
		{[]any{"adapt", "delay"}, delay, 1},
		{[]any{"adapt", "off"}, startDelay, 1},
	} {
		c := learned()
		if err := c.Retune(given(t, both.kind, test.set...)); err != nil {
			t.Fatal(err)
		}
		// 1e-16: a difference of delays, rounded.
		if d, a := value(t, c, "delay"), value(t, c, "amplitude"); math.Abs(d-test.delay) > 1e-16 || a != test.amplitude {
			t.Errorf("%v: delay %v, amplitude %v; want %v, %v", test.set, d, a, test.delay, test.amplitude)
		}
	}
	// noise_gain is that of the fit with the adapted delay, times the amplitude.
	fixed := build(t, tick, both.kind, "delay", delay)
	if got, want := value(t, c, "noise_gain"), amplitude*value(t, fixed, "noise_gain"); math.Abs(got-want) > 1e-14*want {
		t.Errorf("noise gain %v, want %v", got, want)
	}
	// Off and on again: it starts from the delay as set.
	if err := c.Retune(given(t, both.kind)); err != nil {
		t.Fatal(err)
	}
	if err := c.Retune(given(t, both.kind, both.set...)); err != nil {
		t.Fatal(err)
	}
	if d, a := value(t, c, "delay"), value(t, c, "amplitude"); d != startDelay || a != 1 {
		t.Errorf("off and on again: delay %v, amplitude %v", d, a)
	}
}

// Switched off and on again in the midst of a motion that is measured in step, there is no
// error to follow, in the first tick either.
func TestLeastSquaresKeepsStepWhenSwitchedOn(t *testing.T) {
	const tick = 1.0 / 1024
	both := variant{"least-squares-polynomial", []any{"adapt", "delay-and-amplitude"}}
	c := both.build(t, tick)
	for k := range 1000 {
		in := Input{}
		in.X, in.V, _ = motion(float64(k+1) * tick)
		in.Y, _, _ = motion(float64(k) * tick)
		switch k {
		case 300:
			both.set[1] = "off"
		case 700:
			both.set[1] = "delay-and-amplitude"
		}
		if err := c.Retune(given(t, both.kind, both.set...)); err != nil {
			t.Fatal(err)
		}
		c.Command(in)
		if d, a := value(t, c, "delay"), value(t, c, "amplitude"); d != startDelay || a != 1 {
			t.Fatalf("delay %v, amplitude %v in tick %d", d, a, k)
		}
	}
}
