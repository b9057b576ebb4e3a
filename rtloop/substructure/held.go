package substructure

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// SlowForce is the force, N, of the specimen of an attachment that has been
// moved slowly to an extension, m.
type SlowForce func(attachment int, extension float64) float64

// How closely a held structure must be in balance: the last correction over the
// held displacement; and how many corrections are worth trying. Each shrinks
// the error by 1 less the least ratio of tangent to initial stiffness, so that
// a hardening of 1 % needs about 3000.
const (
	balanceTolerance   = 1e-13
	balanceCorrections = 100_000
)

// Held is Static with hysteretic storeys and specimens as they are there, not
// with their initial stiffness: the displacements, m, at which one force on the
// given level holds it at displacement and every other level is in balance. The balance is
// found by modified Newton iteration with the initial stiffness of the whole;
// where parts yield without end it does not exist, which is an error.
func (s *Structure) Held(level int, displacement float64, specimen SlowForce) ([]float64, error) {
	x, err := s.Static(level, displacement)
	if err != nil || s.n == 1 {
		return x, err
	}
	free := make([]int, 0, s.n-1)
	for i := range s.n {
		if i != level-1 {
			free = append(free, i)
		}
	}
	inner := mat.NewSymDense(len(free), nil)
	for i, row := range free {
		for j := i; j < len(free); j++ {
			inner.SetSym(i, j, s.total.At(row, free[j]))
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(inner) {
		return nil, errNotHeld
	}
	storeys := newHystereticStoreys(s)
	missing, step := mat.NewVecDense(len(free), nil), mat.NewVecDense(len(free), nil)
	p := make([]float64, s.n)
	for range balanceCorrections {
		s.imbalance(p, x, storeys, specimen)
		for i, row := range free {
			missing.SetVec(i, p[row])
		}
		if err := chol.SolveVecTo(step, missing); err != nil {
			return nil, fmt.Errorf("held shape: %w", err)
		}
		largest := 0.0
		for i, row := range free {
			x[row] += step.AtVec(i)
			largest = max(largest, math.Abs(step.AtVec(i)))
		}
		if !(largest > balanceTolerance*math.Abs(displacement)) {
			return x, nil
		}
	}
	return nil, errors.New("level: cannot be held there: storeys or specimens yield without end")
}

// imbalance writes what is missing from balance at x at rest, N.
func (s *Structure) imbalance(p, x []float64, storeys hystereticStoreys, specimen SlowForce) {
	for i := range p {
		p[i] = 0
		for j, xj := range x {
			p[i] -= s.stiffness.At(i, j) * xj
		}
	}
	storeys.start(x)
	storeys.subtract(p)
	for j, at := range s.attachments {
		at.subtract(p, specimen(j, at.extension(x)))
	}
}
