package stability

import "slices"

// Blocks names parts of a model: the structure with its integrator, and of each
// channel actuator, specimen and force sensor, or the compensator.
type Blocks struct {
	Structure            bool
	Plants, Compensators []bool
}

// Overlap reports whether two have a part in common.
func (b Blocks) Overlap(o Blocks) bool {
	if b.Structure && o.Structure {
		return true
	}
	for j := range b.Plants {
		if b.Plants[j] && o.Plants[j] || b.Compensators[j] && o.Compensators[j] {
			return true
		}
	}
	return false
}

// Take returns the model with those parts of another one that has the same levels,
// channels and tick.
func (m *Model) Take(from *Model, b Blocks) *Model {
	out := *m
	out.channels = slices.Clone(m.channels)
	if b.Structure {
		out.structure, out.forces, out.starts, out.angles = from.structure, from.forces, from.starts, from.angles
	}
	out.states = out.structure.n
	for j := range out.channels {
		c, other := &out.channels[j], &from.channels[j]
		if b.Structure {
			c.c = other.c
		}
		if b.Plants[j] {
			c.plant, c.gain = other.plant, other.gain
		}
		if b.Compensators[j] {
			c.fir = other.fir
		}
		out.states += c.plant.core.n
	}
	out.measure()
	return &out
}
