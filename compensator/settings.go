package compensator

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// maxDelay is the longest delay that any method accepts, s. Servo-hydraulic
// loops answer within some tens of milliseconds; half a second leaves room
// for slow rigs and bounds the history that must be held.
const maxDelay = 0.5

// startDelay is the delay that is assumed where none is given, s.
const startDelay = 10e-3

// minTick is the shortest tick that a compensator accepts, s. It bounds the
// history in ticks, hence the memory.
const minTick = 1e-6

// delaySetting is the setting that nearly every method has.
func delaySetting(doc string) kind.Setting {
	return kind.Number("delay", quantity.Time, doc).Default(startDelay).Range(0, maxDelay)
}

// check judges the tick, and every value against its setting, so that no
// constructor meets a value that its arithmetic cannot bear. The error names
// the setting.
func check(tick float64, settings []kind.Setting, v kind.Values) error {
	if math.IsNaN(tick) || math.IsInf(tick, 0) || tick < minTick {
		return fmt.Errorf("tick: %v s is not at least %v s", tick, minTick)
	}
	for i := range settings {
		s := &settings[i]
		value, ok := v[s.Name]
		if !ok {
			return fmt.Errorf("%s: no value, allowed is %s", s.Name, s.Allowed())
		}
		if err := s.Check(value); err != nil {
			return fmt.Errorf("%s: %w", s.Name, err)
		}
	}
	return nil
}

// checkDelays judges the bounds of an adapted delay and its start.
func checkDelays(v kind.Values) error {
	start, lo, hi := v.Num("delay"), v.Num("delay_min"), v.Num("delay_max")
	show := func(s float64) string { return quantity.Short(s, quantity.Time) }
	switch {
	case lo > hi:
		return fmt.Errorf("delay_min: %s is above delay_max, %s", show(lo), show(hi))
	case start < lo:
		return fmt.Errorf("delay: %s is below delay_min, %s", show(start), show(lo))
	case start > hi:
		return fmt.Errorf("delay: %s is above delay_max, %s", show(start), show(hi))
	}
	return nil
}

// ringSize returns the smallest power of two that is at least n.
func ringSize(n int) int {
	size := 1
	for size < n {
		size *= 2
	}
	return size
}

// clamp bounds v to lo..hi. NaN stays NaN.
func clamp(v, lo, hi float64) float64 {
	if v < lo {
		return lo
	}
	if v > hi {
		return hi
	}
	return v
}

// approach goes from one value towards another, by no more than step.
func approach(from, to, step float64) float64 {
	d := to - from
	if d > step {
		return from + step
	}
	if d < -step {
		return from - step
	}
	return to
}
