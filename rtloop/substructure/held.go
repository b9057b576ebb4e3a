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
// found by damped Newton iteration with the initial stiffness of the whole;
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
	h := holder{s: s, free: free, storeys: newHystereticStoreys(s), specimen: specimen, p: make([]float64, s.n)}
	return x, h.balance(x, &chol, balanceTolerance*math.Abs(displacement))
}

// holder looks for the balance of the levels that nothing holds.
type holder struct {
	s        *Structure
	free     []int
	storeys  hystereticStoreys
	specimen SlowForce
	p        []float64
}

// balance moves the free levels of x until a correction is within tolerance, m.
// A correction that makes the imbalance no smaller, because something stiffens,
// is halved until it does.
func (h *holder) balance(x []float64, chol *mat.Cholesky, tolerance float64) error {
	missing, step := mat.NewVecDense(len(h.free), nil), mat.NewVecDense(len(h.free), nil)
	trial := append([]float64(nil), x...)
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
		for share := 1.0; ; share /= 2 {
			for i, row := range h.free {
				trial[row] = x[row] + share*step.AtVec(i)
			}
			if now := h.imbalance(trial, missing); now < worst {
				worst = now
				copy(x, trial)
				break
			}
			if share < 1e-9 {
				// As far down as rounding goes.
				if largest <= 1e4*tolerance {
					return nil
				}
				return errors.New("level: no balance found with it held there")
			}
		}
	}
	return errors.New("level: cannot be held there: storeys or specimens yield without end")
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
