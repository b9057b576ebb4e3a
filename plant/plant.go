// Package plant models what a command does to steel: servo-hydraulic
// actuators, the specimen elements they push, and the sensors that report it.
// It knows nothing of compensators, structures or the loop.
//
// Everything is SI and in physical time. Displacements are positive in the
// direction in which the actuator extends; a force is positive when the
// specimen resists extension, so that it pushes back on the structure.
package plant

import "antelag/scenarios/kind"

// Hold says how the command gets from one tick to the next.
type Hold int

const (
	Ramp Hold = iota // a straight line from the last command to this one
	Step             // a jump to this command at the start of the tick
)

// Timing is what an actuator must know of the loop that drives it.
type Timing struct {
	Tick float64 // physical seconds per tick, > 0
	Hold Hold
}

// Actuator carries commands out. It owns the motion of the specimen: it calls
// Specimen.Advance as often per tick as its model needs.
type Actuator interface {
	// Start puts actuator and specimen at rest where the command u, m, held for
	// ever, takes them, and returns that displacement, m.
	Start(u float64, s *Specimen) (y float64)
	// Advance takes the command u, m, of one tick (the displacement wanted at
	// its end), moves the specimen along, and returns the displacement, m, and
	// velocity, m/s, at the end of the tick.
	Advance(u float64, s *Specimen) (y, v float64)
	// Memory visits what is carried from tick to tick, but the specimen's part:
	// see Specimen.Memory.
	Memory(each func(*float64))
}

// NewActuator builds an actuator from resolved settings. An error names the
// setting that cannot work.
type NewActuator func(t Timing, v kind.Values) (Actuator, error)

// Actuators is the table of actuator kinds.
var Actuators = kind.Table[NewActuator]{What: "actuator", Entries: []kind.Entry[NewActuator]{
	lagDelayKind, secondOrderKind, servoHydraulicKind,
}}

// Element is one specimen element, a relation from displacement history to
// force, with its energies.
type Element interface {
	// Start puts the element at rest at displacement y, m, as if moved there
	// slowly from zero.
	Start(y float64)
	// Advance carries the element, along a straight line over dt seconds, to
	// displacement y, m, where its velocity is v, m/s, and returns the force
	// there, N.
	Advance(y, v, dt float64) float64
	// Energy returns what is stored now and what has been dissipated since
	// Start, J.
	Energy() (stored, dissipated float64)
	// Stiffness returns the tangent stiffness, N/m, with which the element
	// meets a sudden small move from rest at zero: what modes and integrators
	// with an initial stiffness count.
	Stiffness() float64
	// Memory visits what is carried from tick to tick; see Specimen.Memory.
	Memory(each func(*float64))
	// Tangent returns the linear element, at rest at zero, that this one is for
	// small motions about rest there. The error says why there is none.
	Tangent() (Element, error)
}

// Previewer is an Element that can tell beforehand what it would resist. An
// actuator whose motion depends on the specimen's force asks for it while it
// looks for the motion that balances.
type Previewer interface {
	// Preview returns the force, N, that Advance would return. It changes
	// nothing.
	Preview(y, v, dt float64) float64
}

// Massive is an Element that is nothing but a mass: its force is the mass
// times the acceleration of the path.
type Massive interface {
	Mass() float64 // kg
}

// NewElement builds a specimen element from resolved settings.
type NewElement func(v kind.Values) (Element, error)

// Elements is the table of specimen element kinds.
var Elements = kind.Table[NewElement]{What: "specimen", Entries: []kind.Entry[NewElement]{
	springKind, viscousKind, maxwellKind, boucWenKind, bilinearKind, frictionKind, cubicKind, gapKind, massKind,
}}

// Specimen is the sum of elements in parallel: they share the displacement
// and their forces add.
type Specimen struct {
	elements []Element
	previews []Previewer // of the same elements, without the masses
	mass     float64     // of those, kg
	force    float64
}

// NewSpecimen joins elements in parallel. With none it resists nothing.
func NewSpecimen(elements ...Element) *Specimen {
	s := &Specimen{}
	for _, e := range elements {
		if m, ok := e.(Massive); ok {
			s.mass += m.Mass()
		} else if p, ok := e.(Previewer); ok {
			s.previews = append(s.previews, p)
		} else {
			b := &unforeseen{Element: e}
			s.previews = append(s.previews, b)
			e = b
		}
		s.elements = append(s.elements, e)
	}
	return s
}

// unforeseen is an element that cannot tell its force beforehand: the last one
// stands in.
type unforeseen struct {
	Element
	force float64
}

func (u *unforeseen) Advance(y, v, dt float64) float64 {
	u.force = u.Element.Advance(y, v, dt)
	return u.force
}

func (u *unforeseen) Preview(_, _, _ float64) float64 { return u.force }

// Start puts every element at rest at displacement y, m.
func (s *Specimen) Start(y float64) {
	s.force = 0
	for _, e := range s.elements {
		e.Start(y)
		s.force += e.Advance(y, 0, 0)
	}
}

// Advance carries every element to displacement y, m, and velocity v, m/s,
// over dt seconds and returns the sum of the forces, N.
func (s *Specimen) Advance(y, v, dt float64) float64 {
	f := 0.0
	for _, e := range s.elements {
		f += e.Advance(y, v, dt)
	}
	s.force = f
	return f
}

// Preview returns the force, N, that Advance would return, but for the inertia
// of masses. It changes nothing.
func (s *Specimen) Preview(y, v, dt float64) float64 {
	f := 0.0
	for _, p := range s.previews {
		f += p.Preview(y, v, dt)
	}
	return f
}

// Mass returns the sum of the masses among the elements, kg. It moves with the
// actuator.
func (s *Specimen) Mass() float64 { return s.mass }

// Force returns the force at the last Advance, N.
func (s *Specimen) Force() float64 { return s.force }

// Energy returns the sums of stored and dissipated energy, J.
func (s *Specimen) Energy() (stored, dissipated float64) {
	for _, e := range s.elements {
		st, di := e.Energy()
		stored += st
		dissipated += di
	}
	return stored, dissipated
}

// Stiffness returns the sum of the initial tangent stiffnesses, N/m.
func (s *Specimen) Stiffness() float64 {
	k := 0.0
	for _, e := range s.elements {
		k += e.Stiffness()
	}
	return k
}
