package substructure

import "gonum.org/v1/gonum/mat"

// weighted is what methods of several levels share that hold the equation of
// motion between two ticks instead of at one. With the balance at a tick
//
//	R = p − h − C v − K x − (what the method adds)
//
// the forces for inertia, N, they ask M â = now·R_{k+1} + before·R_k, with
// now + before = 1. The specimens' forces, being part of p, and those of
// hysteretic storeys are thereby weighted like all others. R_k is no function
// of x_k, v_k and a_k, for it holds the load: it has to be remembered.
type weighted struct {
	state
	now, before float64
	last        []float64 // R_k
	memory      []float64 // last, and what else the method carries to the next tick
	specimens   *matrix   // initial stiffness of the specimens
}

// newWeighted makes room for so many vectors of memory, the first is last.
func newWeighted(s *Structure, dt, before float64, vectors int) (weighted, error) {
	st, err := newState(s, dt)
	if err != nil {
		return weighted{}, err
	}
	memory := make([]float64, vectors*s.n)
	return weighted{
		state: st, now: 1 - before, before: before,
		memory: memory, last: memory[:s.n:s.n], specimens: newMatrix(s.specimenStiffness()),
	}, nil
}

func (w *weighted) Memory() []float64 { return w.memory }

func (w *weighted) Start(x0, p []float64) {
	w.state.Start(x0, p)
	copy(w.last, w.rest)
}

// SetState takes the balance to be that of a structure under no load, whose
// specimens have their initial stiffness.
func (w *weighted) SetState(x, v, a []float64) {
	w.state.SetState(x, v, a)
	clear(w.last)
	w.specimens.subtract(w.last, x)
	w.balance(w.last, v)
	copy(w.last, w.rest)
}

// specimenStiffness is what the attachments add to the stiffness at rest.
func (s *Structure) specimenStiffness() *mat.SymDense {
	own := mat.NewSymDense(s.n, nil)
	own.CopySym(s.stiffness)
	for _, h := range s.storeys {
		h.addStiffness(own, h.stiffness)
	}
	return combine(1, s.total, -1, own)
}

// combine returns a·A + b·B.
func combine(a float64, first *mat.SymDense, b float64, second *mat.SymDense) *mat.SymDense {
	n := first.SymmetricDim()
	out := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			out.SetSym(i, j, a*first.At(i, j)+b*second.At(i, j))
		}
	}
	return out
}

// weight returns now·r + before·last, each product rounded as in plus.
func weight(now, r, before, last float64) float64 {
	return float64(now*r) + float64(before*last)
}
