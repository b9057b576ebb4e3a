package plant

import (
	"errors"
	"fmt"
	"math"
)

// What a part carries from tick to tick can be read and set, so that a loop can
// be linearized by the ticks that run it: a Memory method calls each once for
// every variable, always in the same order, pasts by their age. each may read
// the variable or write it. To write what was read takes a run up again to the
// last bit of its motions and forces; sums of energy are no part of it.

// Refiner is an Actuator that finds its motion to a tolerance.
type Refiner interface {
	// Refine makes it go on to the last digit, for motions however small. It
	// holds from the next Start.
	Refine()
}

// Memory visits what the elements carry from tick to tick.
func (s *Specimen) Memory(each func(*float64)) {
	for _, e := range s.elements {
		e.Memory(each)
	}
}

// Tangent returns the specimen that this one is for small motions about rest at
// zero. An error is an *ElementError that says which element has no tangent.
func (s *Specimen) Tangent() (*Specimen, error) {
	elements := make([]Element, len(s.elements))
	for i, e := range s.elements {
		var err error
		if elements[i], err = e.Tangent(); err != nil {
			return nil, &ElementError{Index: i, Err: err}
		}
	}
	return NewSpecimen(elements...), nil
}

// ElementError says what is wrong with one element of a specimen, counted from 0.
type ElementError struct {
	Index int
	Err   error
}

func (e *ElementError) Error() string { return fmt.Sprintf("specimen[%d]: %v", e.Index, e.Err) }
func (e *ElementError) Unwrap() error { return e.Err }

// tangent is what an element with a stiffness is for small motions: a spring,
// f = k·y, that is still announced with the stiffness of the element.
type tangent struct {
	spring
	announced float64 // N/m
}

var _ Element = (*tangent)(nil)
var _ Previewer = (*tangent)(nil)

func (t *tangent) Stiffness() float64 { return t.announced }

func (t *tangent) Tangent() (Element, error) {
	c := *t
	return &c, nil
}

func (u *unforeseen) Memory(each func(*float64)) {
	u.Element.Memory(each)
	each(&u.force)
}

func (u *unforeseen) Tangent() (Element, error) { return u.Element.Tangent() }

func (s *spring) Memory(func(*float64)) {}

func (s *spring) Tangent() (Element, error) { return &spring{k: s.k}, nil }

func (c *cubic) Memory(func(*float64)) {}

func (c *cubic) Tangent() (Element, error) { return &tangent{spring{k: c.k}, c.k}, nil }

func (g *gap) Memory(func(*float64)) {}

// Tangent is a spring of no stiffness inside the gap. Contact at zero on one side
// alone has none.
func (g *gap) Tangent() (Element, error) {
	if g.width == 0 && g.k > 0 && g.plus != g.minus {
		return nil, errors.New("gap: contact on one side that begins at zero is stiff one way and slack the other, so it has no tangent at rest")
	}
	k := g.Stiffness()
	return &tangent{spring{k: k}, k}, nil
}

func (d *viscous) Memory(func(*float64)) {}

// Tangent of a damper of exponent above 1 has no force: what dies away fastest
// is its damping. Below 1 there is none: force over velocity has no bound.
func (d *viscous) Tangent() (Element, error) {
	switch {
	case d.alpha == 1 || d.c == 0:
		return &viscous{c: d.c, alpha: 1, law: linear}, nil
	case d.alpha > 1:
		return &viscous{alpha: 1, law: linear}, nil
	}
	return nil, fmt.Errorf("viscous: with the exponent %v force over velocity grows without bound as the motion dies, so it has no tangent at rest; "+
		"take an exponent of at least 1, or a linear damper that dissipates as much", d.alpha)
}

func (m *maxwell) Memory(each func(*float64)) {
	each(&m.f)
	each(&m.u)
	each(&m.y)
}

// Tangent for small motions: a damper of exponent below 1 does not give, which
// leaves the spring; one above 1 gives all, which leaves nothing.
func (m *maxwell) Tangent() (Element, error) {
	k := m.Stiffness()
	switch {
	case m.alpha == 1 && k > 0:
		return &maxwell{k: m.k, c: m.c, alpha: 1, beta: 1, perStiff: m.perStiff, dt: -1}, nil
	case m.alpha < 1:
		return &tangent{spring{k: k}, k}, nil
	}
	return &tangent{spring{}, k}, nil
}

func (b *BoucWen) Memory(each func(*float64)) {
	each(&b.z)
	each(&b.work.y)
}

// Tangent is a spring of the initial stiffness. (A set z stays for ever in small
// motions: it is an offset, no motion.)
func (b *BoucWen) Tangent() (Element, error) { return &tangent{spring{k: b.k}, b.k}, nil }

func (b *bilinear) Memory(each func(*float64)) {
	each(&b.x)
	each(&b.e)
	each(&b.y)
}

// Tangent is a spring of the initial stiffness.
func (b *bilinear) Tangent() (Element, error) { return &tangent{spring{k: b.k}, b.k}, nil }

func (e *friction) Memory(each func(*float64)) {
	each(&e.x)
	each(&e.f)
	each(&e.y)
}

// Tangent is a spring of the stiffness before slip. One that slides at any force
// has none, but where there is no friction at all.
func (e *friction) Tangent() (Element, error) {
	slow := e.fast - e.drop // bound at rest
	switch {
	case e.fast == 0 && slow == 0, e.k == 0:
		return &tangent{spring{}, e.k}, nil
	case !(math.Min(slow, e.fast) > 0):
		return nil, errors.New("friction: with no friction at standstill it slips at any force, so it has no tangent at rest")
	}
	return &tangent{spring{k: e.k}, e.k}, nil
}

func (m *mass) Memory(each func(*float64)) { each(&m.v) }

func (m *mass) Tangent() (Element, error) { return &mass{m: m.m}, nil }

// visit visits the delayed signals, the newest first.
func (l *delayLine) visit(each func(*float64)) {
	each(&l.b)
	each(&l.a)
	for i := range l.n {
		each(&l.ring[(l.pos-i)&uint(len(l.ring)-1)])
	}
}

func (p *lagDelay) Memory(each func(*float64)) {
	if !p.instant {
		each(&p.q)
		each(&p.v)
	}
	p.line.visit(each)
}

func (p *secondOrder) Memory(each func(*float64)) {
	each(&p.q)
	each(&p.v)
	p.line.visit(each)
}

// Memory visits spool, controller, piston and oil, and the delayed commands.
func (p *ServoHydraulic) Memory(each func(*float64)) {
	s := &p.state
	for _, v := range []*float64{&s.x.y, &s.x.v, &s.i, &s.g, &s.gWas, &s.y, &s.dy, &s.v, &s.vWas, &s.p, &s.pWas} {
		each(v)
	}
	p.line.visit(each)
}

// Refine makes the forces balance to rounding in every sub-step.
func (p *ServoHydraulic) Refine() { p.exact = true }

var _ Refiner = (*ServoHydraulic)(nil)

// Memory visits the low-pass.
func (s *Sensor) Memory(each func(*float64)) {
	if s.filtered {
		each(&s.y)
		each(&s.was)
	}
}

// Linear returns a sensor of the same gain and low-pass that has no bias, noise
// or quantum and never stops at its range.
func (s *Sensor) Linear() *Sensor {
	return &Sensor{perfect: s.gain == 1 && !s.filtered, gain: s.gain, filtered: s.filtered, e: s.e, wb: s.wb}
}
