package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Taylor predicts the target by the assumed delay τ, s, with its present
// velocity and acceleration (derivative feedforward):
//
//	u_k = x + τ·v + τ²/2·a,
//
// u the command, m; x, v, a the target's displacement, m, velocity, m/s, and
// acceleration, m/s². x and v are those of t_{k+1}; a is the newest that is
// known, which in a hybrid test is that of t_k.
//
// The frequency response from x to u is 1 + jωτ − (ωτ)²/2, the start of the
// series of e^(jωτ); behind a pure delay τ the first thing missing is
// −j(ωτ)³/6. It grows as ω², so noise in the acceleration enters by τ²/2. A
// target at rest is commanded as it is. It is LinearAcceleration with an
// acceleration that stays as it is, and has no history.
type Taylor struct {
	tick  float64
	delay float64
	half  float64 // τ²/2, s²
}

var _ Compensator = (*Taylor)(nil)

var taylorSettings = []kind.Setting{delaySetting("assumed delay τ of the actuator")}

var taylorKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "taylor",
		Doc:      "derivative feedforward: Taylor series of the target to the second order",
		Equation: "u = x + τ·v + τ²/2·a",
		Source:   "common practice: derivative feedforward",
		Settings: taylorSettings,
	},
	New: newTaylor,
}

func newTaylor(tick float64, v kind.Values) (Compensator, error) {
	c := &Taylor{tick: tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	return c, nil
}

// Start does nothing: there is no history.
func (*Taylor) Start(_, _ float64) {}

// Prime does nothing: the method has no past.
func (*Taylor) Prime(Input, float64) {}

// Command returns the predicted target.
func (c *Taylor) Command(in Input) float64 { return in.X + c.delay*in.V + c.half*in.A }

// Retune changes the delay.
func (c *Taylor) Retune(v kind.Values) error {
	if err := check(c.tick, taylorSettings, v); err != nil {
		return err
	}
	c.delay = v.Num("delay")
	c.half = c.delay * c.delay / 2
	return nil
}

// Coefficients appends what velocity (a1, s) and acceleration (a2, s²) are
// multiplied by, and the delay.
func (c *Taylor) Coefficients(dst []Coefficient) []Coefficient {
	return append(dst,
		Coefficient{"a1", c.delay, quantity.Time},
		Coefficient{"a2", c.half, quantity.Dim{Time: 2}},
		Coefficient{"delay", c.delay, quantity.Time})
}
