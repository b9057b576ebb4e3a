package excitation

import (
	"fmt"
	"math"
)

// clock counts samples. The instant of sample k is k·step by one
// multiplication: a sum of steps would drift by rounding over a day.
type clock struct {
	k    int64
	step float64 // s
}

// tick returns the instant of the next sample, s.
func (c *clock) tick() float64 {
	t := float64(c.k) * c.step
	c.k++
	return t
}

// clock checks what every source must know of the run and starts its clock.
func (c Context) clock() (clock, error) {
	if !(c.Step > 0) || math.IsInf(c.Step, 0) {
		return clock{}, fmt.Errorf("step: %v s between samples; it must be above zero", c.Step)
	}
	if !(c.Duration > 0) || math.IsInf(c.Duration, 0) {
		return clock{}, fmt.Errorf("duration: %v s; it must be above zero", c.Duration)
	}
	if c.Drives < Ground || c.Drives > Target {
		return clock{}, fmt.Errorf("drives: value %d has no meaning", int(c.Drives))
	}
	return clock{step: c.Step}, nil
}

// The frequencies that settings may take, Hz.
const (
	lowestFrequency  = 0.001
	highestFrequency = 200
)

// longest is the longest time that a setting may take, s: one day.
const longest = 86400
