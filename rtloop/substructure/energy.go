package substructure

// The quadratic forms of energies. Velocities are those of Integrator.Centred.

// VMV returns vᵀM v, twice the kinetic energy relative to the ground, J, for
// velocities v, m/s.
func (s *Structure) VMV(v []float64) float64 {
	if s.n == 1 {
		return v[0] * float64(s.mass1*v[0])
	}
	return s.massBlocks.quadratic(v)
}

// AMA returns aᵀM a for accelerations a, m/s²; over vᵀM v it is the square of
// the frequency at which the structure moves.
func (s *Structure) AMA(a []float64) float64 { return s.VMV(a) }

// VCV returns vᵀC v, the power that the damping of the structure takes out,
// W, for velocities v, m/s.
func (s *Structure) VCV(v []float64) float64 {
	if s.n == 1 {
		return v[0] * float64(s.damping1*v[0])
	}
	return s.dampingBlocks.quadratic(v)
}
