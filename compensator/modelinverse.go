package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// ModelInverse feeds the target through the inverse of a model of the
// actuator, a gain g, a dead time τ, s, and a first-order lag T, s,
//
//	G(s) = g·e^(−sτ)/(1 + Ts),
//
// expanded in powers of s up to the order n of 1 to 3 (model-based
// feedforward: Carrion & Spencer 2007, Phillips & Spencer 2013, who invert a
// fitted polynomial in s in the same way):
//
//	(1 + Ts)·e^(sτ)/g = a₀ + a₁s + a₂s² + a₃s³ + …,
//	a₀ = 1/g, a₁ = (T+τ)/g, a₂ = (Tτ + τ²/2)/g, a₃ = (Tτ²/2 + τ³/6)/g,
//	u_k = a₀·x + a₁·v + a₂·a + a₃·j,
//
// u the command, m; x, v, a, j the target's displacement, m, velocity, m/s,
// acceleration, m/s², and jerk, m/s³. x and v are those of t_{k+1}; a is the
// newest that is known, which in a hybrid test is that of t_k; j is the
// backward difference of a over a tick, thus that of half a tick before.
//
// The frequency response from x to u is
//
//	a₀ + jωa₁ − ω²·(a₂ + a₃·(1 − e^(−jω·dt))/dt)
//
// as far as the order goes. It grows as ωⁿ. Of order 3, white noise of the
// acceleration enters with the rms √2·a₃/dt, to be held against a₂: with
// 14 ms in all, at 2048 Hz, some ten times as much. Order 2 is the default
// for that.
//
// A target at rest is commanded by 1/g times itself. Before Start has been
// called the previous acceleration counts as 0, as it does after it.
type ModelInverse struct {
	tick           float64
	gain           float64
	a0, a1, a2, a3 float64
	jerk           float64 // a₃/dt, s²
	a              float64 // acceleration one tick ago
	order          int
}

var _ Compensator = (*ModelInverse)(nil)

var modelInverseSettings = []kind.Setting{
	kind.Number("gain", quantity.None, "gain g of the actuator").Default(1).Range(0.5, 2),
	delaySetting("dead time τ of the actuator"),
	kind.Number("lag", quantity.Time, "time constant T of the actuator's first-order lag").Default(0).Range(0, maxDelay),
	kind.Integer("order", "highest derivative n: 1 velocity, 2 acceleration, 3 jerk").Default(2).Range(1, 3),
}

var modelInverseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "model-inverse",
		Doc:      "inverse of gain, dead time and lag, as a series in the target's derivatives",
		Equation: "u = (1/g)·(x + (T+τ)·v + (Tτ+τ²/2)·a + (Tτ²/2+τ³/6)·j), as far as order n",
		Source:   "Carrion & Spencer 2007; Phillips & Spencer 2013",
		Settings: modelInverseSettings,
	},
	New: newModelInverse,
}

func newModelInverse(tick float64, v kind.Values) (Compensator, error) {
	c := &ModelInverse{tick: tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	return c, nil
}

// Start makes the previous acceleration 0.
func (c *ModelInverse) Start(_, _ float64) { c.a = 0 }

// Prime keeps the past target; a fixed method learns nothing.
func (c *ModelInverse) Prime(in Input, _ float64) { c.Command(in) }

// Command returns the target through the inverse of the model.
func (c *ModelInverse) Command(in Input) float64 {
	change := in.A - c.a
	c.a = in.A
	return c.a0*in.X + c.a1*in.V + c.a2*in.A + c.jerk*change
}

// Retune changes the model or the order; the next command is what the new
// settings would have given had they held all along.
func (c *ModelInverse) Retune(v kind.Values) error {
	if err := check(c.tick, modelInverseSettings, v); err != nil {
		return err
	}
	c.gain, c.order = v.Num("gain"), v.Int("order")
	tau, lag := v.Num("delay"), v.Num("lag")
	c.a0, c.a1, c.a2, c.a3 = 1/c.gain, (lag+tau)/c.gain, 0, 0
	if c.order >= 2 {
		c.a2 = (lag + tau/2) * tau / c.gain
	}
	if c.order >= 3 {
		c.a3 = (lag/2 + tau/6) * tau * tau / c.gain
	}
	c.jerk = c.a3 / c.tick
	return nil
}

var modelInverseNames = [4]string{"a0", "a1", "a2", "a3"}

// Coefficients appends a0 to an, the whole delay a₁/a₀ = T+τ that is made up
// for, and the gain.
func (c *ModelInverse) Coefficients(dst []Coefficient) []Coefficient {
	values := [4]float64{c.a0, c.a1, c.a2, c.a3}
	for i, a := range values[:c.order+1] {
		dst = append(dst, Coefficient{modelInverseNames[i], a, quantity.Dim{Time: int8(i)}})
	}
	return append(dst,
		Coefficient{"delay", c.a1 * c.gain, quantity.Time},
		Coefficient{"gain", c.gain, quantity.None})
}
