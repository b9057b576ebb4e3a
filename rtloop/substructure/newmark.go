package substructure

import (
	"antelag/scenarios/kind"
)

var newmarkExplicitKind = kind.Entry[NewIntegrator]{
	Kind: kind.Kind{
		Name: "newmark-explicit",
		Doc:  "Newmark's method, explicit (γ = ½, β = 0); stable for steps below T/π of the shortest period",
		Equation: "x⁺ = x + dt·v + dt²/2·a;  (M + dt/2·C)·a⁺ = p⁺ − h⁺ − K·x⁺ − C·(v + dt/2·a);  " +
			"v⁺ = v + dt/2·(a + a⁺)",
		Source: "Newmark 1959, A method of computation for structural dynamics, J. Eng. Mech. Div. ASCE 85(EM3)",
	},
	New: newNewmarkExplicit,
}

// newmarkExplicit is Newmark's method with γ = ½, β = 0: central differences.
// With w = v_k + dt/2·a_k, the velocity half a step on,
//
//	x_{k+1} = x_k + dt·w
//	(M + dt/2·C) a_{k+1} = p_{k+1} − h_{k+1} − K x_{k+1} − C w
//	v_{k+1} = w + dt/2·a_{k+1}
//
// which is the textbook's form with common terms gathered. Predict leaves
// v_k + dt·a_k in V. A free undamped mode oscillates at ω̄ with
// ω̄·dt = 2 asin(ω·dt/2) and grows once ω·dt > 2; damping does not move that
// limit.
type newmarkExplicit struct {
	state
	half    float64 // dt/2
	w       []float64
	inertia *matrix // (M + dt/2·C)⁻¹
}

var _ Integrator = (*newmarkExplicit)(nil)

func newNewmarkExplicit(s *Structure, dt float64, _ kind.Values) (Integrator, error) {
	in, err := generalNewmarkExplicit(s, dt)
	if err != nil {
		return nil, err
	}
	if s.single() {
		return newNewmarkExplicit1(in), nil
	}
	return in, nil
}

func generalNewmarkExplicit(s *Structure, dt float64) (*newmarkExplicit, error) {
	st, err := newState(s, dt)
	if err != nil {
		return nil, err
	}
	inverse, err := invert("M + dt/2·C", sum(s.mass, dt/2, s.damping, 0, s.total))
	if err != nil {
		return nil, err
	}
	return &newmarkExplicit{
		state: st, half: dt / 2, w: make([]float64, s.n), inertia: newMatrix(inverse),
	}, nil
}

func (in *newmarkExplicit) Centred() []float64 { return in.v }

func (in *newmarkExplicit) Predict() {
	n := len(in.w)
	x, v, a := in.x[:n], in.v[:n], in.a[:n]
	for i := range in.w {
		w := plus(v[i], in.half, a[i])
		in.w[i] = w
		x[i] = plus(x[i], in.dt, w)
		v[i] = plus(w, in.half, a[i])
	}
	in.yielding.advance(x, v, in.dt)
}

func (in *newmarkExplicit) Correct(p []float64) {
	in.balance(p, in.w)
	in.inertia.mul(in.a, in.rest)
	a, v := in.a[:len(in.w)], in.v[:len(in.w)]
	for i, w := range in.w {
		v[i] = plus(w, in.half, a[i])
	}
}
