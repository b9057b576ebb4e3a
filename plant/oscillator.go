package plant

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// pair is a displacement and its velocity.
type pair struct{ y, v float64 }

func (p pair) times(n float64) pair        { return pair{n * p.y, n * p.v} }
func (p pair) plus(q pair, n float64) pair { return pair{p.y + n*q.y, p.v + n*q.v} }

// swing is how ÿ + 2ζωẏ + ω²y = ω²w answers a straight line: where w runs from
// one value to another in a given time,
//
//	(y, v) ← y·ofY + v·ofV + from·ofFrom + to·ofTo,
//
// with ofY + ofFrom + ofTo = (1, 0), since at rest it stays.
type swing struct{ ofY, ofV, ofFrom, ofTo pair }

// swinging returns the swing of angular frequency omega, rad/s, and damping
// ratio zeta in the time d, s, by the matrix exponential of the state
// (y, v/ω, w, change of w), in which all four have the same dimension.
func swinging(omega, zeta, d float64) swing {
	r := omega * d
	if r == 0 {
		return swing{ofY: pair{y: 1}, ofV: pair{v: 1}}
	}
	var e mat.Dense
	e.Exp(mat.NewDense(4, 4, []float64{
		0, r, 0, 0,
		-r, -2 * zeta * r, r, 0,
		0, 0, 0, 1,
		0, 0, 0, 0,
	}))
	of := func(j int) pair { return pair{flush(e.At(0, j)), flush(e.At(1, j) * omega)} }
	return swing{ofY: of(0), ofV: of(1).times(1 / omega), ofFrom: of(2).plus(of(3), -1), ofTo: of(3)}
}

// of is what becomes of a state when w stays zero.
func (s *swing) of(state pair) pair { return s.ofY.times(state.y).plus(s.ofV, state.v) }

// angular is a frequency in Hz as rad/s.
func angular(hertz float64) float64 { return 2 * math.Pi * hertz }
