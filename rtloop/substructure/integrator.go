package substructure

import (
	"fmt"

	"antelag/scenarios/kind"

	"gonum.org/v1/gonum/mat"
)

// Integrator advances a structure from t_k to t_{k+1}, explicit in
// displacement: the displacements are known before the forces there are. A
// tick is Predict, whereupon the specimens are moved to X, and Correct with
// the load that holds then.
//
// A method that weights the equation of motion between t_k and t_{k+1} keeps
// what it needs of t_k itself; what it is given is always the load at t_{k+1}.
// A method that corrects the displacement afterwards, for the
// specimens' initial stiffness acting on the correction, shows the
// displacement sent to the specimens between Predict and Correct and the
// corrected one from then on.
//
// None of its methods allocates. An Integrator belongs to one goroutine.
type Integrator interface {
	// Start puts the structure at rest at displacements x0, m (nil: zero),
	// under the load p, N, at t = 0, and finds the accelerations there.
	// Hysteretic storeys start at x0 as if moved there slowly.
	Start(x0, p []float64)
	// SetState puts the structure into a state as it is after Correct, to see
	// what becomes of it. Hysteretic storeys start at x as if moved there
	// slowly; Memory becomes what it is under no load, with specimens of their
	// initial stiffness.
	SetState(x, v, a []float64)
	// Memory is what the method carries from t_k to t_{k+1} beside x, v, a and
	// the hysteretic storeys; nil where that is nothing. It is one slice for the
	// life of the integrator and the only one that may be written, after
	// SetState: to copy it from another integrator of the same method takes up
	// a run to the last bit. With x, v, a it is the whole state of a linear
	// structure.
	Memory() []float64
	// Predict moves on from x_k, v_k, a_k: X becomes the displacements at
	// t_{k+1}, V the velocities there as far as they are known; A remains a_k.
	Predict()
	// Correct takes the load p at t_{k+1}, N, external less specimen forces:
	// −M ι ü_g + f − Σ b_j r_j. The forces h of hysteretic storeys are taken
	// off here and are no part of p. It completes A and V. p is not kept.
	Correct(p []float64)
	// X, V, A are views of the state, m, m/s, m/s²: the same slices for the
	// life of the integrator, to be read only.
	X() []float64
	V() []float64
	A() []float64
	// Centred returns the velocities at the tick to second order in dt, m/s,
	// good from Correct until the next Predict: V itself, but where a method's V belongs
	// to another time than X. Take it for energies: with V of such a method
	// their balance closes with the first power of the step only. It is one
	// slice for the life of the integrator too.
	Centred() []float64
	// Strain returns the strain energy ½xᵀK x and what is stored in the
	// hysteretic storeys, J.
	Strain() float64
	// Hysteresis returns what the hysteretic storeys dissipated since Start, J.
	Hysteresis() float64
}

// NewIntegrator builds an integrator for steps of dt, model seconds, from
// resolved settings.
type NewIntegrator func(s *Structure, dt float64, v kind.Values) (Integrator, error)

// Integrators is the table of integrators.
var Integrators = kind.Table[NewIntegrator]{What: "integrator", Entries: []kind.Entry[NewIntegrator]{
	newmarkExplicitKind, crKind, krAlphaKind, alphaOSKind,
}}

// Names lists the integrators.
func Names() []string { return Integrators.Names() }

// New builds the integrator of that name, with the defaults of its settings,
// for steps of dt, model seconds. It is at rest at zero, without load.
func New(name string, s *Structure, dt float64) (Integrator, error) {
	return NewWith(name, s, dt, nil)
}

// NewWith is New with settings of the integrator; those not given have their
// defaults.
func NewWith(name string, s *Structure, dt float64, given kind.Values) (Integrator, error) {
	e, err := Integrators.Find(name)
	if err != nil {
		return nil, fmt.Errorf("integrator: %w", err)
	}
	if !finite(dt) || dt <= 0 {
		return nil, fmt.Errorf("integrator: the step must be above 0 s, is %v", dt)
	}
	v, err := e.Resolve(given)
	if err != nil {
		return nil, fmt.Errorf("integrator: %s: %w", name, err)
	}
	in, err := e.New(s, dt, v)
	if err != nil {
		return nil, fmt.Errorf("integrator: %s: %w", name, err)
	}
	in.Start(nil, make([]float64, s.n))
	return in, nil
}

// state is what all integrators of several levels share.
type state struct {
	s           *Structure
	dt          float64
	inverseMass *matrix
	x, v, a     []float64
	rest        []float64 // what the load leaves for inertia
	yielding    hystereticStoreys
}

func newState(s *Structure, dt float64) (state, error) {
	inverse, err := invert("mass", s.mass)
	if err != nil {
		return state{}, err
	}
	n := s.n
	buffer := make([]float64, 4*n)
	return state{
		s: s, dt: dt, inverseMass: newMatrix(inverse),
		x: buffer[0*n : 1*n : 1*n], v: buffer[1*n : 2*n : 2*n],
		a: buffer[2*n : 3*n : 3*n], rest: buffer[3*n:],
		yielding: newHystereticStoreys(s),
	}, nil
}

func (st *state) X() []float64 { return st.x }
func (st *state) V() []float64 { return st.v }
func (st *state) A() []float64 { return st.a }

func (st *state) Memory() []float64 { return nil }

func (st *state) Strain() float64 {
	stored, _ := st.yielding.energy()
	return 0.5*st.s.stiffnessBlocks.quadratic(st.x) + stored
}

func (st *state) Hysteresis() float64 {
	_, dissipated := st.yielding.energy()
	return dissipated
}

func (st *state) Start(x0, p []float64) {
	clear(st.x)
	copy(st.x, x0)
	clear(st.v)
	st.yielding.start(st.x)
	st.balance(p, st.v)
	st.inverseMass.mul(st.a, st.rest)
}

func (st *state) SetState(x, v, a []float64) {
	copy(st.x, x)
	copy(st.v, v)
	copy(st.a, a)
	st.yielding.start(st.x)
}

// balance sets rest to p − C v − K x − h.
func (st *state) balance(p, v []float64) {
	copy(st.rest, p)
	st.s.dampingBlocks.subtract(st.rest, v)
	st.s.stiffnessBlocks.subtract(st.rest, st.x)
	st.yielding.subtract(st.rest)
}

// invert returns the inverse of a symmetric positive definite matrix.
func invert(name string, m mat.Symmetric) (*mat.SymDense, error) {
	var chol mat.Cholesky
	if !chol.Factorize(m) {
		return nil, fmt.Errorf("%s: the matrix is not positive definite", name)
	}
	var inverse mat.SymDense
	if err := chol.InverseTo(&inverse); err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	return &inverse, nil
}

// sum returns M + c·C + k·K.
func sum(m *mat.SymDense, c float64, damping *mat.SymDense, k float64, stiffness *mat.SymDense) *mat.SymDense {
	n := m.SymmetricDim()
	out := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			out.SetSym(i, j, m.At(i, j)+c*damping.At(i, j)+k*stiffness.At(i, j))
		}
	}
	return out
}

// plus returns x + c·y, rounded twice on every machine: a compiler may not
// fuse the two where the product is converted. So the paths for one level and
// for several agree to the last bit on any of them.
func plus(x, c, y float64) float64 { return x + float64(c*y) }
