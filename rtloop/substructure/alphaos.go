package substructure

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var alphaOSKind = kind.Entry[NewIntegrator]{
	Kind: kind.Kind{
		Name: "alpha-OS",
		Doc: "operator splitting: sends an explicit predictor to the specimens, then corrects implicitly with the initial stiffness; " +
			"stable at any step while nothing stiffens",
		Equation: "x̃ = x + dt·v + dt²·(½ − β)·a;  ṽ = v + dt·(1 − γ)·a;  M·a⁺ = (1 + α)·R⁺ − α·R,  " +
			"R = p(x̃) − h(x̃) − C·v − K·x̃ − K₀·(x − x̃);  x⁺ = x̃ + β·dt²·a⁺;  v⁺ = ṽ + γ·dt·a⁺;  " +
			"γ = ½ − α,  β = ¼·(1 − α)²,  K₀ the whole structure's initial stiffness",
		Source: "Combescure & Pegon 1997, α-operator splitting time integration technique for pseudodynamic testing: " +
			"error propagation analysis, Soil Dyn. Earthq. Eng. 16(7-8)",
		Settings: []kind.Setting{
			kind.Number("alpha", quantity.None, "α: 0 damps nothing, −1/3 damps modes too fast for the step most").
				Default(-0.05).Range(-1.0/3, 0),
		},
	},
	New: newAlphaOS,
}

// alphaOS is α operator splitting (Combescure & Pegon 1997). With α from −1/3
// to 0, γ = ½ − α and β = ¼(1 − α)² the predictors are
//
//	x̃_{k+1} = x_k + dt·v_k + dt²(½ − β) a_k
//	ṽ_{k+1} = v_k + dt(1 − γ) a_k
//
// x̃ is what X shows between Predict and Correct: the target to which the
// specimens are moved, and to which hysteretic storeys go. Their forces at the
// corrected displacement are taken to be those at x̃ and K₀(x − x̃) more, K₀
// the stiffness of the whole structure at rest, hysteretic storeys and
// specimens included:
//
//	M a_{k+1} = (1 + α) R_{k+1} − α R_k
//	R = p(x̃) − h(x̃) − C v − K x̃ − K₀(x − x̃)
//	x_{k+1} = x̃_{k+1} + β dt² a_{k+1},  v_{k+1} = ṽ_{k+1} + γ dt a_{k+1}
//
// which is one linear system for a_{k+1}, with the matrix
// M + (1+α)(γ dt·C + β dt²·K₀). X shows x from Correct on. During Predict V
// becomes v_k + dt·a_k, the velocity at t_{k+1} to first order, not ṽ, which is
// half a step behind.
//
// Where nothing yields this is the implicit method of Hilber, Hughes & Taylor
// (1977): stable at any step, the spectral radius of modes far above 1/dt
// being (1 + α)/(1 − α); α = 0 is average acceleration. With Ω = ω·dt, small,
//
//	ζ̄ ≈ −α(1 + α)²/8·Ω³,   T̄/T − 1 ≈ (1/12 − α(2 + 3α)/8) Ω²
//
// so that a mode loses 4πζ̄ of its energy a cycle to the method.
//
// The target is not the displacement: x̃ = x − β dt²·a is (1 + βΩ²) times a
// harmonic x, 0.3 % more at Ω = 0.1 but β Ω² times where Ω is large. Modes too
// fast for the step therefore do not overshoot in x, but do in what is sent to
// the actuator.
//
// The work of the specimens' forces on their targets x̃ differs from that of
// the forces that act on x. Of an elastic specimen of stiffness k the
// difference is k x̃(x − x̃) + ½k(x − x̃)² at the moment: of second order,
// βΩ²·2 of the energy in the specimen, and it does not add up. Of one that
// yields, with the stiffness k_t at the time, it grows by (k − k_t)(x − x̃) per
// unit of movement: of second order too.
type alphaOS struct {
	weighted
	ahead, half float64   // dt(½ − β), dt(1 − γ)
	pull, kick  float64   // β dt², γ dt
	moved       float64   // x − x̃ over a: pull after Correct, else 0
	back, again float64   // 1/(1+α), α/(1+α)
	predicted   []float64 // ṽ
	inertia     *matrix   // (M + (1+α)(γ dt·C + β dt²·K₀))⁻¹
}

var _ Integrator = (*alphaOS)(nil)

func newAlphaOS(s *Structure, dt float64, v kind.Values) (Integrator, error) {
	in, err := generalAlphaOS(s, dt, v.Num("alpha"))
	if err != nil {
		return nil, err
	}
	if s.single() {
		return newAlphaOS1(in), nil
	}
	return in, nil
}

func generalAlphaOS(s *Structure, dt, alpha float64) (*alphaOS, error) {
	gamma, beta := 0.5-alpha, (1-alpha)*(1-alpha)/4
	w, err := newWeighted(s, dt, -alpha, 1)
	if err != nil {
		return nil, err
	}
	inverse, err := invert("M + (1 + α)·(γ·dt·C + β·dt²·K)",
		sum(s.mass, (1+alpha)*gamma*dt, s.damping, (1+alpha)*beta*dt*dt, s.total))
	if err != nil {
		return nil, err
	}
	return &alphaOS{
		weighted: w, ahead: dt * (0.5 - beta), half: dt * (1 - gamma), pull: beta * dt * dt, kick: gamma * dt,
		back: 1 / (1 + alpha), again: alpha / (1 + alpha),
		predicted: make([]float64, s.n), inertia: newMatrix(inverse),
	}, nil
}

func (in *alphaOS) Centred() []float64 { return in.v }

func (in *alphaOS) Start(x0, p []float64) {
	in.weighted.Start(x0, p)
	in.moved = 0
}

func (in *alphaOS) SetState(x, v, a []float64) {
	in.weighted.SetState(x, v, a)
	in.moved = 0
}

func (in *alphaOS) Predict() {
	n := len(in.predicted)
	x, v, a := in.x[:n], in.v[:n], in.a[:n]
	for i := range in.predicted {
		x[i] = plus(x[i], in.dt, plus(v[i], in.ahead, a[i]))
		in.predicted[i] = plus(v[i], in.half, a[i])
		v[i] = plus(v[i], in.dt, a[i])
	}
	in.moved = 0
	in.yielding.advance(x, v, in.dt)
}

func (in *alphaOS) Correct(p []float64) {
	in.balance(p, in.predicted)
	n := len(in.predicted)
	x, v, a, rest, last := in.x[:n], in.v[:n], in.a[:n], in.rest[:n], in.last[:n]
	for i, r := range rest {
		rest[i] = weight(in.now, r, in.before, last[i])
	}
	in.inertia.mul(a, rest)
	in.s.massBlocks.mul(rest, a)
	for i, a := range a {
		x[i] = plus(x[i], in.pull, a)
		v[i] = plus(in.predicted[i], in.kick, a)
		// The equation of motion solved for R_{k+1}.
		last[i] = weight(in.back, rest[i], in.again, last[i])
	}
	in.moved = in.pull
}

// Strain adds to what hysteretic storeys store at x̃ the work of the forces
// that carry them on to x.
func (in *alphaOS) Strain() float64 {
	strain := in.state.Strain()
	for i := range in.yielding {
		h := &in.yielding[i]
		d := in.moved * h.extension(in.a)
		strain += d * (h.force + 0.5*in.s.storeys[i].stiffness*d)
	}
	return strain
}
