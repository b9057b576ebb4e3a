package substructure

import (
	"fmt"

	"antelag/scenarios/kind"

	"gonum.org/v1/gonum/mat"
)

var crKind = kind.Entry[NewIntegrator]{
	Kind: kind.Kind{
		Name: "CR",
		Doc:  "Chen-Ricles method, explicit in displacement and velocity; stable at any step while nothing stiffens",
		Equation: "α1 = α2 = 4·(4M + 2dt·C + dt²·K)⁻¹·M;  v⁺ = v + dt·α1·a;  x⁺ = x + dt·v + dt²·α2·a;  " +
			"M·a⁺ = p⁺ − h⁺ − C·v⁺ − K·x⁺",
		Source: "Chen & Ricles 2008, Development of direct integration algorithms for structural dynamics " +
			"using discrete control theory, J. Eng. Mech. 134(8)",
	},
	New: newCR,
}

// cr is the method of Chen & Ricles (2008). With
//
//	α = 4 (4M + 2dt·C + dt²·K₀)⁻¹ M
//
// K₀ the stiffness of the whole structure at rest, hysteretic storeys and
// specimens included,
//
//	v_{k+1} = v_k + dt·α a_k
//	x_{k+1} = x_k + dt·v_k + dt²·α a_k = x_k + dt·v_{k+1}
//	M a_{k+1} = p_{k+1} − h_{k+1} − C v_{k+1} − K x_{k+1}
//
// so that v_{k+1} is the mean velocity of the step from x_k to x_{k+1} and
// belongs to its middle. At the tick the velocity is v_k + dt/2·α a_k, the mean
// of the steps before and after, which Centred gives. Rest is taken as v₀ = 0:
// a load that jumps at t = 0 therefore acts half a step early, an error of
// first order; otherwise displacements are of second order.
//
// The poles of a linear mode are those of average acceleration: a free
// undamped mode oscillates at ω̄ with ω̄·dt = 2 atan(ω·dt/2) at any step, so
// long as specimens and storeys are no stiffer than in K₀. The response to a
// load is not that of average acceleration: the load p_k enters alone, not as
// (p_{k+1} + 2p_k + p_{k-1})/4. Released at rest from x₀ such a mode swings to
// x₀·√(1 + (ω·dt/2)²): at large steps it overshoots, but does not grow.
type cr struct {
	state
	gain    *matrix   // dt·α
	dv      []float64 // dt·α a_k
	centred []float64
}

var _ Integrator = (*cr)(nil)

func newCR(s *Structure, dt float64, _ kind.Values) (Integrator, error) {
	in, err := generalCR(s, dt)
	if err != nil {
		return nil, err
	}
	if s.single() {
		return newCR1(in), nil
	}
	return in, nil
}

func generalCR(s *Structure, dt float64) (*cr, error) {
	st, err := newState(s, dt)
	if err != nil {
		return nil, err
	}
	var chol mat.Cholesky
	if !chol.Factorize(sum(s.mass, dt/2, s.damping, dt*dt/4, s.total)) {
		return nil, fmt.Errorf("4M + 2dt·C + dt²·K: the matrix is not positive definite")
	}
	var gain mat.Dense
	if err := chol.SolveTo(&gain, s.mass); err != nil {
		return nil, fmt.Errorf("4M + 2dt·C + dt²·K: %w", err)
	}
	gain.Scale(dt, &gain)
	return &cr{state: st, gain: newMatrix(&gain), dv: make([]float64, s.n), centred: make([]float64, s.n)}, nil
}

func (in *cr) Centred() []float64 { return in.centred }

func (in *cr) Start(x0, p []float64) {
	in.state.Start(x0, p)
	in.ahead()
}

func (in *cr) SetState(x, v, a []float64) {
	in.state.SetState(x, v, a)
	in.ahead()
}

func (in *cr) Predict() {
	n := len(in.dv)
	x, v := in.x[:n], in.v[:n]
	for i, dv := range in.dv {
		v[i] += dv
		x[i] = plus(x[i], in.dt, v[i])
	}
	in.yielding.advance(x, v, in.dt)
}

func (in *cr) Correct(p []float64) {
	in.balance(p, in.v)
	in.inverseMass.mul(in.a, in.rest)
	in.ahead()
}

// ahead finds by how much the velocities will change in the step to come.
func (in *cr) ahead() {
	in.gain.mul(in.dv, in.a)
	n := len(in.dv)
	v, centred := in.v[:n], in.centred[:n]
	for i, dv := range in.dv {
		centred[i] = plus(v[i], 0.5, dv)
	}
}
