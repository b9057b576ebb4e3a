package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var lagDelayKind = kind.Entry[NewActuator]{
	Kind: kind.Kind{
		Name:     "lag-delay",
		Doc:      "first-order lag behind a dead time, the usual model of a well tuned actuator",
		Equation: "T·ẏ + y = g·u(t−τ)",
		Source:   "Horiuchi et al. 1999 (delay); Mercan & Ricles 2007; first-order lag, common practice",
		Settings: []kind.Setting{
			kind.Number("delay", quantity.Time, "dead time τ between command and answer").Default(0).Range(0, 1),
			kind.Number("lag", quantity.Time, "time constant T of the answer").Default(0).Range(0, 1),
			kind.Number("gain", quantity.None, "static gain g, displacement over command").Default(1).Range(0.01, 10),
		},
	},
	New: newLagDelay,
}

// lagDelay is a first-order lag behind a dead time,
//
//	T·ẏ + y = g·u(t−τ),
//
// y the displacement, m; u the commanded signal, m; T the lag, s; τ the delay,
// s; g the gain. Transfer function: g·e^(−sτ)/(1 + Ts).
//
// It is advanced exactly. The delayed signal has one knot inside each tick, φ·h
// after its start (see delayLine); on each of the two pieces the answer to a
// straight line is known in closed form (see straight). Both pieces together
// make one tick linear in the state and in the delayed commands
// c = g·u_{k−n}, b = g·u_{k−n−1}, a = g·u_{k−n−2}, n the whole ticks of τ:
//
//	y ← E·y + w_c·c + w_b·b + w_a·a,   E + w_c + w_b + w_a = 1,   E = e^(−h/T).
//
// What is carried from tick to tick is the distance q = y − c behind the delayed
// command,
//
//	q ← E·q + (E + w_b)·(b − c) + w_a·(a − c),   y = c + q,
//
// so that an actuator at rest stays there exactly and the tick is short.
//
// The velocity at the end of the tick obeys the same equation with the slope of
// the delayed signal on the right (Ramp), or jumps by (c − b)/T at the knot and
// decays (Step). Either way
//
//	v ← E·v + s_c·(c − b) + s_b·(b − a),
//
// which equals (g·u(t−τ) − y)/T without its cancellation at small T. With
// T = 0 it is (c − b)/h, the slope of the last ramp piece, or the mean velocity
// of the jump.
//
// Start-up: the history is the first command, held for ever.
// There is no saturation.
type lagDelay struct {
	line delayLine // of g·u
	gain float64

	instant bool    // T = 0
	onTick  bool    // T = 0, and φ = 0 or Step: y = c
	e       float64 // E
	wb, wa  float64 // E + w_b and w_a
	sc, sb  float64 // 1/s
	q, v    float64 // m behind c, m/s
	lag     float64 // as set, s
}

var _ Actuator = (*lagDelay)(nil)

func newLagDelay(t Timing, v kind.Values) (Actuator, error) {
	line, err := newDelayLine(t, v.Num("delay"))
	if err != nil {
		return nil, err
	}
	p := &lagDelay{line: line, lag: v.Num("lag"), gain: v.Num("gain")}
	switch {
	case !(p.lag >= 0) || math.IsInf(p.lag, 0):
		return nil, fmt.Errorf("lag: %v s is not a time of at least 0", p.lag)
	case p.gain == 0 || math.IsNaN(p.gain) || math.IsInf(p.gain, 0):
		return nil, fmt.Errorf("gain: %v is no gain that could move a specimen", p.gain)
	}
	p.instant, p.onTick = p.lag == 0, p.lag == 0 && (line.phi == 0 || t.Hold == Step)
	if t.Hold == Ramp {
		p.weighRamp(line.phi)
	} else {
		p.weighStep(line.phi)
	}
	return p, nil
}

// weighRamp sets the weights for commands joined by straight lines: the
// delayed signal starts the tick at φa + (1−φ)b, passes b at the knot and ends
// at φb + (1−φ)c.
func (p *lagDelay) weighRamp(phi float64) {
	h := p.line.tick
	e1, a1, b1 := straight(phi*h, p.lag)
	e2, a2, b2 := straight((1-phi)*h, p.lag)
	p.e = flush(e1 * e2)
	p.wa = flush(e2 * a1 * phi)
	p.wb = flush(p.e + e2*(a1*(1-phi)+b1) + a2 + b2*phi)
	if p.instant {
		p.sc = 1 / h
		return
	}
	p.sc = flush(-math.Expm1(-(1-phi)*h/p.lag) / h)
	p.sb = flush(-e2 * math.Expm1(-phi*h/p.lag) / h)
}

// weighStep sets the weights for commands held from tick to tick: the delayed
// signal is b up to the knot and c behind it.
func (p *lagDelay) weighStep(phi float64) {
	h := p.line.tick
	if p.instant {
		p.sc = 1 / h
		return
	}
	e2 := math.Exp(-(1 - phi) * h / p.lag)
	p.e = flush(math.Exp(-h / p.lag))
	p.wb = flush(e2) // e^(−h/T) and e2·(1 − e^(−φh/T))
	p.sc = flush(e2 / p.lag)
}

func (p *lagDelay) Start(u float64, s *Specimen) (y float64) {
	y = p.gain * u
	p.line.start(y)
	p.q, p.v = 0, 0
	s.Start(y)
	return y
}

func (p *lagDelay) Advance(u float64, s *Specimen) (y, v float64) {
	c, b, a := p.line.push(p.gain * u)
	switch {
	case p.onTick:
		y, v = c, p.sc*(c-b)
	case p.instant:
		y, v = c+p.wb*(b-c), p.sc*(c-b)
	default:
		p.q = p.e*p.q + (p.wb*(b-c) + p.wa*(a-c))
		p.v = p.e*p.v + (p.sc*(c-b) + p.sb*(b-a))
		y, v = c+p.q, p.v
	}
	s.Advance(y, v, p.line.tick)
	return y, v
}
