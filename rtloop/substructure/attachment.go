package substructure

import (
	"fmt"

	"gonum.org/v1/gonum/mat"
)

// Attachment is a specimen seen from the structure: it acts between two
// levels. Its extension, and the target of its channel, is x_To − x_From; a
// positive force resists the extension: it pulls level To back, and level
// From forth.
type Attachment struct {
	From, To  int     // levels, 0 is the ground
	Stiffness float64 // initial stiffness of the specimen, N/m
}

// joint is what acts between two levels, as indices of vectors; −1 is the
// ground.
type joint struct{ from, to int }

// extension returns x_to − x_from.
func (j joint) extension(x []float64) float64 {
	e := 0.0
	if j.to >= 0 {
		e = x[j.to]
	}
	if j.from >= 0 {
		e -= x[j.from]
	}
	return e
}

// subtract takes the force f, which resists the extension, off the load p.
func (j joint) subtract(p []float64, f float64) {
	if j.to >= 0 {
		p[j.to] -= f
	}
	if j.from >= 0 {
		p[j.from] += f
	}
}

// addStiffness adds k·b bᵀ to a matrix.
func (j joint) addStiffness(m *mat.SymDense, k float64) {
	if j.to >= 0 {
		m.SetSym(j.to, j.to, m.At(j.to, j.to)+k)
	}
	if j.from >= 0 {
		m.SetSym(j.from, j.from, m.At(j.from, j.from)+k)
	}
	if j.to >= 0 && j.from >= 0 {
		m.SetSym(j.from, j.to, m.At(j.from, j.to)-k)
	}
}

// attach takes the attachments in and adds their stiffness to the total.
func (s *Structure) attach(at []Attachment) error {
	for i, a := range at {
		switch {
		case a.From < 0 || a.From > s.n || a.To < 0 || a.To > s.n:
			return fmt.Errorf("channel %d: between: levels must be 0 to %d, are %d and %d", i+1, s.n, a.From, a.To)
		case a.From == a.To:
			return fmt.Errorf("channel %d: between: the two levels must differ, both are %d", i+1, a.From)
		case !finite(a.Stiffness):
			return fmt.Errorf("channel %d: the specimen's initial stiffness is %v", i+1, a.Stiffness)
		}
		j := joint{from: a.From - 1, to: a.To - 1}
		s.attachments = append(s.attachments, j)
		j.addStiffness(s.total, a.Stiffness)
	}
	return nil
}

// Project returns b_jᵀx = x_To − x_From of the attachment with index at: the
// target of its channel, or, of velocities or accelerations, its rate.
func (s *Structure) Project(x []float64, at int) float64 {
	return s.attachments[at].extension(x)
}

// AddForce takes b_j·r off the load p, N: what the structure feels of the
// force r, N, of the attachment with index at.
func (s *Structure) AddForce(p []float64, at int, r float64) {
	s.attachments[at].subtract(p, r)
}
