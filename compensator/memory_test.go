package compensator

import (
	"math"
	"testing"
)

// remembered reads what a compensator carries, recall writes it.
func remembered(c Compensator) (values []float64) {
	c.Memory(func(v *float64) { values = append(values, *v) })
	return values
}

func recall(c Compensator, values []float64) {
	c.Memory(func(v *float64) { *v, values = values[0], values[1:] })
}

// One whose memory is set to that of another goes on as that one does, to the last
// bit: every kind, the adaptive ones frozen after they have learned.
func TestMemory(t *testing.T) {
	const tick = 1.0 / 1024
	in := inputs(6000, tick, 0.017)
	for _, v := range variants() {
		for _, delay := range []float64{0, 0.0137, 12 * tick} {
			nameValue := []any{"delay", delay}
			if v.kind == "none" {
				nameValue = nil
			}
			learned := v.build(t, tick, nameValue...)
			for _, x := range in[:3000] {
				learned.Command(x)
			}
			a, b := Frozen(learned), Frozen(learned)
			if _, learns := learned.(Adaptive); !learns {
				b = v.build(t, tick, nameValue...)
			}
			for _, x := range in[3000:4000] {
				a.Command(x)
			}
			b.Start(1, 1)
			for _, x := range in[:7] { // rings need not stand alike
				b.Command(x)
			}
			recall(b, remembered(a))
			for k, x := range in[4000:] {
				if ua, ub := a.Command(x), b.Command(x); ua != ub {
					t.Fatalf("%s, delay %g: command %v in tick %d, of the one that was set %v", v, delay, ua, k, ub)
				}
			}
		}
	}
}

// Frozen is what an adaptive method is when it learns no more: the same commands as
// its own with learning set to nothing.
func TestFrozen(t *testing.T) {
	const tick = 1.0 / 1024
	in := inputs(9000, tick, 0.017)
	stop := map[string][]any{
		"least-squares-polynomial": {"rate", 0.0}, "delay-seeking": {"rate", 0.0},
		"adaptive-inverse": {"kp", 0.0, "ki", 0.0}, "adaptive-time-series": {"threshold", 1.0},
	}
	for _, v := range adaptive {
		c := v.build(t, tick)
		for _, x := range in[:5000] {
			c.Command(x)
		}
		f := c.(Adaptive).Frozen()
		if err := c.Retune(given(t, v.kind, v.with(stop[v.kind]...)...)); err != nil {
			t.Fatal(err)
		}
		f.Start(0, 0)
		for k, x := range in[5000:] {
			a, b := c.Command(x), f.Command(x)
			if k > 1000 && math.Abs(a-b) > 1e-15 { // the longest history is full
				t.Fatalf("%s: command %v, frozen %v in tick %d", v, a, b, k)
			}
		}
		was, is := c.Coefficients(nil), f.Coefficients(nil)
		if v.kind != "adaptive-inverse" && len(was) != len(is) {
			t.Errorf("%s: coefficients %v, frozen %v", v, was, is)
		}
		for i := range is {
			if math.Abs(is[i].Value-was[i].Value) > 1e-12*math.Abs(was[i].Value) {
				t.Errorf("%s: %s is %v, frozen %v", v, is[i].Name, was[i].Value, is[i].Value)
			}
		}
	}
}
