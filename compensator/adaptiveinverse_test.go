package compensator

import (
	"math"
	"testing"
)

// The vectors are a recomputation by cumulative sums where the bounds are out
// of reach, else by the rule for bounds word by word: testdata/vectors.py.
func TestAdaptiveInverseAgainstVectors(t *testing.T) {
	const rate = 256
	bound := []any{"delay", 0.012, "delay_min", 0.004, "delay_max", 0.018}
	for _, test := range []struct {
		file string
		set  []any
	}{
		{"free", []any{"delay", 0.012, "delay_max", maxDelay, "kp", 4e3, "ki", 6e3}},
		{"both", append([]any{"kp", 1.5e5, "ki", 4e5}, bound...)},
		{"integral", append([]any{"kp", 0, "ki", 4e6}, bound...)},
		{"proportional", append([]any{"kp", 3e5, "ki", 0}, bound...)},
	} {
		c := build(t, 1.0/rate, "adaptive-inverse", test.set...)
		want := columns(t, "adaptive_inverse_"+test.file+".csv")
		for k, x := range want["x_next"] {
			u := c.Command(Input{X: x, Y: want["y"][k]})
			// 1e-12: a thousand sums of rounded terms, of size 1.
			if got := value(t, c, "alpha"); math.Abs(got-want["alpha"][k]) > 1e-12 {
				t.Fatalf("%s: alpha %.17g in tick %d, want %.17g", test.file, got, k, want["alpha"][k])
			}
			if math.Abs(u-want["u"][k]) > 1e-13 { // the same, times |x| < 0.1
				t.Fatalf("%s: command %.17g in tick %d, want %.17g", test.file, u, k, want["u"][k])
			}
		}
	}
}

// delayLine is an actuator that is late by whole ticks and otherwise perfect.
type delayLine struct {
	sent []float64
	late int
}

func (d *delayLine) measured() float64 {
	if n := len(d.sent) - 1 - d.late; n >= 0 {
		return d.sent[n]
	}
	return 0
}

func TestAdaptiveInverseFindsAPureDelayAssumedHalfWrong(t *testing.T) {
	const tick, late = 1.0 / 1024, 20
	w := 2 * math.Pi * 1.0
	// TI rests when command and target differ by the delay in phase alone:
	// arg(α − (α−1)·e^(−jω·dt)) = ω·τ. Solved for α:
	tan := math.Tan(w * late * tick)
	want := 1 + tan/(math.Sin(w*tick)-tan*(1-math.Cos(w*tick)))
	for _, factor := range []float64{0.5, 1.5} {
		c := build(t, tick, "adaptive-inverse", "delay", factor*late*tick)
		actuator := delayLine{late: late}
		for k := range 12 * 1024 {
			x := 0.03 * math.Sin(w*tick*float64(k+1))
			actuator.sent = append(actuator.sent, c.Command(Input{X: x, Y: actuator.measured()}))
		}
		// The error of α decays as e^(−t·kp·A²·ω²·dt/2) = e^(−6.9t), below
		// 1e-30 after 12 s; what is left is rounding of α ≈ 21.
		if got := value(t, c, "alpha"); math.Abs(got-want) > 1e-9 {
			t.Errorf("from %v of the delay: alpha %v, want %v", factor, got, want)
		}
		// tan(ωτ)/ω exceeds τ by (ωτ)²/3 of it, 0.5 %, a tenth of a tick.
		if got := value(t, c, "delay"); math.Abs(got-late*tick) > 0.15*tick {
			t.Errorf("from %v of the delay: delay %v s, want %v s", factor, got, late*tick)
		}
	}
}

func TestAdaptiveInverseStaysWithinBoundsAndLeavesThemAtOnce(t *testing.T) {
	const tick = 1.0 / 1024
	for _, gains := range [][]any{{"kp", 4e5, "ki", 0}, {"kp", 4e5, "ki", 1e6}, {"kp", 1e9, "ki", 1e9}} {
		for _, late := range []float64{0.03, -0.03} {
			c := build(t, tick, "adaptive-inverse", append([]any{"delay_min", 0.005, "delay_max", 0.02}, gains...)...).(*AdaptiveInverse)
			delay := func() float64 { return value(t, c, "delay") }
			step := func(k int, late float64) {
				s := float64(k) * tick
				c.Command(Input{
					X: 0.03 * math.Sin(8*(s+tick)),
					Y: 0.03 * math.Sin(8*(s-late)),
				})
				// 1e-15 s: rounding of α times the tick.
				if d := delay(); d < 0.005-1e-15 || d > 0.02+1e-15 {
					t.Fatalf("gains %v, late by %v: delay %v s", gains, late, d)
				}
			}
			// Twenty seconds late, or early, by more than can be compensated.
			for k := range 20 * 1024 {
				step(k, late)
			}
			bound := 0.02
			if late < 0 {
				bound = 0.005
			}
			if d := delay(); math.Abs(d-bound) > 1e-3*bound {
				t.Fatalf("gains %v, late by %v: delay %v s after 20 s, want the bound", gains, late, d)
			}
			// Then the other way: TI turns back at once, and α with it. A
			// tenth of a period is slack for where in the period it turns.
			for k := 20 * 1024; k < 20*1024+80; k++ {
				step(k, -late)
			}
			if d := delay(); math.Abs(d-bound) < 0.1*bound {
				t.Errorf("gains %v, late by %v, then %v: delay still %v s after 78 ms", gains, late, -late, d)
			}
		}
	}
}

func TestAdaptiveInverseOtherGainsDoNotMoveAlpha(t *testing.T) {
	const tick = 1.0 / 1024
	set := []any{"ki", 1e5}
	c := build(t, tick, "adaptive-inverse", set...)
	in := inputs(4000, tick, 0.015)
	for _, i := range in[:2000] {
		c.Command(i)
	}
	before := value(t, c, "alpha")
	for _, other := range [][]any{{"kp", 9e5, "ki", 1e5}, {"kp", 0, "ki", 0}, {"kp", 1e9, "ki", 1e9}, {"ki", 1e5}} {
		if err := c.Retune(given(t, "adaptive-inverse", other...)); err != nil {
			t.Fatal(err)
		}
		if got := value(t, c, "alpha"); got != before {
			t.Errorf("gains %v: alpha %v, before %v", other, got, before)
		}
	}
	// Narrower bounds bring α to the bound, and the next tick keeps it there.
	if err := c.Retune(given(t, "adaptive-inverse", "ki", 1e5, "delay_max", 0.010, "delay_min", 0.010)); err != nil {
		t.Fatal(err)
	}
	for _, i := range in[2000:] {
		c.Command(i)
		if got := value(t, c, "delay"); math.Abs(got-0.010) > 1e-15 {
			t.Fatalf("bounds of 10 ms: delay %v s", got)
		}
	}
}
