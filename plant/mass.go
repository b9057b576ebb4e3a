package plant

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var massKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "mass",
		Doc:      "mass that moves with the specimen: its inertia is felt by the actuator and in the measured force",
		Equation: "f = m·ÿ",
		Source:   "Newton's second law",
		Settings: []kind.Setting{
			kind.Number("mass", quantity.Mass, "moving mass m").Range(0, 1e7).Sample(`"500 kg"`),
		},
	},
	New: func(v kind.Values) (Element, error) { return &mass{m: v.Num("mass")}, nil },
}

// mass is a mass that moves with the specimen,
//
//	f = m·ÿ,   ÿ = (v − v₀)/dt,
//
// f the force of inertia, N; m the mass, kg; v the velocity at the end of the
// path and v₀ the one before it, m/s. The acceleration is thus the mean over
// the path, which is that at its middle: the force is late by dt/2. A velocity
// that jumps, as behind a held command without lag, is a blow of m·Δv/dt.
//
// It stores its kinetic energy ½mv², J, and dissipates nothing. At rest there
// is no force; a path that takes no time sets the velocity without one.
type mass struct{ m, v float64 }

var _ Element = (*mass)(nil)
var _ Massive = (*mass)(nil)

func (m *mass) Start(float64) { m.v = 0 }

func (m *mass) Advance(_, v, dt float64) float64 {
	dv := v - m.v
	m.v = v
	if !(dt > 0) {
		return 0
	}
	return m.m * (dv / dt)
}

func (m *mass) Energy() (stored, dissipated float64) { return 0.5 * m.m * m.v * m.v, 0 }

// Stiffness returns 0.
func (m *mass) Stiffness() float64 { return 0 }

// Mass returns the mass, kg.
func (m *mass) Mass() float64 { return m.m }
