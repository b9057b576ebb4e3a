// Package substructure is the numerical part of a hybrid test: the mass,
// damping and stiffness of the structure that is integrated, and the
// integrators that carry it from tick to tick. It solves
//
//	M ẍ + C ẋ + K x + h(x) + Σ b_j r_j = −M ι ü_g + f
//
// with x the displacement of the levels relative to the ground, m; M, C and K
// the mass (kg), damping (N·s/m) and stiffness (N/m); h the forces of the
// hysteretic storeys, N; r_j the force with which specimen j resists its
// extension, N, and b_j the levels it acts between; ι the influence vector
// (the displacement of the levels when the ground moves by one); ü_g the
// ground acceleration, m/s²; f the forces applied to the levels, N.
//
// Levels are numbered from 1, the lowest; level 0 is the ground. Vectors hold
// level i at index i−1. Time is model time.
//
// A Structure does not change once built: any number of integrators may share
// one, each in its own goroutine. The package knows nothing of specimens
// beyond their initial stiffness, nor of actuators or compensators.
package substructure

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// MaxLevels is the largest number of levels of a structure.
const MaxLevels = 60

// Structure holds the matrices of the numerical substructure and what follows
// from them. Build one with FromStoreys or FromMatrices.
type Structure struct {
	n int

	mass      *mat.SymDense // M
	damping   *mat.SymDense // C
	stiffness *mat.SymDense // K: what the equation uses linearly
	total     *mat.SymDense // K with hysteretic storeys and specimens as they start
	influence []float64     // ι

	storeys     []hystereticStorey
	attachments []joint

	frequencies []float64
	shapes      *mat.Dense

	massBlocks, dampingBlocks, stiffnessBlocks *matrix
	mass1, damping1                            float64   // M and C of one level alone
	groundMass                                 []float64 // −M ι
}

// N returns the number of levels.
func (s *Structure) N() int { return s.n }

// Mass returns M, kg.
func (s *Structure) Mass() mat.Symmetric { return s.mass }

// Damping returns C, N·s/m.
func (s *Structure) Damping() mat.Symmetric { return s.damping }

// Stiffness returns K, N/m, as the equation of motion uses it: without
// hysteretic storeys, whose force is h, and without specimens.
func (s *Structure) Stiffness() mat.Symmetric { return s.stiffness }

// TotalStiffness returns the stiffness of the whole structure at rest, N/m: K
// with the initial stiffness of hysteretic storeys and of specimens added.
func (s *Structure) TotalStiffness() mat.Symmetric { return s.total }

// GroundLoad writes the load −M ι ü_g into p, N, for a ground acceleration
// ug, m/s².
func (s *Structure) GroundLoad(p []float64, ug float64) {
	for i, m := range s.groundMass {
		p[i] = m * ug
	}
}

// Static returns the displacements, m, of the whole structure held by one
// force on the given level (1 is the lowest) such that this level stands at
// displacement, m. Hysteretic storeys and specimens count with their initial
// stiffness.
func (s *Structure) Static(level int, displacement float64) ([]float64, error) {
	if level < 1 || level > s.n {
		return nil, fmt.Errorf("level: must be 1 to %d, is %d", s.n, level)
	}
	var chol mat.Cholesky
	if !chol.Factorize(s.total) {
		return nil, errNotHeld
	}
	x := mat.NewVecDense(s.n, nil)
	unit := mat.NewVecDense(s.n, nil)
	unit.SetVec(level-1, 1)
	if err := chol.SolveVecTo(x, unit); err != nil {
		return nil, fmt.Errorf("static shape: %w", err)
	}
	x.ScaleVec(displacement/x.AtVec(level-1), x)
	x.SetVec(level-1, displacement)
	return x.RawVector().Data, nil
}

var errNotHeld = errors.New("stiffness: the structure is not held in place")

// finish completes a structure whose mass, stiffness, influence, hysteretic
// storeys and own damping (nil: none) are set. It judges what the sources of
// all three matrices have in common.
func (s *Structure) finish(d Damping, at []Attachment) error {
	var chol mat.Cholesky
	if !chol.Factorize(s.mass) {
		return errors.New("mass: the matrix is not positive definite")
	}
	s.total = mat.NewSymDense(s.n, nil)
	s.total.CopySym(s.stiffness)
	for _, h := range s.storeys {
		h.addStiffness(s.total, h.stiffness)
	}
	if err := s.attach(at); err != nil {
		return err
	}
	if err := s.solveModes(&chol); err != nil {
		return err
	}
	if err := s.damp(d); err != nil {
		return err
	}
	s.massBlocks = newMatrix(s.mass)
	s.dampingBlocks = newMatrix(s.damping)
	s.stiffnessBlocks = newMatrix(s.stiffness)
	s.mass1, s.damping1 = s.mass.At(0, 0), s.damping.At(0, 0)

	s.groundMass = make([]float64, s.n)
	s.massBlocks.mul(s.groundMass, s.influence)
	for i := range s.groundMass {
		s.groundMass[i] = -s.groundMass[i]
	}
	return nil
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
