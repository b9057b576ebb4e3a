package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// AdaptiveInverse is Inverse with an α that follows the tracking indicator
// (Chen & Ricles 2010):
//
//	u_k = α·x_{k+1} − (α−1)·x_k,
//	α   = α₀ + kp·TI + ki·∫TI dt,   α₀ = 1 + τ/dt,
//
// x the target and u the command, m; τ the delay assumed at the start, s; dt
// the tick, s; kp in 1/m², ki in 1/(m²·s). TI is the running enclosed area
// ½∮(x dy − y dx), m², of measured y against target x at the same instants
// (Mercan & Ricles 2007), positive when the actuator is late. From tick to
// tick, along the straight line between the two points, it grows by exactly
//
//	½·(x_{k−1}·y_k − x_k·y_{k−1}),
//
// and α for u_k knows TI up to t_k. The integral is the sum of TI·dt.
//
// α stays within 1 + delay_min/dt … 1 + delay_max/dt. When a tick would carry
// it past a bound, the integral stops (its increment is dropped if TI pushes
// outwards); if α is still outside, TI loses just what is needed to put α on
// the bound, so that the first motion that asks for the other direction moves
// α at once. With kp = 0 TI does not enter α directly; there its increment is
// dropped while it pushes outwards at a bound.
//
// The law is not made free of the size of the motion: with kp alone, in a sine
// of amplitude A, m, and ω, rad/s, an error of α decays as e^(−rt),
// r = kp·A²·ω²·dt/2. For a motion k times as large take kp/k². r must stay well
// below 0.4 over the actuator's delay, or α overshoots; the default makes it
// 4 per second at 1.5 Hz, 20 mm and 2048 Hz. Off the middle, noise n of the
// sensor shows in α as ½·kp·x·n; it does not add up.
//
// Before Start has been called target and measured count as 0 for ever.
type AdaptiveInverse struct {
	tick   float64
	start  float64 // α₀
	kp, ki float64
	lo, hi float64 // bounds of α

	alpha float64
	base  float64 // α − kp·TI − ki·∫TI dt; α₀ until gains or bounds change
	ti    float64 // TI, m²
	sum   float64 // ∫TI dt, m²·s
	xOld  float64 // x_{k−1}
	x     float64 // x_k
	y     float64 // y_{k−1}
}

var _ Compensator = (*AdaptiveInverse)(nil)

var adaptiveInverseSettings = []kind.Setting{
	delaySetting("delay τ assumed at the start"),
	kind.Number("kp", quantity.PerArea, "gain on the tracking indicator; for a motion twice as large take a quarter").Default(4e5).Range(0, 1e9),
	kind.Number("ki", quantity.PerAreaTime, "gain on the integral of the tracking indicator").Default(0).Range(0, 1e9),
	kind.Number("delay_min", quantity.Time, "smallest delay that may be adapted to").Default(0).Range(0, maxDelay),
	kind.Number("delay_max", quantity.Time, "largest delay that may be adapted to").Default(50e-3).Range(0, maxDelay),
}

var adaptiveInverseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "adaptive-inverse",
		Doc:      "inverse compensation whose delay follows the tracking indicator",
		Equation: "u_k = α·x_{k+1} − (α−1)·x_k, α = 1 + τ/dt + kp·TI + ki·∫TI dt, bounded",
		Source:   "Chen & Ricles 2010; tracking indicator TI: Mercan & Ricles 2007",
		Settings: adaptiveInverseSettings,
	},
	New: newAdaptiveInverse,
}

func newAdaptiveInverse(tick float64, v kind.Values) (Compensator, error) {
	c := &AdaptiveInverse{tick: tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	c.Start(0, 0)
	return c, nil
}

// Start makes all past targets x, all measurements y, and α the assumed one.
func (c *AdaptiveInverse) Start(x, y float64) {
	c.alpha, c.base = c.start, c.start
	c.ti, c.sum = 0, 0
	c.xOld, c.x, c.y = x, x, y
}

// Prime keeps target and measurement; α stays the assumed one.
func (c *AdaptiveInverse) Prime(in Input, _ float64) { c.xOld, c.x, c.y = c.x, in.X, in.Y }

// Command adapts α to the newest measurement and returns the target led by
// the adapted delay.
func (c *AdaptiveInverse) Command(in Input) float64 {
	c.adapt(0.5 * (c.xOld*in.Y - c.x*c.y))
	u := c.alpha*in.X - (c.alpha-1)*c.x
	c.xOld, c.x, c.y = c.x, in.X, in.Y
	return u
}

// adapt moves α by one tick in which TI grew by so many m².
func (c *AdaptiveInverse) adapt(growth float64) {
	ti := c.ti + growth
	sum := c.sum + ti*c.tick
	alpha := c.base + c.kp*ti + c.ki*sum
	switch {
	case alpha > c.hi:
		c.adaptAt(c.hi, 1, growth)
	case alpha < c.lo:
		c.adaptAt(c.lo, -1, growth)
	default:
		c.alpha, c.ti, c.sum = alpha, ti, sum
	}
}

// adaptAt is adapt where α would pass a bound; out is the sign of outwards.
func (c *AdaptiveInverse) adaptAt(bound, out, growth float64) {
	ti := c.ti + growth
	if ti*out <= 0 {
		c.sum += ti * c.tick
	}
	alpha := c.base + c.kp*ti + c.ki*c.sum
	if (alpha-bound)*out > 0 && c.kp > 0 {
		// Not less the surplus: beyond all numbers nothing would be left.
		ti = (bound - c.base - c.ki*c.sum) / c.kp
	}
	c.alpha = clamp(alpha, c.lo, c.hi)
	if c.kp == 0 && growth*out > 0 {
		ti = c.ti
	}
	c.ti = ti
}

// Retune changes the settings. Another start delay shifts the adapted one by
// the difference; other gains act on what TI does from now on and leave α
// where it is; narrower bounds bring α to the bound.
func (c *AdaptiveInverse) Retune(v kind.Values) error {
	if err := check(c.tick, adaptiveInverseSettings, v); err != nil {
		return err
	}
	if err := checkDelays(v); err != nil {
		return err
	}
	start := 1 + v.Num("delay")/c.tick
	kp, ki := v.Num("kp"), v.Num("ki")
	lo, hi := 1+v.Num("delay_min")/c.tick, 1+v.Num("delay_max")/c.tick
	alpha := clamp(c.alpha+(start-c.start), lo, hi)
	if kp != c.kp || ki != c.ki || alpha != c.alpha {
		c.base = alpha - kp*c.ti - ki*c.sum
	}
	c.alpha, c.start, c.kp, c.ki, c.lo, c.hi = alpha, start, kp, ki, lo, hi
	return nil
}

// Coefficients appends the adapted alpha and the delay that it stands for.
func (c *AdaptiveInverse) Coefficients(dst []Coefficient) []Coefficient {
	return append(dst,
		Coefficient{"alpha", c.alpha, quantity.None},
		Coefficient{"delay", (c.alpha - 1) * c.tick, quantity.Time})
}
