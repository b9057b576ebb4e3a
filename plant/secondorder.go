package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var secondOrderKind = kind.Entry[NewActuator]{
	Kind: kind.Kind{
		Name:     "second-order",
		Doc:      "second-order lag behind a dead time: an actuator whose answer bends or rings",
		Equation: "ÿ + 2ζωẏ + ω²y = ω²·g·u(t−τ), ω = 2π·frequency",
		Source:   "second-order transfer function of a controlled actuator, common practice; dead time after Horiuchi et al. 1999",
		Settings: []kind.Setting{
			kind.Number("frequency", quantity.Frequency, "undamped natural frequency of the answer").Default(25).Range(0.01, 1e5),
			kind.Number("damping_ratio", quantity.None, "damping ratio ζ of the answer").Default(0.7).Range(0.001, 100),
			kind.Number("delay", quantity.Time, "dead time τ between command and answer").Default(0).Range(0, 1),
			kind.Number("gain", quantity.None, "static gain g, displacement over command").Default(1).Range(0.01, 10),
		},
	},
	New: newSecondOrder,
}

// secondOrder is a second-order lag behind a dead time,
//
//	ÿ + 2ζωẏ + ω²y = ω²·g·u(t−τ),
//
// y the displacement, m; u the commanded signal, m; ω the undamped natural
// frequency, rad/s; ζ the damping ratio; τ the delay, s; g the gain. Transfer
// function: g·e^(−sτ)/(1 + 2ζs/ω + s²/ω²); at low frequency it is late by
// τ + 2ζ/ω.
//
// It is advanced exactly, by matrix exponentials over the two straight pieces
// that the delayed signal has in each tick (see delayLine and swing). Both
// together make one tick linear in displacement, velocity and the delayed
// commands c = g·u_{k−n}, b = g·u_{k−n−1}, a = g·u_{k−n−2}, n the whole ticks of
// τ. What is carried from tick to tick is the distance q = y − c behind the
// delayed command and the velocity v,
//
//	(q, v) ← Φ·(q, v) + β·(b − c) + α·(a − c),   y = c + q,
//
// so that an actuator at rest stays there exactly.
//
// Start-up: the history is the first command, held for ever.
// There is no saturation.
type secondOrder struct {
	line delayLine // of g·u
	gain float64

	ofQ, ofV pair // the columns of Φ
	ofB, ofA pair // β and α
	q, v     float64
}

var _ Actuator = (*secondOrder)(nil)

func newSecondOrder(t Timing, v kind.Values) (Actuator, error) {
	line, err := newDelayLine(t, v.Num("delay"))
	if err != nil {
		return nil, err
	}
	p := &secondOrder{line: line, gain: v.Num("gain")}
	omega, zeta := angular(v.Num("frequency")), v.Num("damping_ratio")
	switch {
	case !(omega > 0) || math.IsInf(omega, 0):
		return nil, fmt.Errorf("frequency: %v Hz is not above 0", v.Num("frequency"))
	case !(zeta >= 0) || math.IsInf(zeta, 0):
		return nil, fmt.Errorf("damping_ratio: %v is not at least 0", zeta)
	case p.gain == 0 || math.IsNaN(p.gain) || math.IsInf(p.gain, 0):
		return nil, fmt.Errorf("gain: %v is no gain that could move a specimen", p.gain)
	}
	p.weigh(omega, zeta)
	return p, nil
}

// weigh joins the answers to both pieces.
func (p *secondOrder) weigh(omega, zeta float64) {
	before, behind := p.line.pieces()
	first, second := swinging(omega, zeta, before.d), swinging(omega, zeta, behind.d)
	p.ofQ, p.ofV = second.of(first.ofY), second.of(first.ofV)
	p.ofB = second.of(first.ofFrom).times(before.from.b).
		plus(second.of(first.ofTo), before.to.b).
		plus(second.ofFrom, behind.from.b).
		plus(second.ofTo, behind.to.b)
	p.ofA = second.of(first.ofFrom).times(before.from.a)
	// The distance is measured from c now and was from b before.
	p.ofB = p.ofB.plus(p.ofQ, 1)
}

func (p *secondOrder) Start(u float64, s *Specimen) (y float64) {
	y = p.gain * u
	p.line.start(y)
	p.q, p.v = 0, 0
	s.Start(y)
	return y
}

func (p *secondOrder) Advance(u float64, s *Specimen) (y, v float64) {
	c, b, a := p.line.push(p.gain * u)
	bc, ac := b-c, a-c
	q := (p.ofQ.y*p.q + p.ofV.y*p.v) + (p.ofB.y*bc + p.ofA.y*ac)
	v = (p.ofQ.v*p.q + p.ofV.v*p.v) + (p.ofB.v*bc + p.ofA.v*ac)
	p.q, p.v, y = q, v, c+q
	s.Advance(y, v, p.line.tick)
	return y, v
}
