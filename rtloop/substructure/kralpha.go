package substructure

import (
	"errors"
	"fmt"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"

	"gonum.org/v1/gonum/mat"
)

var krAlphaKind = kind.Entry[NewIntegrator]{
	Kind: kind.Kind{
		Name: "KR-alpha",
		Doc: "Kolay-Ricles method, explicit in displacement and velocity; damps modes too fast for the step, " +
			"stable at any step while nothing stiffens",
		Equation: "v⁺ = v + dt·α1·a;  x⁺ = x + dt·v + dt²·(½ + γ)·α1·a;  " +
			"M·((I − α3)·a⁺ + α3·a) = (1 − α_f)·R⁺ + α_f·R,  R = p − h − C·v − K·x;  " +
			"α1 = D⁻¹·M,  D = M + γ·dt·C + β·dt²·K,  α3 = D⁻¹·(α_m·M + α_f·(γ·dt·C + β·dt²·K));  " +
			"α_m = (2ρ∞ − 1)/(ρ∞ + 1),  α_f = ρ∞/(ρ∞ + 1),  γ = ½ − α_m + α_f,  β = ¼·(½ + γ)²",
		Source: "Kolay & Ricles 2014, Development of a family of unconditionally stable explicit direct integration " +
			"algorithms with controllable numerical energy dissipation, Earthq. Eng. Struct. Dyn. 43(9)",
		Settings: []kind.Setting{
			kind.Number("rho_infinity", quantity.None,
				"spectral radius ρ∞ of modes far too fast for the step: 1 damps nothing, 0 wipes them out at once").
				Default(0.75).Range(0, 1),
		},
	},
	New: newKRAlpha,
}

// krAlpha is the method of Kolay & Ricles (2014). With ρ∞ the spectral radius
// that modes far above 1/dt shall have, 0 to 1,
//
//	α_m = (2ρ∞ − 1)/(ρ∞ + 1),  α_f = ρ∞/(ρ∞ + 1)
//	γ = ½ − α_m + α_f,  ½ + γ = 2/(ρ∞ + 1),  β = ¼(½ + γ)²
//	D = M + γ dt·C + β dt²·K₀,  N = α_m M + α_f (γ dt·C + β dt²·K₀)
//
// K₀ the stiffness of the whole structure at rest, hysteretic storeys and
// specimens included, and α1 = D⁻¹M, α3 = D⁻¹N,
//
//	x_{k+1} = x_k + dt·v_k + dt²(½ + γ) α1 a_k
//	v_{k+1} = v_k + dt·α1 a_k
//	M ((I − α3) a_{k+1} + α3 a_k) = (1 − α_f) R_{k+1} + α_f R_k
//	R = p − h − C v − K x
//
// The tick works with Δ = dt·α1 a, the change of velocity to come, for which
// the last equation is (all matrices being functions of M⁻¹(γ dt·C + β dt²·K₀))
//
//	(D − N) Δ_{k+1} = dt ((1 − α_f) R_{k+1} + α_f R_k) − N Δ_k,  a = M⁻¹D Δ/dt
//
// with one full matrix only, (D − N)⁻¹.
//
// The poles of a linear mode are those of the generalized-α method (Chung &
// Hulbert 1993) with the same parameters. With Ω = ω·dt they solve, undamped,
//
//	((1−α_m)z + α_m)(z−1)² + Ω²((1−α_f)z + α_f)(β(z−1)² + (½+γ)(z−1) + 1) = 0
//
// and, as Ω → ∞, all become −ρ∞: that needs 4β = (½ + γ)². (With
// β = ½(½ + γ) instead two of them would keep the modulus √ρ∞.) ρ∞ = 1 is the
// method of Chen & Ricles. At small Ω numerical damping is of third order and
// periods err in second; with q = (1 − ρ∞)/(1 + ρ∞),
//
//	ζ̄ ≈ ½ q³ Ω³,   T̄/T − 1 ≈ (1/12 + ⅜ q²) Ω²
//
// so that a mode loses 2π q³Ω³ of its energy a cycle to the method: of an
// energy balance that is part of the residual, the rest of which is of second
// order and does not grow.
//
// As in CR, v_k is late: it belongs to t_k − γ dt. At the tick the velocity is
// v_k + γΔ_k to second order, which Centred gives. Rest is taken as v₀ = 0: a
// load that jumps at t = 0 acts γ dt early, an error of first order; otherwise
// displacements are of second order.
//
// Released at rest from x₀, modes too fast for the step overshoot, as Ω → ∞ as
//
//	x_k = (−ρ∞)^k (1 + k(1 + ρ∞)/ρ∞) x₀
//
// to 2 x₀ for ρ∞ = ½, 3.4 x₀ for ¾, 7.7 x₀ for 0.9, without bound for 1.
type krAlpha struct {
	weighted
	reach   float64   // ½ + γ
	late    float64   // γ
	dv      []float64 // Δ_k
	centred []float64
	gain    *matrix // dt·α1
	recoil  *matrix // N/dt
	solve   *matrix // dt·(D − N)⁻¹
	inertia *matrix // M⁻¹D/dt
}

