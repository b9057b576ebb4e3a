package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Inverse takes the actuator for one that covers, within a tick dt, the part
// 1/α of the way from where it is to its command, and inverts that (Chen &
// Ricles 2009):
//
//	u_k = α·x_{k+1} − (α−1)·x_k,   α = 1 + τ/dt,
//
// x the target and u the command, m, τ the assumed delay, s. That is the
// target plus τ times its backward difference. The frequency response is
// α − (α−1)·e^(−jω·dt), for slow motion 1 + jωτ; it grows with ω, to 2α−1 at
// half the rate, so noise in the target is amplified. At τ = 0 the command is
// the target; a target at rest is commanded as it is.
//
// Before Start has been called the previous target counts as 0.
type Inverse struct {
	tick  float64
	delay float64
	alpha float64
	x     float64 // x_k, the target one tick ago
}

var _ Compensator = (*Inverse)(nil)

var inverseSettings = []kind.Setting{delaySetting("assumed delay τ of the actuator")}

var inverseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "inverse",
		Doc:      "inverts a discrete first-order model of the actuator",
		Equation: "u_k = α·x_{k+1} − (α−1)·x_k, α = 1 + τ/dt",
		Source:   "Chen & Ricles 2009",
		Settings: inverseSettings,
	},
	New: newInverse,
}

func newInverse(tick float64, v kind.Values) (Compensator, error) {
	c := &Inverse{tick: tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	return c, nil
}

// Start makes the previous target x.
func (c *Inverse) Start(x, _ float64) { c.x = x }

// Prime keeps the past target; a fixed method learns nothing.
func (c *Inverse) Prime(in Input, _ float64) { c.Command(in) }

// Command returns the target led by the delay.
func (c *Inverse) Command(in Input) float64 {
	u := c.alpha*in.X - (c.alpha-1)*c.x
	c.x = in.X
	return u
}

// Retune changes the delay; the next command moves by the change of delay
// times the target's backward difference.
func (c *Inverse) Retune(v kind.Values) error {
	if err := check(c.tick, inverseSettings, v); err != nil {
		return err
	}
	c.delay = v.Num("delay")
	c.alpha = 1 + c.delay/c.tick
	return nil
}

// Coefficients appends alpha and the delay.
func (c *Inverse) Coefficients(dst []Coefficient) []Coefficient {
	return append(dst,
		Coefficient{"alpha", c.alpha, quantity.None},
		Coefficient{"delay", c.delay, quantity.Time})
}
