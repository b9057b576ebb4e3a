package compensator

import (
	"math"
	"math/rand/v2"
	"testing"
)

// wide removes all rate limits and bounds that could act.
var wide = []any{"amplitude_min", 0.1, "amplitude_max", 10, "delay_max", maxDelay, "amplitude_rate", 1000, "delay_rate", 1000}

// The vectors are SciPy's lstsq on the filtered rows of the window, tick by
// tick, in a closed loop with a lagging, delayed actuator and a noisy sensor:
// testdata/vectors.py.
func TestAdaptiveTimeSeriesAgainstLeastSquares(t *testing.T) {
	set := append([]any{"delay", 0.010, "window", 0.25, "cutoff", 20, "threshold", 0.004}, wide...)
	c := build(t, 1.0/256, "adaptive-time-series", set...)
	want := columns(t, "adaptive_time_series.csv")
	for k := range want["x"] {
		u := c.Command(Input{X: want["x"][k], V: want["v"][k], A: want["a"][k], Y: want["y"][k]})
		// Normal equations square the condition of the columns, some 30, so
		// 1e3 roundings of 1e-16 over 64 rows; a₂ is small beside its column.
		for name, tol := range map[string]float64{"a0": 1e-11, "a1": 1e-12, "a2": 1e-13} {
			if got := value(t, c, name); math.Abs(got-want[name][k]) > tol {
				t.Fatalf("%s = %.17g in tick %d, want %.17g", name, got, k, want[name][k])
			}
		}
		if math.Abs(u-want["u"][k]) > 1e-12 {
			t.Fatalf("command %.17g in tick %d, want %.17g", u, k, want["u"][k])
		}
	}
}

// lagging is an actuator with gain g, whole ticks of delay and then a
// first-order lag T, exact for a command that ramps from tick to tick:
// with s = (b−a)/dt, y ← (y − g(a − sT))·e^(−dt/T) + g(b − sT).
type lagging struct {
	delayLine
	gain, lag, tick float64
	from, y         float64
}

func (l *lagging) act(u float64) {
	l.sent = append(l.sent, u)
	b := l.delayLine.measured()
	s := (b - l.from) / l.tick
	l.y = (l.y-l.gain*(l.from-s*l.lag))*math.Exp(-l.tick/l.lag) + l.gain*(b-s*l.lag)
	l.from = b
}

// track runs a compensator in front of an actuator with the given target and
// returns the normalised tracking error over the last half.
func track(c Compensator, l *lagging, ticks int, noise float64, target func(float64) (x, v, a float64)) float64 {
	rng := rand.New(rand.NewPCG(8, 9))
	e, n := 0.0, 0.0
	for k := range ticks {
		s := float64(k+1) * l.tick
		x, v, _ := target(s)
		_, _, a := target(s - l.tick)
		y := l.y
		if noise > 0 {
			y += noise * rng.NormFloat64()
		}
		l.act(c.Command(Input{X: x, V: v, A: a, Y: y}))
		if k > ticks/2 {
			e += (l.y - x) * (l.y - x)
			n += x * x
		}
	}
	return math.Sqrt(e / n)
}