var _ Integrator = (*krAlpha)(nil)

func newKRAlpha(s *Structure, dt float64, v kind.Values) (Integrator, error) {
	in, err := generalKRAlpha(s, dt, v.Num("rho_infinity"))
	if err != nil {
		return nil, err
	}
	if s.single() {
		return newKRAlpha1(in), nil
	}
	return in, nil
}

func generalKRAlpha(s *Structure, dt, rho float64) (*krAlpha, error) {
	am, af, reach := (2*rho-1)/(rho+1), rho/(rho+1), 2/(rho+1)
	gamma, beta := reach-0.5, reach*reach/4
	w, err := newWeighted(s, dt, af, 2)
	if err != nil {
		return nil, err
	}
	whole := sum(s.mass, gamma*dt, s.damping, beta*dt*dt, s.total)
	recoil := combine(am-af, s.mass, af, whole)
	solve, err := invert("M·(I − α3)", combine(1, whole, -1, recoil))
	if err != nil {
		return nil, err
	}
	var chol mat.Cholesky
	if !chol.Factorize(whole) {
		return nil, errors.New("the matrix M + γ·dt·C + β·dt²·K is not positive definite")
	}
	var gain mat.Dense
	if err := chol.SolveTo(&gain, s.mass); err != nil {
		return nil, fmt.Errorf("the matrix M + γ·dt·C + β·dt²·K: %w", err)
	}
	gain.Scale(dt, &gain)
	inverse, err := invert("mass", s.mass)
	if err != nil {
		return nil, err
	}
	var inertia mat.Dense
	inertia.Mul(inverse, whole)
	inertia.Scale(1/dt, &inertia)
	solve.ScaleSym(dt, solve)
	recoil.ScaleSym(1/dt, recoil)
	return &krAlpha{
		weighted: w, reach: reach, late: gamma, dv: w.memory[s.n:], centred: make([]float64, s.n),
		gain: newMatrix(&gain), recoil: newMatrix(recoil), solve: newMatrix(solve), inertia: newMatrix(&inertia),
	}, nil
}

func (in *krAlpha) Centred() []float64 { return in.centred }

func (in *krAlpha) Start(x0, p []float64) {
	in.weighted.Start(x0, p)
	in.gain.mul(in.dv, in.a)
	in.centre()
}

func (in *krAlpha) SetState(x, v, a []float64) {
	in.weighted.SetState(x, v, a)
	in.gain.mul(in.dv, in.a)
	in.centre()
}

func (in *krAlpha) Predict() {
	n := len(in.dv)
	x, v := in.x[:n], in.v[:n]
	for i, dv := range in.dv {
		x[i] = plus(x[i], in.dt, plus(v[i], in.reach, dv))
		v[i] += dv
	}
	in.yielding.advance(x, v, in.dt)
}

func (in *krAlpha) Correct(p []float64) {
	in.balance(p, in.v)
	n := len(in.dv)
	rest, last := in.rest[:n], in.last[:n]
	for i, r := range rest {
		rest[i] = weight(in.now, r, in.before, last[i])
		last[i] = r
	}
	in.recoil.subtract(rest, in.dv)
	in.solve.mul(in.dv, rest)
	in.inertia.mul(in.a, in.dv)
	in.centre()
}

// centre finds the velocities at the tick.
func (in *krAlpha) centre() {
	n := len(in.dv)
	v, centred := in.v[:n], in.centred[:n]
	for i, dv := range in.dv {
		centred[i] = plus(v[i], in.late, dv)
	}
}
