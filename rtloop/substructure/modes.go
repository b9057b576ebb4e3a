package substructure

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// heldTolerance is the smallest eigenvalue, over the largest, of a structure
// that is held in place. Rounding leaves some 1e-15 of a mechanism; sixty
// equal storeys have 2e-4.
const heldTolerance = 1e-12

// Frequencies returns the natural circular frequencies of the whole
// undamped structure, rad/s, ascending. It must not be changed.
func (s *Structure) Frequencies() []float64 { return s.frequencies }

// Shapes returns the mode shapes as columns, in the order of Frequencies,
// mass-normalised (φᵀMφ = 1), the largest element of each positive.
func (s *Structure) Shapes() mat.Matrix { return s.shapes }

// solveModes solves K_total φ = ω² M φ by way of M = L Lᵀ and the symmetric
// matrix L⁻¹ K L⁻ᵀ, whose eigenvectors are Lᵀφ.
func (s *Structure) solveModes(chol *mat.Cholesky) error {
	var l mat.TriDense
	chol.LTo(&l)
	var half, full mat.Dense
	if err := half.Solve(&l, s.total); err != nil {
		return fmt.Errorf("mass: %w", err)
	}
	if err := full.Solve(&l, half.T()); err != nil {
		return fmt.Errorf("mass: %w", err)
	}
	scaled := mat.NewSymDense(s.n, nil)
	for i := range s.n {
		for j := i; j < s.n; j++ {
			scaled.SetSym(i, j, (full.At(i, j)+full.At(j, i))/2)
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(scaled, true) {
		return errors.New("modes: no eigenvalues found")
	}
	var y mat.Dense
	eigen.VectorsTo(&y)
	s.shapes = mat.NewDense(s.n, s.n, nil)
	if err := s.shapes.Solve(l.T(), &y); err != nil {
		return fmt.Errorf("mass: %w", err)
	}
	s.orientShapes()

	values := eigen.Values(nil)
	if err := s.checkHeld(values[0], slices.Max(values)); err != nil {
		return err
	}
	s.frequencies = values
	for i, v := range values {
		s.frequencies[i] = math.Sqrt(v)
	}
	return nil
}

// orientShapes makes the largest element of each shape positive.
func (s *Structure) orientShapes() {
	for j := range s.n {
		largest := 0.0
		for i := range s.n {
			if v := s.shapes.At(i, j); math.Abs(v) > math.Abs(largest)*(1+symmetryTolerance) {
				largest = v
			}
		}
		if largest < 0 {
			for i := range s.n {
				s.shapes.Set(i, j, -s.shapes.At(i, j))
			}
		}
	}
}

// checkHeld judges the lowest eigenvalue. The lowest level that takes part in
// a free motion is the one that nothing holds.
func (s *Structure) checkHeld(lowest, highest float64) error {
	if lowest > heldTolerance*highest {
		return nil
	}
	level, top := 0, 0.0
	for i := range s.n {
		top = math.Max(top, math.Abs(s.shapes.At(i, 0)))
	}
	for i := range s.n {
		if math.Abs(s.shapes.At(i, 0)) > 1e-6*top {
			level = i + 1
			break
		}
	}
	if lowest < -heldTolerance*math.Abs(highest) {
		return fmt.Errorf("stiffness: the whole structure, specimens included, is not positive definite; it gives way at level %d", level)
	}
	return fmt.Errorf("stiffness: level %d is a free mechanism: neither a storey nor a specimen holds it at rest (an open gap, a damper and a mass do not)", level)
}