func TestAdaptiveTimeSeriesFindsTheActuator(t *testing.T) {
	const tick = 1.0 / 2048
	for _, test := range []struct {
		name         string
		start        float64 // assumed delay, s
		late         int     // ticks
		lag, gain    float64
		noise, delay float64 // noise rms, m; tolerance on the delay, s
		tolerance    float64 // on the gain
		nrmse        float64
	}{
		// Delay within a tick, as far as a second-order series can be right:
		// at 3.1 Hz and 14 ms its next term is (ωτ)³/6 = 0.3 %, and a tenth
		// of that of the whole motion.
		{"late", 0.002, 16, 0.006, 1, 0, tick, 0.002, 0.001},
		{"early", 0.030, 16, 0.006, 1, 0, tick, 0.002, 0.001},
		{"weak", 0.010, 10, 0.004, 0.85, 0, tick, 0.002, 0.001},
		{"strong", 0.010, 10, 0.004, 1.2, 0, tick, 0.002, 0.001},
		// A sensor of 0.05 mm rms beside 20 mm rms of motion.
		{"noisy", 0.002, 16, 0.006, 1, 5e-5, tick, 0.003, 0.0015},
	} {
		c := build(t, tick, "adaptive-time-series", "delay", test.start)
		l := &lagging{delayLine: delayLine{late: test.late}, gain: test.gain, lag: test.lag, tick: tick}
		nrmse := track(c, l, 10*2048, test.noise, motion)
		want := float64(test.late)*tick + test.lag
		delay, gain := value(t, c, "delay"), value(t, c, "gain")
		t.Logf("%s: delay %.4f ms of %.4f, gain %.5f of %v, tracking error %.2e", test.name, 1e3*delay, 1e3*want, gain, test.gain, nrmse)
		if math.Abs(delay-want) > test.delay {
			t.Errorf("%s: delay %v s, want %v s", test.name, delay, want)
		}
		if math.Abs(gain-test.gain) > test.tolerance {
			t.Errorf("%s: gain %v, want %v", test.name, gain, test.gain)
		}
		if nrmse > test.nrmse {
			t.Errorf("%s: tracking error %v", test.name, nrmse)
		}
	}
}

// In a pure sine a₀ − a₂ω² is all that can be known of the two.
func TestAdaptiveTimeSeriesDoesNotWanderInASine(t *testing.T) {
	const tick, amplitude, f = 1.0 / 1024, 0.03, 1.5
	w := 2 * math.Pi * f
	sine := func(s float64) (x, v, a float64) {
		sin, cos := math.Sincos(w * s)
		return amplitude * sin, amplitude * w * cos, -amplitude * w * w * sin
	}
	for _, noise := range []float64{0, 5e-5} {
		c := build(t, tick, "adaptive-time-series", "delay", 0.004)
		l := &lagging{delayLine: delayLine{late: 8}, gain: 0.95, lag: 0.005, tick: tick}
		nrmse := track(c, l, 10*1024, noise, sine)
		a0, a2 := value(t, c, "a0"), value(t, c, "a2")
		// What the actuator needs at this frequency:
		// (1+jωT)·e^(jωτ)/g = (a₀ − a₂ω²) + jωa₁.
		sin, cos := math.Sincos(w * 8 * tick)
		re, im := (cos-w*l.lag*sin)/l.gain, (sin+w*l.lag*cos)/l.gain
		t.Logf("noise %v: a₀ %.5f, a₂ %.3e, tracking error %.2e; in band %.6f %.6f, want %.6f %.6f",
			noise, a0, a2, nrmse, a0-a2*w*w, w*value(t, c, "a1"), re, im)
		tol := 2e-5 // differences taken for derivatives: (ω·dt)²/6 = 1.4e-5
		if noise > 0 {
			tol = 1e-3 // a window of noise at 0.24 % of the signal, through the filter
		}
		if math.Abs(a0-a2*w*w-re) > tol || math.Abs(w*value(t, c, "a1")-im) > tol {
			t.Errorf("noise %v: in band %v, %v; want %v, %v", noise, a0-a2*w*w, w*value(t, c, "a1"), re, im)
		}
		// The acceleration that the command uses is a tick old: a₂ω³·dt = 7e-5.
		if nrmse > 1e-4+tol {
			t.Errorf("noise %v: tracking error %v", noise, nrmse)
		}
		// Minutes later the pair has not drifted apart. Without noise it
		// stands still; with it, the pull keeps a₂ about the pure delay's.
		for range 10 {
			track(c, l, 10*1024, noise, sine)
			b0, b2 := value(t, c, "a0"), value(t, c, "a2")
			if noise == 0 && (math.Abs(b0-a0) > 1e-6 || math.Abs(b2-a2) > 1e-8) {
				t.Fatalf("no noise: a₀ %v, a₂ %v, were %v, %v", b0, b2, a0, a2)
			}
			tied := value(t, c, "delay") * value(t, c, "a1") / 2
			if math.Abs(b2-tied) > 0.5*tied {
				t.Fatalf("noise %v: a₂ %v, far from a₁²/(2a₀) = %v", noise, b2, tied)
			}
		}
	}
}

