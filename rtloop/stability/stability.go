// Package stability says how far a loop is from growing by itself. It takes the
// loop that runs, lets it make small motions about rest with the very code of its
// ticks, and so finds
//
//   - the discrete state matrix A of one tick, s_{k+1} = A s_k, and its eigenvalues
//     (System): the loop grows where one of them is outside the unit circle;
//   - the same as a characteristic function F(z), small however long the delays are
//     (Model), for maps and margins: F(z) = 0 at the eigenvalues that are not zero.
//
// Both see linear loops as they are. Specimen elements and storeys that are not
// linear count with their tangent at rest, servo-hydraulic actuators near rest, and
// adaptive compensators with the coefficients that they have.
//
// Poles z belong to model time: z = e^(s·dt), s = −ζω ± jω√(1−ζ²). The package
// knows nothing of scenarios.
package stability

import (
	"errors"
	"math"
	"math/cmplx"
)

// small is the size of a disturbance. All that a linear part makes of it is exact
// to rounding whatever it is, a power of two. Where a part is not quite linear, it
// is so small that nothing but the tangent is left.
const small = 0x1p-300

// ErrTooLarge says that a loop has more states than a matrix of them can be worked
// with in good time.
var ErrTooLarge = errors.New("the loop carries too many values from tick to tick for their matrix")

// Mode is one way in which the loop moves by itself.
type Mode struct {
	Pole      complex128   // z, one of a pair with Im ≥ 0
	Frequency float64      // Hz, model time: |s|/2π, or the damped one where it grows
	Damping   float64      // ζ = −Re s/|s|; negative where the mode grows
	Shape     []complex128 // displacements of the levels, the largest of size 1; nil where none moves
}

// newMode describes the pole z for steps of dt model seconds.
func newMode(z complex128, dt float64) Mode {
	m := Mode{Pole: z}
	if z == 0 {
		m.Damping = 1
		return m
	}
	s := cmplx.Log(z) / complex(dt, 0)
	m.Frequency = cmplx.Abs(s) / (2 * math.Pi)
	if s != 0 {
		m.Damping = -real(s) / cmplx.Abs(s)
	}
	return m
}

// normalize scales a shape so that its largest element is 1.
func normalize(shape []complex128) []complex128 {
	var largest complex128
	for _, x := range shape {
		if cmplx.Abs(x) > cmplx.Abs(largest)*(1+1e-9) {
			largest = x
		}
	}
	if largest == 0 {
		return nil
	}
	for i := range shape {
		shape[i] /= largest
	}
	return shape
}
