package compensator

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// LeastSquaresPolynomial fits a polynomial of order N to the newest M targets
// by least squares and commands what it will be an assumed delay τ, s, after
// the newest (Wallace, Wagg & Neild 2005):
//
//	u_k = A·Σ_{i=0..M−1} w_i(τ)·x(t_{k+1} − i·dt),
//
// u the command and x the target, m; A a plain amplitude factor, 1 unless it
// adapts. The M points are consecutive ticks, as published, so they span
// (M−1)·dt, and the same M is another method at another rate.
//
// The weights come from polynomials p_j that are orthonormal on the points
// (Gram polynomials): with s the time in ticks from the middle of the points,
//
//	p_0 = 1/√M,   s·p_j = β_{j+1}·p_{j+1} + β_j·p_{j−1},
//	β_j = j/2·√((M² − j²)/(4j² − 1)),
//	b_j = Σ_i p_j(s_i)·x(s_i),   u_k = A·Σ_{j=0..N} p_j(s_e)·b_j,
//
// s_e = (M−1)/2 + τ/dt. Hence w_i = Σ_j p_j(s_e)·p_j(s_i): it is linear in the
// targets, predicts a polynomial in time of order N exactly, and commands a
// target at rest as it is (A = 1). The frequency response from x to u is
// A·Σ w_i·e^(−jωi·dt).
//
// White noise in the target comes out of it √(Σ w_i²) = √(Σ_j p_j(s_e)²) times
// as large; Coefficients calls that noise_gain. It grows as (τ/((M−1)·dt))^N:
// at 2048 Hz and 14 ms, order 2, it is 17 with 16 points and 3 with 40. On the
// other side the curve fits a long span worse: what a motion of angular
// frequency ω lacks grows as (ω·(τ + (M−1)·dt))^(N+1). The default of 40
// points suits 2048 Hz and thereabouts; at a lower rate take fewer.
//
// adapt says what follows the synchronization error e = x_k − y_k, target less
// measured at t_k, m (adaptive forward prediction):
//
//	"off"                 τ is the delay and A is 1
//	"delay"               dτ/dt = κ·e·v/(v² + v₀²), bounded to ±κ·(delay_max − delay_min)
//	"delay-and-amplitude" and dA/dt = κ·w·e·x/(x² + x₀²), bounded likewise
//
// x and v being the target and its velocity at t_k, κ the rate, 1/s, v₀ the
// speed_floor, m/s, x₀ the displacement_floor, m. Late makes τ longer, weak
// makes A larger. Where |v| is well above v₀ τ goes to its value as e^(−κt),
// at rest it stays, and A likewise. Standing still off the middle a target
// shows nothing of the dynamic gain; so w = m/(m + v₀²), with m the mean square
// of v fading over 0.25 s. τ stays within delay_min … delay_max, A within
// amplitude_min … amplitude_max. As the error shows what the parameters do
// only after the actuator's delay, κ must stay well below 0.4 over that delay.
//
// Before Start has been called target and measured count as 0 for ever.
type LeastSquaresPolynomial struct {
	tick, rate    float64 // tick, s, and ticks a second
	order, points int
	adapt         adaptation

	edge   float64                             // (M−1)/2
	first  float64                             // p_0
	beta   [maxFitOrder + 1]float64            // β_j
	invert [maxFitOrder + 1]float64            // 1/β_j
	basis  [maxFitOrder + 1][maxPoints]float64 // p_j(s_i), the oldest first
	weight [maxPoints]float64                  // w of the assumed delay, likewise

	delay, amplitude follower
	activity         float64 // m, (m/s)²
	fade             float64 // part of m that a tick renews
	floor            float64 // v₀²
	x, v             float64 // target displacement and velocity at t_k

	// The targets, each held twice, a ring length apart, so that the newest
	// are in one piece wherever the head is.
	ring [2 * fitRing]float64
	head int // in the second half
}

const (
	maxFitOrder = 5
	maxPoints   = 200
	fitRing     = 256 // a power of two, no less than maxPoints
)

// adaptation is what of LeastSquaresPolynomial adapts.
type adaptation int

const (
	adaptNothing adaptation = iota
	adaptDelay
	adaptDelayAndAmplitude
)

var adaptations = []string{"off", "delay", "delay-and-amplitude"} // by adaptation

// activityTime is how long motion counts as motion, s.
const activityTime = 0.25

