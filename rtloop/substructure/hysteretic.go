package substructure

import "antelag/plant"

// The knee of a storey that yields: z = 1 − e^(−d/d_y) on first loading, and
// elastic unloading.
const (
	sharpness = 1
	beta      = 0.5
)

// hystereticStorey describes a storey that yields. It holds no state: each
// integrator makes elements of its own.
type hystereticStorey struct {
	joint
	stiffness, yield, hardening float64
}

// Yields reports whether any storey is hysteretic.
func (s *Structure) Yields() bool { return len(s.storeys) > 0 }

// hystereticStoreys are the storeys of one integrator that yield.
type hystereticStoreys []struct {
	joint
	element plant.Element
	force   float64
}

func newHystereticStoreys(s *Structure) hystereticStoreys {
	hs := make(hystereticStoreys, len(s.storeys))
	for i, st := range s.storeys {
		hs[i].joint = st.joint
		hs[i].element = plant.NewBoucWen(st.stiffness, st.yield, st.hardening, sharpness, beta)
	}
	return hs
}

// start puts all storeys at rest at displacements x.
func (hs hystereticStoreys) start(x []float64) {
	for i := range hs {
		h := &hs[i]
		d := h.extension(x)
		h.element.Start(d)
		h.force = h.element.Advance(d, 0, 0)
	}
}

// advance carries all storeys over dt to displacements x and velocities v.
func (hs hystereticStoreys) advance(x, v []float64, dt float64) {
	for i := range hs {
		h := &hs[i]
		h.force = h.element.Advance(h.extension(x), h.extension(v), dt)
	}
}

// subtract takes the forces h off the load p.
func (hs hystereticStoreys) subtract(p []float64) {
	for i := range hs {
		hs[i].joint.subtract(p, hs[i].force)
	}
}

func (hs hystereticStoreys) energy() (stored, dissipated float64) {
	for i := range hs {
		s, d := hs[i].element.Energy()
		stored += s
		dissipated += d
	}
	return stored, dissipated
}