func TestQuietTeachesNothing(t *testing.T) {
	const tick = 1.0 / 1024
	rng := rand.New(rand.NewPCG(5, 6))
	c := build(t, tick, "adaptive-time-series")
	for _, in := range inputs(3000, tick, 0.02) {
		c.Command(in)
	}
	// Standing 15 mm off, thus far above the threshold, but still.
	for k := range 20 * 1024 {
		before := c.Coefficients(nil)
		c.Command(Input{X: 0.015, V: 1e-4 * rng.NormFloat64(), Y: 0.015 + 1e-4*rng.NormFloat64()})
		if k < 1024+200 { // the window, and the filter's settling
			continue
		}
		for i, q := range c.Coefficients(nil) {
			if q != before[i] {
				t.Fatalf("%s went from %v to %v in tick %d of quiet", q.Name, before[i].Value, q.Value, k)
			}
		}
	}
}

func TestRatesAndBoundsHoldWhateverIsMeasured(t *testing.T) {
	const tick = 1.0 / 512
	for _, set := range [][]any{
		nil,
		{"amplitude_min", 0.95, "amplitude_max", 1.02, "delay_min", 0.008, "delay_max", 0.012},
		{"amplitude_rate", 0, "delay_rate", 0},
		{"amplitude_rate", 3, "delay_rate", 2, "window", 0.05},
	} {
		c := build(t, tick, "adaptive-time-series", append([]any{"threshold", 1e-6}, set...)...)
		v := given(t, "adaptive-time-series", set...)
		rng := rand.New(rand.NewPCG(2, 7))
		moved := false
		a0, delay, a2 := value(t, c, "a0"), value(t, c, "delay"), value(t, c, "a2")
		y, scale := 0.0, 0.1
		for k := range 20000 {
			if k%500 == 0 {
				scale = math.Pow(10, 4*rng.Float64()-3)
			}
			x, xv, xa := motion(float64(k) * tick)
			y = 0.9*y + scale*rng.NormFloat64()
			u := c.Command(Input{X: x, V: xv, A: xa, Y: y})
			if math.IsNaN(u) || math.Abs(u) > 1 {
				t.Fatalf("%v: command %v in tick %d", set, u, k)
			}
			b0, bDelay, b2 := value(t, c, "a0"), value(t, c, "delay"), value(t, c, "a2")
			const round = 1e-15 // of numbers of size 1
			if b0 < v.Num("amplitude_min")-round || b0 > v.Num("amplitude_max")+round ||
				bDelay < v.Num("delay_min")-round || bDelay > v.Num("delay_max")+round ||
				b2 < 0 || b2 > v.Num("delay_max")*v.Num("delay_max")+round {
				t.Fatalf("%v: out of bounds in tick %d: a₀ %v, delay %v, a₂ %v", set, k, b0, bDelay, b2)
			}
			if math.Abs(b0-a0) > v.Num("amplitude_rate")*tick+round ||
				math.Abs(bDelay-delay) > v.Num("delay_rate")*tick+round ||
				math.Abs(b2-a2) > v.Num("delay_max")*v.Num("delay_rate")*tick+round {
				t.Fatalf("%v: too fast in tick %d: a₀ %v to %v, delay %v to %v, a₂ %v to %v", set, k, a0, b0, delay, bDelay, a2, b2)
			}
			moved = moved || b0 != a0
			a0, delay, a2 = b0, bDelay, b2
		}
		if moved == (v.Num("amplitude_rate") == 0) {
			t.Errorf("%v: a₀ moved: %v", set, moved)
		}
	}
}