var _ Compensator = (*LeastSquaresPolynomial)(nil)

var leastSquaresPolynomialSettings = []kind.Setting{
	kind.Integer("order", "order N of the polynomial").Default(2).Range(0, maxFitOrder),
	kind.Integer("points", "number M of targets that are fitted, the newest ticks; more than the order").Default(40).Range(2, maxPoints),
	delaySetting("delay τ ahead of the newest target, or assumed at the start"),
	kind.Word("adapt", "what follows the synchronization error", adaptations...),
	rateSetting("rate κ at which delay and amplitude follow the error, a second"),
	speedFloorSetting(),
	kind.Number("displacement_floor", quantity.Length, "target displacement x₀ below which the error says less of the amplitude").Default(1e-3).Range(1e-6, 1),
	kind.Number("delay_min", quantity.Time, "smallest delay that may be adapted to").Default(0).Range(0, maxDelay),
	kind.Number("delay_max", quantity.Time, "largest delay that may be adapted to").Default(50e-3).Range(0, maxDelay),
	kind.Number("amplitude_min", quantity.None, "smallest amplitude factor A").Default(0.7).Range(0.1, 1),
	kind.Number("amplitude_max", quantity.None, "largest amplitude factor A").Default(1.4).Range(1, 10),
}

var leastSquaresPolynomialKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "least-squares-polynomial",
		Doc:      "polynomial fitted to many past targets, evaluated the delay ahead; delay and amplitude may adapt",
		Equation: "u = A·P(t + τ), min Σ_{i=0..M−1} (P(t − i·dt) − x(t − i·dt))², P of order N",
		Source:   "Wallace, Wagg & Neild 2005",
		Settings: leastSquaresPolynomialSettings,
	},
	New: newLeastSquaresPolynomial,
}

func newLeastSquaresPolynomial(tick float64, v kind.Values) (Compensator, error) {
	c := &LeastSquaresPolynomial{tick: tick, rate: 1 / tick, head: fitRing}
	if err := c.Retune(v); err != nil {
		return nil, err
	}
	c.Start(0, 0)
	return c, nil
}

// Start makes all past targets x, the delay the assumed one
// and the amplitude 1.
func (c *LeastSquaresPolynomial) Start(x, _ float64) {
	for i := range c.ring {
		c.ring[i] = x
	}
	c.delay.restart()
	c.amplitude.restart()
	c.activity, c.x, c.v = 0, x, 0
}

// Prime keeps the target; delay and amplitude stay the assumed ones.
func (c *LeastSquaresPolynomial) Prime(in Input, _ float64) {
	c.push(in.X)
	if c.adapt == adaptDelayAndAmplitude {
		c.activity += c.fade * (c.v*c.v - c.activity)
	}
	c.x, c.v = in.X, in.V
}

// push takes a target into the points.
func (c *LeastSquaresPolynomial) push(x float64) {
	c.head = fitRing + (c.head+1)&(fitRing-1)
	c.ring[c.head], c.ring[c.head-fitRing] = x, x
}

// Command adapts to the newest measurement and returns the fitted polynomial
// ahead of the newest target.
func (c *LeastSquaresPolynomial) Command(in Input) float64 {
	c.push(in.X)
	targets := c.ring[c.head+1-c.points : c.head+1]
	if c.adapt == adaptNothing {
		c.x, c.v = in.X, in.V
		return dot(c.weight[:c.points], targets)
	}

	e := c.x - in.Y
	c.delay.follow(e, c.v, 1)
	if c.adapt == adaptDelayAndAmplitude {
		c.activity += c.fade * (c.v*c.v - c.activity)
		c.amplitude.follow(e, c.x, c.activity/(c.activity+c.floor))
	}
	c.x, c.v = in.X, in.V
	p := c.ahead(c.delay.value)
	u := 0.0
	for j := 0; j <= c.order; j++ {
		u += p[j] * dot(c.basis[j][:c.points], targets)
	}
	return c.amplitude.value * u
}

// ahead returns p_0 to p_N at a delay after the newest point.
func (c *LeastSquaresPolynomial) ahead(delay float64) (p [maxFitOrder + 1]float64) {
	return c.polynomials(c.edge + delay*c.rate)
}

