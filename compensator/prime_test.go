package compensator

import (
	"math"
	"testing"
)

// motionAt is a target of two sines, and a measurement that is late, with
// nothing to do with any command.
func motionAt(k int) Input {
	const tick = 1.0 / 2048
	x := func(t float64) float64 { return 0.02*math.Sin(9*t) + 0.004*math.Sin(31*t) }
	t := float64(k) * tick
	v := (x(t+tick) - x(t-tick)) / (2 * tick)
	a := (x(t+tick) - 2*x(t) + x(t-tick)) / (tick * tick)
	return Input{X: x(t), V: v, A: a, Y: 0.9 * x(t-0.02)}
}

// A fixed method that was primed goes on as if it had commanded all along. An
// adaptive one has the same history but has learned nothing from errors that
// were another's; only the time series learns, from what was commanded.
func TestPrime(t *testing.T) {
	const past = 3000
	learns := map[string]bool{"adaptive-inverse": true, "delay-seeking": true, "adaptive-time-series": true}
	for _, name := range Kinds.Names() {
		build := func() Compensator {
			entry, err := Kinds.Find(name)
			if err != nil {
				t.Fatal(err)
			}
			v, err := entry.Resolve(nil)
			if err != nil {
				t.Fatal(err)
			}
			c, err := entry.New(1.0/2048, v)
			if err != nil {
				t.Fatal(err)
			}
			c.Start(0, 0)
			return c
		}
		primed, ran := build(), build()
		start := primed.Coefficients(nil)
		for k := range past {
			in := motionAt(k)
			primed.Prime(in, in.X)
			ran.Command(in)
		}
		now := primed.Coefficients(nil)
		for i := range start {
			if name != "adaptive-time-series" && now[i] != start[i] {
				t.Errorf("%s: %s moved from %g to %g while primed", name, now[i].Name, start[i].Value, now[i].Value)
			}
		}
		if name == "adaptive-time-series" {
			// The plant of motionAt answers 0.9 of the command 20 ms late.
			for _, c := range now {
				if c.Name == "gain" && math.Abs(c.Value-0.9) > 0.01 || c.Name == "delay" && math.Abs(c.Value-0.02) > 0.001 {
					t.Errorf("%s: learned %s = %g", name, c.Name, c.Value)
				}
			}
		}
		if learns[name] {
			continue
		}
		for k := past; k < past+500; k++ {
			if a, b := primed.Command(motionAt(k)), ran.Command(motionAt(k)); a != b {
				t.Fatalf("%s: %d ticks after priming %g, having run %g", name, k-past, a, b)
			}
		}
	}
}