// With every limit out of the way nothing but the data holds the
// coefficients, and there is no step when the window has first filled.
func TestNoJumpWhenTheWindowFirstFills(t *testing.T) {
	const tick = 1.0 / 1024
	c := build(t, tick, "adaptive-time-series", wide...)
	l := &lagging{delayLine: delayLine{late: 8}, gain: 1, lag: 0.005, tick: tick}
	a0, delay := 1.0, startDelay
	for k := range 2048 {
		s := float64(k+1) * tick
		x, v, _ := motion(s)
		_, _, a := motion(s - tick)
		l.act(c.Command(Input{X: x, V: v, A: a, Y: l.y}))
		b0, bDelay := value(t, c, "a0"), value(t, c, "delay")
		// One row of a thousand changes: a thousandth of what the fit is
		// uncertain by, some per cent and some tenths of a millisecond.
		if k >= 900 && k < 1200 && (math.Abs(b0-a0) > 1e-4 || math.Abs(bDelay-delay) > 1e-6) {
			t.Fatalf("tick %d: a₀ from %v to %v, delay from %v to %v", k, a0, b0, delay, bDelay)
		}
		a0, delay = b0, bDelay
	}
}

func TestAdaptiveTimeSeriesRetune(t *testing.T) {
	const tick = 1.0 / 1024
	for _, test := range []struct {
		name       string
		set        []any
		da0, delay float64 // what the change itself implies
	}{
		{"cutoff", []any{"cutoff", 35}, 0, 0},
		{"longer window", []any{"window", 2}, 0, 0},
		{"shorter window", []any{"window", 0.5}, 0, 0},
		{"threshold", []any{"threshold", 0.005}, 0, 0},
		{"rates", []any{"amplitude_rate", 0, "delay_rate", 0}, 0, 0},
		{"delay", []any{"delay", 0.011}, 0, 0.001},
		{"gain", []any{"gain", 0.98}, 1/0.98 - 1, 0},
	} {
		c := build(t, tick, "adaptive-time-series")
		twin := build(t, tick, "adaptive-time-series")
		l := &lagging{delayLine: delayLine{late: 8}, gain: 0.97, lag: 0.005, tick: tick}
		var i Input // of the next tick
		for k := range 5000 {
			i.X, i.V, _ = motion(float64(k+1) * tick)
			_, _, i.A = motion(float64(k) * tick)
			i.Y = l.y + 1e-5*math.Sin(float64(k*k)) // a little disturbance
			if k < 4999 {
				l.act(c.Command(i))
				twin.Command(i)
			}
		}
		a0, delay := value(t, c, "a0"), value(t, c, "delay")
		if err := c.Retune(given(t, "adaptive-time-series", test.set...)); err != nil {
			t.Fatal(err)
		}
		// 1e-15: sums of numbers of size 1.
		if d := value(t, c, "a0") - a0; math.Abs(d-test.da0) > 1e-15 {
			t.Errorf("%s: a₀ moved by %v, want %v", test.name, d, test.da0)
		}
		if d := value(t, c, "delay") - delay; math.Abs(d-test.delay) > 1e-15 {
			t.Errorf("%s: delay moved by %v, want %v", test.name, d, test.delay)
		}
		// Then no tick moves faster than the rates allow (default or 0),
		// wherefore the first command differs by those and the change alone.
		rate0, rate1 := 0.5*tick, 0.1*tick
		limit := (math.Abs(test.da0)+rate0)*math.Abs(i.X) + (1.1*math.Abs(test.delay)+rate1+0.05*(math.Abs(test.da0)+rate0))*math.Abs(i.V) + 2e-5*math.Abs(i.A)
		if jump := math.Abs(c.Command(i) - twin.Command(i)); jump > limit {
			t.Errorf("%s: jump of %v m, the change implies at most %v m", test.name, jump, limit)
		}
	}
}

