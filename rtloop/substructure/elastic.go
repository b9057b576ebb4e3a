package substructure

import "gonum.org/v1/gonum/mat"

// Elastic returns the structure with linear storeys of their initial stiffness in
// place of the hysteretic ones. Damping, modes and attachments are the same; one
// that has no hysteretic storeys is returned itself.
func (s *Structure) Elastic() *Structure {
	if len(s.storeys) == 0 {
		return s
	}
	e := *s
	e.stiffness = mat.NewSymDense(s.n, nil)
	e.stiffness.CopySym(s.stiffness)
	for _, h := range s.storeys {
		h.addStiffness(e.stiffness, h.stiffness)
	}
	e.storeys = nil
	e.stiffnessBlocks = newMatrix(e.stiffness)
	return &e
}