// polynomials returns p_0 to p_N at s ticks from the middle of the points.
func (c *LeastSquaresPolynomial) polynomials(s float64) (p [maxFitOrder + 1]float64) {
	last := 0.0 // β_j·p_{j−1}
	p[0] = c.first
	for j := 0; j < c.order; j++ {
		p[j+1] = (s*p[j] - last) * c.invert[j+1]
		last = c.beta[j+1] * p[j]
	}
	return p
}

// dot is Σ a_i·b_i; b is at least as long as a. Several sums side by side need
// not wait for each other's additions.
func dot(a, b []float64) float64 {
	var s0, s1, s2, s3 float64
	for len(a) >= 8 && len(b) >= 8 {
		x, y := (*[8]float64)(a), (*[8]float64)(b)
		s0 += x[0]*y[0] + x[4]*y[4]
		s1 += x[1]*y[1] + x[5]*y[5]
		s2 += x[2]*y[2] + x[6]*y[6]
		s3 += x[3]*y[3] + x[7]*y[7]
		a, b = a[8:], b[8:]
	}
	for i := range min(len(a), len(b)) {
		s0 += a[i] * b[i]
	}
	return (s0 + s1) + (s2 + s3)
}

// Retune changes the settings. All past targets that any settings need are
// held, so another fit acts at once as if it had held all along. Another
// delay shifts an adapted one by the difference; another rate or floor acts
// from now on; narrower bounds bring delay and amplitude to the bound. What
// no longer adapts goes back to the delay as set, and to the amplitude 1; a
// rate of 0 holds what was learned instead.
func (c *LeastSquaresPolynomial) Retune(v kind.Values) error {
	if err := check(c.tick, leastSquaresPolynomialSettings, v); err != nil {
		return err
	}
	order, points := v.Int("order"), v.Int("points")
	if points <= order {
		return fmt.Errorf("points: %d is not above order, %d", points, order)
	}
	var adapt adaptation
	for i, word := range adaptations {
		if word == v.Text("adapt") {
			adapt = adaptation(i)
		}
	}
	if adapt != adaptNothing {
		if err := checkDelays(v); err != nil {
			return err
		}
	}
	c.adapt = adapt
	c.setParameters(v)
	c.setBasis(order, points)
	return nil
}

// setParameters sets how delay and amplitude adapt.
func (c *LeastSquaresPolynomial) setParameters(v kind.Values) {
	c.floor = v.Num("speed_floor") * v.Num("speed_floor")
	c.fade = min(1, c.tick/activityTime)
	step := v.Num("rate") * c.tick
	if c.adapt == adaptNothing {
		c.delay.hold(v.Num("delay"))
	} else {
		c.delay.retune(v.Num("delay"), step, v.Num("speed_floor"), v.Num("delay_min"), v.Num("delay_max"))
	}
	if c.adapt == adaptDelayAndAmplitude {
		c.amplitude.retune(1, step, v.Num("displacement_floor"), v.Num("amplitude_min"), v.Num("amplitude_max"))
	} else {
		c.amplitude.hold(1)
	}
}

// setBasis works out the polynomials on the points, and the weights for the
// assumed delay.
func (c *LeastSquaresPolynomial) setBasis(order, points int) {
	c.order, c.points = order, points
	c.edge = float64(points-1) / 2
	c.first = 1 / math.Sqrt(float64(points))
	for j := 1; j <= order; j++ {
		a, m := float64(j), float64(points)
		c.beta[j] = a / 2 * math.Sqrt((m*m-a*a)/(4*a*a-1))
		c.invert[j] = 1 / c.beta[j]
	}
	end := c.ahead(c.delay.start)
	for i := range points {
		p := c.polynomials(float64(i) - c.edge)
		c.weight[i] = 0
		for j := 0; j <= order; j++ {
			c.basis[j][i] = p[j]
			c.weight[i] += end[j] * p[j]
		}
	}
}

// Coefficients appends the delay, the amplitude factor A, the actuator's gain
// 1/A that it stands for, and the amplification of white noise.
func (c *LeastSquaresPolynomial) Coefficients(dst []Coefficient) []Coefficient {
	p := c.ahead(c.delay.value)
	sum := 0.0
	for _, x := range p[:c.order+1] {
		sum += x * x
	}
	return append(dst,
		Coefficient{"delay", c.delay.value, quantity.Time},
		Coefficient{"amplitude", c.amplitude.value, quantity.None},
		Coefficient{"gain", 1 / c.amplitude.value, quantity.None},
		Coefficient{"noise_gain", c.amplitude.value * math.Sqrt(sum), quantity.None})
}
