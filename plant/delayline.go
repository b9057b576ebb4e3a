package plant

import (
	"fmt"
	"math"
	"math/bits"
)

const (
	// nearTick is how near, in ticks, a delay must be to a whole number of
	// ticks to be taken for it. Settings carry some 1e-16 of rounding, and a
	// nanotick is far below what any test could tell.
	nearTick = 1e-9
	// mostTicks bounds the history that a delay may ask for: 128 MiB.
	mostTicks = 1 << 24
)

// delayLine is the dead time τ in front of an actuator: it turns the signal
// w(t), which the command makes, into w(t−τ).
//
// The signal is straight between ticks (Ramp, reaching w_k at the end of tick
// k) or constant, w_k, in the interval (t_k, t_{k+1}] (Step). With
// τ = (n+φ)·h, h the tick, 0 ≤ φ < 1, the delayed signal has one knot inside
// each tick, φ·h after its start. In tick k it is made of
//
//	c = w_{k−n},   b = w_{k−n−1},   a = w_{k−n−2}:
//
// with Ramp it starts at φ·a + (1−φ)·b, passes b at the knot and ends at
// φ·b + (1−φ)·c; with Step it is b up to the knot and c behind it.
//
// The history before the first command is what start says.
type delayLine struct {
	ring []float64 // the last signals, more than n; a power of two, or none for n = 0
	pos  uint      // of the newest; runs freely, masked on use
	n    uint      // whole ticks of delay
	b, a float64   // delayed signals of one and two ticks ago

	phi  float64 // φ
	tick float64 // h, s
	hold Hold
}

// newDelayLine makes a line of the given delay, s, 0 or more. An error names
// what cannot work: tick, hold or delay.
func newDelayLine(t Timing, delay float64) (delayLine, error) {
	l := delayLine{tick: t.Tick, hold: t.Hold}
	switch {
	case !(t.Tick > 0) || math.IsInf(t.Tick, 0):
		return l, fmt.Errorf("tick: %v s is no time step", t.Tick)
	case t.Hold != Ramp && t.Hold != Step:
		return l, fmt.Errorf("hold: %d is neither ramp nor step", t.Hold)
	case !(delay >= 0) || !(delay/t.Tick <= mostTicks):
		return l, fmt.Errorf("delay: %v s is not between 0 and %d ticks of %v s", delay, mostTicks, t.Tick)
	}
	n, phi := split(delay / t.Tick)
	l.n, l.phi = uint(n), phi
	if n > 0 {
		l.ring = make([]float64, 1<<bits.Len(uint(n)))
	}
	return l, nil
}

// split parts a delay in ticks into whole ticks and a fraction in [0, 1).
func split(ticks float64) (n int, phi float64) {
	if whole := math.Round(ticks); math.Abs(ticks-whole) <= nearTick {
		return int(whole), 0
	}
	whole := math.Floor(ticks)
	return int(whole), ticks - whole
}

// start fills the history with w.
func (l *delayLine) start(w float64) {
	for i := range l.ring {
		l.ring[i] = w
	}
	l.a, l.b, l.pos = w, w, 0
}

// push takes the signal of one tick and returns what the delayed one is made
// of during that tick.
func (l *delayLine) push(w float64) (c, b, a float64) {
	c, b, a = w, l.b, l.a
	if ring := l.ring; len(ring) > 0 {
		l.pos++
		ring[l.pos&uint(len(ring)-1)] = c
		c = ring[(l.pos-l.n)&uint(len(ring)-1)]
	}
	l.b, l.a = c, b
	return c, b, a
}

// share is a mixture c + b·(b−c) + a·(a−c) of the three signals of a tick:
// the shares of b and a, and the rest of c. So written, a signal at rest is
// met to the last digit.
type share struct{ b, a float64 }

// of mixes; bc is b−c and ac is a−c.
func (s share) of(c, bc, ac float64) float64 { return c + (s.b*bc + s.a*ac) }

// straightPiece is a part of the tick in which the delayed signal is a
// straight line: how long, s, and where from and to.
type straightPiece struct {
	d        float64
	from, to share
}

// pieces parts the tick at the knot. With φ = 0 the first has no length.
func (l *delayLine) pieces() (before, behind straightPiece) {
	phi := l.phi
	before = straightPiece{phi * l.tick, share{b: 1}, share{b: 1}}
	behind = straightPiece{d: (1 - phi) * l.tick}
	if l.hold == Ramp {
		before.from = share{b: 1 - phi, a: phi}
		behind.from, behind.to = share{b: 1}, share{b: phi}
	}
	return before, behind
}

// slices parts the tick into n equal slices, in each of which the delayed
// signal is taken for a straight line: exact but for the slice that holds the
// knot. There a ramp is its chord, and a jump is spread evenly over the
// slice, so that the signal's integral stays the same.
func (l *delayLine) slices(n int) []straightPiece {
	out := make([]straightPiece, n)
	for i := range out {
		s0, s1 := float64(i)/float64(n), float64(i+1)/float64(n)
		out[i] = straightPiece{d: l.tick / float64(n), from: l.at(s0), to: l.at(s1)}
		if l.hold == Step {
			before := min(1, max(0, (l.phi-s0)/(s1-s0)))
			out[i].from = share{b: before}
			out[i].to = out[i].from
		}
	}
	return out
}

// at is the delayed ramp at the fraction s of the tick.
func (l *delayLine) at(s float64) share {
	if s < l.phi {
		return share{b: 1 - (l.phi - s), a: l.phi - s}
	}
	return share{b: 1 - (s - l.phi)}
}
