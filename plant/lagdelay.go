package plant

import (
	"fmt"
	"math"
	"math/bits"

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

const (
	// nearTick is how near, in ticks, a delay must be to a whole number of
	// ticks to be taken for it. Settings carry some 1e-16 of rounding, and a
	// nanotick is far below what any test could tell.
	nearTick = 1e-9
	// mostTicks bounds the history that a delay may ask for: 128 MiB.
	mostTicks = 1 << 24
)

// lagDelay is a first-order lag behind a dead time,
//
//	T·ẏ + y = g·u(t−τ),
//
// y the displacement, m; u the commanded signal, m; T the lag, s; τ the delay,
// s; g the gain. Transfer function: g·e^(−sτ)/(1 + Ts).
//
// It is advanced exactly. The commanded signal is straight between ticks
// (Ramp, reaching command u_k at the end of tick k) or constant, u_k, in the
// interval (t_k, t_{k+1}] (Step). With τ = (n+φ)·h, h the tick, 0 ≤ φ < 1, the
// delayed signal has one knot inside each tick, φ·h after its start; on each of
// the two pieces the answer to a straight line is known in closed form (see
// straight). Both pieces together make one tick linear in the state and in the
// delayed commands c = g·u_{k−n}, b = g·u_{k−n−1}, a = g·u_{k−n−2}:
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
// Start-up: the history is the command that holds the first displacement.
// There is no saturation.
type lagDelay struct {
	ring []float64 // g·u of the last commands, more than n; a power of two, or none for n = 0
	pos  uint      // of the newest command; runs freely, masked on use
	n    uint      // whole ticks of delay
	tick float64   // h, s
	gain float64

	instant    bool    // T = 0
	onTick     bool    // T = 0, and φ = 0 or Step: y = c
	e          float64 // E
	wb, wa     float64 // E + w_b and w_a
	sc, sb     float64 // 1/s
	b, a       float64 // delayed commands of one and two ticks ago, m
	q, v       float64 // m behind c, m/s
	delay, lag float64 // as set, s
}

var _ Actuator = (*lagDelay)(nil)

func newLagDelay(t Timing, v kind.Values) (Actuator, error) {
	p := &lagDelay{tick: t.Tick, delay: v.Num("delay"), lag: v.Num("lag"), gain: v.Num("gain")}
	switch {
	case !(t.Tick > 0) || math.IsInf(t.Tick, 0):
		return nil, fmt.Errorf("tick: %v s is no time step", t.Tick)
	case t.Hold != Ramp && t.Hold != Step:
		return nil, fmt.Errorf("hold: %d is neither ramp nor step", t.Hold)
	case !(p.delay >= 0) || !(p.delay/t.Tick <= mostTicks):
		return nil, fmt.Errorf("delay: %v s is not between 0 and %d ticks of %v s", p.delay, mostTicks, t.Tick)
	case !(p.lag >= 0) || math.IsInf(p.lag, 0):
		return nil, fmt.Errorf("lag: %v s is not a time of at least 0", p.lag)
	case p.gain == 0 || math.IsNaN(p.gain) || math.IsInf(p.gain, 0):
		return nil, fmt.Errorf("gain: %v is no gain that could move a specimen", p.gain)
	}
	n, phi := split(p.delay / t.Tick)
	p.n = uint(n)
	p.instant, p.onTick = p.lag == 0, p.lag == 0 && (phi == 0 || t.Hold == Step)
	if t.Hold == Ramp {
		p.weighRamp(phi)
	} else {
		p.weighStep(phi)
	}
	if n > 0 {
		p.ring = make([]float64, 1<<bits.Len(uint(n)))
	}
	return p, nil
}

// split parts a delay in ticks into whole ticks and a fraction in [0, 1).
func split(ticks float64) (n int, phi float64) {
	if whole := math.Round(ticks); math.Abs(ticks-whole) <= nearTick {
		return int(whole), 0
	}
	whole := math.Floor(ticks)
	return int(whole), ticks - whole
}

// weighRamp sets the weights for commands joined by straight lines: the
// delayed signal starts the tick at φa + (1−φ)b, passes b at the knot and ends
// at φb + (1−φ)c.
func (p *lagDelay) weighRamp(phi float64) {
	h := p.tick
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
	h := p.tick
	if p.instant {
		p.sc = 1 / h
		return
	}
	e2 := math.Exp(-(1 - phi) * h / p.lag)
	p.e = flush(math.Exp(-h / p.lag))
	p.wb = flush(e2) // e^(−h/T) and e2·(1 − e^(−φh/T))
	p.sc = flush(e2 / p.lag)
}

func (p *lagDelay) Start(y float64, s *Specimen) {
	for i := range p.ring {
		p.ring[i] = y
	}
	p.a, p.b, p.q, p.v, p.pos = y, y, 0, 0, 0
	s.Start(y)
}

func (p *lagDelay) Advance(u float64, s *Specimen) (y, v float64) {
	c, b, a := p.gain*u, p.b, p.a
	if ring := p.ring; len(ring) > 0 {
		p.pos++
		ring[p.pos&uint(len(ring)-1)] = c
		c = ring[(p.pos-p.n)&uint(len(ring)-1)]
	}
	p.b, p.a = c, b
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
	s.Advance(y, v, p.tick)
	return y, v
}
