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
// held displacement; how many corrections are worth trying; and how far levels
// are moved to find the tangent, over the held displacement.
const (
	balanceTolerance   = 1e-13
	balanceCorrections = 1000
	tangentMove        = 1e-7
)

// Held is Static with hysteretic storeys and specimens as they are there, not
// with their initial stiffness: the displacements, m, at which one force on the
// given level holds it at displacement and every other level is in balance. The
// balance is found by damped Newton iteration, with the tangent where that leads
// on and else with the initial stiffness of the whole; where parts yield without
// end it does not exist, which is an error.
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
	h := holder{s: s, free: free, storeys: newHystereticStoreys(s), specimen: specimen,
		p: make([]float64, s.n), trial: make([]float64, s.n)}
	return x, h.balance(x, &chol, math.Abs(displacement))
}

// holder looks for the balance of the levels that nothing holds.
type holder struct {
	s        *Structure
	free     []int
	storeys  hystereticStoreys
	specimen SlowForce
	p, trial []float64
}

// balance moves the free levels of x until a correction with the initial
// stiffness is within tolerance; size is the held displacement, m. A correction
// that makes the imbalance no smaller, because something stiffens, is halved
// until it does.
func (h *holder) balance(x []float64, chol *mat.Cholesky, size float64) error {
	missing, step := mat.NewVecDense(len(h.free), nil), mat.NewVecDense(len(h.free), nil)
	tolerance := balanceTolerance * size
	worst := h.imbalance(x, missing)
	for range balanceCorrections {
		if err := chol.SolveVecTo(step, missing); err != nil {
			return fmt.Errorf("held shape: %w", err)
		}
		largest := mat.Norm(step, math.Inf(1))
		if math.IsNaN(largest) || math.IsInf(largest, 0) {
			return errors.New("level: no balance found with it held there")
		}
		if largest <= tolerance {
			return nil
		}
		var better bool
		if tangent, ok := h.tangentStep(x, missing, tangentMove*size); ok {
			worst, better = h.advance(x, tangent, missing, worst, 1.0/16)
		}
		if !better {
			worst, better = h.advance(x, step, missing, worst, 1e-9)
		}
		if !better {
			// As far down as rounding goes.
			if largest <= 1e4*tolerance {
				return nil
			}
			return errors.New("level: no balance found with it held there")
		}
	}
	return errors.New("level: cannot be held there: storeys or specimens yield without end")
}

// advance moves x by the step, or by the half of it, the quarter and so on down
// to the least share, and updates what is missing, if that lessens the worst
// imbalance. Otherwise x stays.
func (h *holder) advance(x []float64, step, missing *mat.VecDense, worst, least float64) (float64, bool) {
	copy(h.trial, x)
	for share := 1.0; share >= least; share /= 2 {
		for i, row := range h.free {
			h.trial[row] = x[row] + share*step.AtVec(i)
		}
		if now := h.imbalance(h.trial, missing); now < worst {
			copy(x, h.trial)
			return now, true
		}
	}
	h.imbalance(x, missing)
	return worst, false
}

// tangentStep returns the step to balance by the tangent stiffness at x, found
// by moving one level after another; ok is false where it is singular.
func (h *holder) tangentStep(x []float64, missing *mat.VecDense, move float64) (step *mat.VecDense, ok bool) {
	n := len(h.free)
	tangent, moved := mat.NewDense(n, n, nil), mat.NewVecDense(n, nil)
	copy(h.trial, x)
	for j, row := range h.free {
		h.trial[row] = x[row] + move
		d := h.trial[row] - x[row]
		h.imbalance(h.trial, moved)
		h.trial[row] = x[row]
		for i := range n {
			tangent.Set(i, j, (missing.AtVec(i)-moved.AtVec(i))/d)
		}
	}
	step = mat.NewVecDense(n, nil)
	if step.SolveVec(tangent, missing) != nil {
		return nil, false
	}
	largest := mat.Norm(step, math.Inf(1))
	return step, !math.IsNaN(largest) && !math.IsInf(largest, 0)
}

// imbalance writes what the free levels lack for balance at x at rest, N, and
// returns its size.
func (h *holder) imbalance(x []float64, missing *mat.VecDense) float64 {
	for i := range h.p {
		h.p[i] = 0
		for j, xj := range x {
			h.p[i] -= h.s.stiffness.At(i, j) * xj
		}
	}
	h.storeys.start(x)
	h.storeys.subtract(h.p)
	for j, at := range h.s.attachments {
		at.subtract(h.p, h.specimen(j, at.extension(x)))
	}
	for i, row := range h.free {
		missing.SetVec(i, h.p[row])
	}
	return mat.Norm(missing, 2)
}
