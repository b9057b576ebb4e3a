package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// DelaySeeking is Polynomial with a delay τ, s, that follows the
// synchronization error (after Darby, Williams & Blakeborough 2002):
//
//	u_k = Σ_{i=0..n} (−1)^i·C(n+1, i+1)·x(t_{k+1} − iτ),
//	dτ/dt = κ·ε,   ε = e·v/(v² + v₀²) bounded to ±(delay_max − delay_min),
//
// u the command and x the target, m; e = x_k − y_k the target less the
// measured displacement, m, and v the target's velocity, m/s, both at t_k; κ
// the rate, 1/s; v₀ the speed_floor, m/s. Late (e of the sign of v) makes τ
// longer. Where |v| is well above v₀, ε is how late the actuator is, and τ
// goes there as e^(−κt); where it is below, the error counts for less and less
// and at rest for nothing, so that noise does not make τ wander.
//
// τ stays within delay_min … delay_max and moves no faster than κ times their
// distance, whatever is measured. As the error shows what τ does only after
// the actuator's delay, κ must stay well below 0.4 over that delay.
//
// Between ticks x goes straight from one target to the next. Before Start has
// been called target and measured count as 0 for ever.
type DelaySeeking struct {
	tick, rate float64 // tick, s, and ticks a second
	order      int
	weight     [maxOrder + 1]float64
	delay      follower
	past       history
	x, v       float64 // target displacement and velocity at t_k
}

var _ Compensator = (*DelaySeeking)(nil)

// speedFloor is the speed below which synchronization is judged less and
// less, m/s, where none is given: at 1 Hz, an amplitude of 1.6 mm.
const speedFloor = 10e-3

// The rate at which a delay follows where none is given, 1/s, and the highest.
const startRate, maxRate = 2, 20

func rateSetting(doc string) kind.Setting {
	return kind.Number("rate", quantity.Frequency, doc).Default(startRate).Range(0, maxRate)
}

func speedFloorSetting() kind.Setting {
	return kind.Number("speed_floor", quantity.Velocity, "target speed v₀ below which the error counts less and less").Default(speedFloor).Range(1e-6, 10)
}

var delaySeekingSettings = []kind.Setting{
	kind.Integer("order", "order n of the polynomial").Default(3).Range(0, maxOrder),
	delaySetting("delay τ assumed at the start"),
	rateSetting("rate κ at which the delay follows the error, a second"),
	speedFloorSetting(),
	kind.Number("delay_min", quantity.Time, "smallest delay that may be adapted to").Default(0).Range(0, maxDelay),
	kind.Number("delay_max", quantity.Time, "largest delay that may be adapted to").Default(50e-3).Range(0, maxDelay),
}

var delaySeekingKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "delay-seeking",
		Doc:      "polynomial whose delay follows the synchronization error",
		Equation: "u = Σ_{i=0..n} (−1)^i·C(n+1, i+1)·x(t − iτ), dτ/dt = κ·e·v/(v² + v₀²), bounded",
		Source:   "after Darby, Williams & Blakeborough 2002",
		Settings: delaySeekingSettings,
	},
	New: newDelaySeeking,
}

func newDelaySeeking(tick float64, v kind.Values) (Compensator, error) {
	c := &DelaySeeking{tick: tick, rate: 1 / tick}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	c.past = newHistory(maxOrder * maxDelay / tick)
	c.Start(0, 0)
	return c, nil
}

// Start makes all past targets x and the delay the assumed
// one.
func (c *DelaySeeking) Start(x, _ float64) {
	c.past.fill(x)
	c.delay.restart()
	c.x, c.v = x, 0
}

// Prime keeps the target; the delay stays the assumed one.
func (c *DelaySeeking) Prime(in Input, _ float64) {
	c.past.push(in.X)
	c.x, c.v = in.X, in.V
}

// Command adapts the delay to the newest measurement and returns the weighted
// sum of present and past targets.
func (c *DelaySeeking) Command(in Input) float64 {
	c.delay.follow(c.x-in.Y, c.v, 1)
	c.x, c.v = in.X, in.V
	c.past.push(in.X)
	u := c.weight[0] * in.X
	back := c.delay.value * c.rate
	ago := back
	for _, w := range c.weight[1 : c.order+1] {
		u += w * c.past.at(ago)
		ago += back
	}
	return u
}

// Retune changes the settings. Another start delay shifts the adapted one by
// the difference; another rate or floor acts from now on and leaves it where
// it is; narrower bounds bring it to the bound.
func (c *DelaySeeking) Retune(v kind.Values) error {
	if err := check(c.tick, delaySeekingSettings, v); err != nil {
		return err
	}
	if err := checkDelays(v); err != nil {
		return err
	}
	c.order = v.Int("order")
	c.weight = polynomialWeights(c.order)
	c.delay.retune(v.Num("delay"), v.Num("rate")*c.tick, v.Num("speed_floor"), v.Num("delay_min"), v.Num("delay_max"))
	return nil
}

// Coefficients appends the weights c0 to cn and the adapted delay.
func (c *DelaySeeking) Coefficients(dst []Coefficient) []Coefficient {
	for i, w := range c.weight[:c.order+1] {
		dst = append(dst, Coefficient{weightNames[i], w, quantity.None})
	}
	return append(dst, Coefficient{"delay", c.delay.value, quantity.Time})
}