// After another cutoff the rows that the new filters spoil while they settle
// must not get into the window.
func TestAnotherCutoffTeachesNothingWrong(t *testing.T) {
	const tick = 1.0 / 1024
	set := wide
	c := build(t, tick, "adaptive-time-series", set...)
	l := &lagging{delayLine: delayLine{late: 8}, gain: 1, lag: 0.005, tick: tick}
	var low, high [2]float64 // of the delay, before and after
	low[0], low[1] = 1, 1
	for k := range 8 * 1024 {
		s := float64(k+1) * tick
		x, v, _ := motion(s)
		_, _, a := motion(s - tick)
		l.act(c.Command(Input{X: x, V: v, A: a, Y: l.y}))
		if k == 4*1024 {
			if err := c.Retune(given(t, "adaptive-time-series", append([]any{"cutoff", 35}, set...)...)); err != nil {
				t.Fatal(err)
			}
		}
		if k > 2*1024 {
			d, after := value(t, c, "delay"), k/(4*1024)
			low[after], high[after] = min(low[after], d), max(high[after], d)
		}
	}
	// The fit varies with what is in the window, by some 10 µs, before as
	// after; 5 µs is slack for the gap in it. Spoilt rows would move it by
	// 40 µs.
	if low[1] < low[0]-5e-6 || high[1] > high[0]+5e-6 {
		t.Errorf("delay %v to %v s before, %v to %v s after", low[0], high[0], low[1], high[1])
	}
}

// In y = e^(st) all three columns are proportional, ẏ = sy and ÿ = s²y: only
// a₀ + a₁s + a₂s² can be known, and there is no ground to move a₁ or a₂.
func TestGrowthAloneMovesNoDelay(t *testing.T) {
	const tick, rate, late = 1.0 / 1024, 6.0, 12
	c := build(t, tick, "adaptive-time-series", append([]any{"delay", late * tick}, wide...)...)
	at := func(k int) float64 { return 1e-11 * math.Exp(rate*tick*float64(k)) }
	for k := range 4000 { // to 0.15 m, above the threshold in the last second
		x := at(k)
		// Measured is the target that was meant for this instant.
		c.Command(Input{X: x, V: rate * x, A: rate * rate * at(k-1), Y: at(k - 1)})
		// A tenth of a tick: differences are s(1 + (s·dt)²/6), and the floor
		// holds a₁ against that.
		if d := value(t, c, "delay"); math.Abs(d-late*tick) > 0.1*tick {
			t.Fatalf("tick %d: delay %v s, was %v s", k, d, late*tick)
		}
	}
	if c.(*AdaptiveTimeSeries).win.run.yy < 1e-3 {
		t.Error("the motion never was large enough to learn from")
	}
}

// On a ramp the acceleration is rounding alone, and that must not place a₂.
func TestARampDoesNotPlaceA2(t *testing.T) {
	const tick, late = 1.0 / 1024, 12
	c := build(t, tick, "adaptive-time-series", append([]any{"delay", late * tick}, wide...)...)
	l := &lagging{delayLine: delayLine{late: late}, gain: 1, lag: 1e-6, tick: tick}
	for k := range 5000 {
		x := 0.1 * tick * float64(k+1)
		l.act(c.Command(Input{X: x, V: 0.1, Y: l.y}))
		// For the first windows the kink at the start tells something.
		if k > 3000 {
			a2, tied := value(t, c, "a2"), value(t, c, "delay")*value(t, c, "a1")/2
			if math.Abs(a2-tied) > 1e-3*tied { // rounding beside the floor
				t.Fatalf("tick %d: a₂ %v, for a pure delay %v", k, a2, tied)
			}
		}
	}
}

func TestMeasuredBeyondAllMeasureIsSurvived(t *testing.T) {
	const tick = 1.0 / 1024
	c := build(t, tick, "adaptive-time-series", "cutoff", 200, "window", 0.1)
	l := &lagging{delayLine: delayLine{late: 8}, gain: 1, lag: 0.005, tick: tick}
	for k := range 8 * 1024 {
		i := Input{Y: l.y}
		i.X, i.V, _ = motion(float64(k+1) * tick)
		_, _, i.A = motion(float64(k) * tick)
		if k == 2000 { // its square is no number any more
			i.Y = 1e200
		}
		u := c.Command(i)
		if !(math.Abs(u) < 0.2) {
			t.Fatalf("command %v in tick %d", u, k)
		}
		l.act(u)
	}
	// Half a tick: within a tick, and the window is but a tenth of a second.
	if d := value(t, c, "delay"); math.Abs(d-(8*tick+0.005)) > 0.5*tick {
		t.Errorf("delay %v s in the end", d)
	}
}
