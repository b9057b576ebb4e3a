package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// LinearAcceleration predicts the target by the assumed delay τ, s, with an
// acceleration that goes on as the straight line through its present value
// and the one τ ago (Horiuchi & Konno 2001):
//
//	u_k = x + τ·v + τ²·(2/3·a − 1/6·a(t−τ)),
//
// u the command, m; x, v, a the target's displacement, m, velocity, m/s, and
// acceleration, m/s². It is the double integral of
// a(t+s) = a + (a − a(t−τ))·s/τ over s from 0 to τ: the constant part gives
// a·τ²/2, the line (a − a(t−τ))·τ²/6, together τ²·(2/3·a − 1/6·a(t−τ)).
//
// x and v are those of t_{k+1}. a is the newest that is known, which in a
// hybrid test is that of t_k, because the force of t_{k+1} is still to come;
// the command lacks dt·τ²/2 times the jerk by that. a(t−τ) is τ before the
// newest known; between ticks a goes straight from one value to the next, so
// with τ = (d+φ)·dt it is (1−φ)·a_{−d} + φ·a_{−d−1}.
//
// The frequency response from x to u, with v = jωx and a = −ω²x, is
//
//	1 + jωτ − ω²τ²·(2/3 − 1/6·e^(−jωd·dt)·((1−φ) + φ·e^(−jω·dt))).
//
// It grows as ω², so noise in the acceleration enters by up to 5/6·τ². A
// motion of constant jerk is predicted exactly, if a is that of t_{k+1}. A
// target at rest is commanded as it is. Before the start the acceleration
// counts as 0 for ever.
type LinearAcceleration struct {
	tick   float64
	delay  float64
	ago    float64 // τ in ticks
	now    float64 // 2/3·τ², s²
	before float64 // 1/6·τ², s²
	past   history // of the acceleration
}

var _ Compensator = (*LinearAcceleration)(nil)

var linearAccelerationSettings = []kind.Setting{delaySetting("assumed delay τ of the actuator")}

var linearAccelerationKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "linear-acceleration",
		Doc:      "predicts the target with an acceleration that goes on in a straight line",
		Equation: "u = x + τ·v + τ²·(2/3·a − 1/6·a(t − τ))",
		Source:   "Horiuchi & Konno 2001",
		Settings: linearAccelerationSettings,
	},
	New: newLinearAcceleration,
}

func newLinearAcceleration(tick float64, v kind.Values) (Compensator, error) {
	c := &LinearAcceleration{tick: tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	c.past = newHistory(maxDelay / tick)
	return c, nil
}

// Start makes all past accelerations 0.
func (c *LinearAcceleration) Start(_, _ float64) { c.past.fill(0) }

// Prime keeps the past target; a fixed method learns nothing.
func (c *LinearAcceleration) Prime(in Input, _ float64) { c.Command(in) }

// Command returns the predicted target.
func (c *LinearAcceleration) Command(in Input) float64 {
	c.past.push(in.A)
	return in.X + c.delay*in.V + (c.now*in.A - c.before*c.past.at(c.ago))
}

// Retune changes the delay. The history reaches back far enough for the
// longest, so the next command is what the new delay would have given had it
// held all along.
func (c *LinearAcceleration) Retune(v kind.Values) error {
	if err := check(c.tick, linearAccelerationSettings, v); err != nil {
		return err
	}
	c.delay = v.Num("delay")
	c.ago = c.delay / c.tick
	square := c.delay * c.delay
	c.now, c.before = square*(2.0/3), square/6
	return nil
}

// Coefficients appends what velocity (a1, s), newest acceleration (a2, s²)
// and the one τ ago (b2, s²) are multiplied by, and the delay.
func (c *LinearAcceleration) Coefficients(dst []Coefficient) []Coefficient {
	return append(dst,
		Coefficient{"a1", c.delay, quantity.Time},
		Coefficient{"a2", c.now, quantity.Dim{Time: 2}},
		Coefficient{"b2", -c.before, quantity.Dim{Time: 2}},
		Coefficient{"delay", c.delay, quantity.Time})
}
