package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var maxwellKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "maxwell",
		Doc:      "spring and viscous damper in series: a damper with the brace that carries it",
		Equation: "f = k·(y − x) = c·|ẋ|^α·sgn ẋ, x the stroke of the damper",
		Source:   "Maxwell 1867; power law as in FEMA 356 (2000), fluid viscous devices",
		Settings: append([]kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "stiffness k of the spring").Range(0, 1e12),
		}, dampingSettings()...),
	},
	New: newMaxwell,
}

// maxwell is a spring in series with a damper whose force is a power of its
// velocity,
//
//	f = k·(y − x) = c·|ẋ|^α·sgn ẋ,
//
// f the force of both, N; y the displacement of the whole, m; x the stroke of
// the damper, m; k the stiffness, N/m; α the exponent; c the coefficient,
// N·(s/m)^α, from the force F at speed V: c = F/V^α. The element is given the
// path y alone, a straight line per Advance with velocity w = Δy/dt; along it
//
//	ḟ = k·(w − u),   u = (|f|/c)^(1/α)·sgn f the velocity of the damper.
//
// With α = 1 it is followed exactly, τ = c/k and r = dt/τ:
//
//	f ← e^(−r)·f + k·Δy·(1 − e^(−r))/r.
//
// Otherwise by one implicit step,
//
//	f⁺ + θ·k·dt·u(f⁺) = f + k·Δy − (1−θ)·k·dt·u(f),   θ = max(½, 1 − 1/ρ),
//
// ρ the largest k·dt·du/df between u and w, within which the damper's velocity
// stays: the trapezoid rule where the step resolves the damper, fitted towards
// the implicit Euler rule where it does not (in the sense of Liniger &
// Willoughby 1970). The right-hand side never falls with f, so that the force
// never overshoots what it settles at, and neither chatters at standstill. Of
// α > 1 the damper is infinitely quick around zero force; there θ = 1.
//
// A path that takes no time, dt = 0, moves the spring alone. At rest there is
// no force: Start takes the damper all the way.
//
// Stored is f²/2k, in the spring. Dissipated is the work by the trapezoid rule
// on ticks less what is stored. A sine of angular frequency ω meets, for
// α = 1, the storage stiffness k(ωτ)²/(1 + (ωτ)²) and the loss stiffness
// kωτ/(1 + (ωτ)²).
//
// Its stiffness is k: a sudden move leaves the damper behind. A slow one meets
// none, but an integrator that is stable up to the stiffness it was told must
// be told of the largest that it can meet.
type maxwell struct {
	k, c, alpha float64
	beta        float64 // 1/α
	perStiff    float64 // 1/k, m/N; 0 for k = 0, when there is no force

	dt, e, p float64 // α = 1: the last dt, s, with e^(−r) and (1 − e^(−r))/r

	f, u, y float64 // N, m/s, m
	work    work
}

var _ Element = (*maxwell)(nil)
var _ Previewer = (*maxwell)(nil)

func newMaxwell(v kind.Values) (Element, error) {
	c, alpha, err := dampingLaw(v, "maxwell")
	if err != nil {
		return nil, err
	}
	m := &maxwell{k: v.Num("stiffness"), c: c, alpha: alpha, beta: 1 / alpha, dt: -1}
	if !(m.k >= 0) || math.IsInf(m.k, 0) {
		return nil, fmt.Errorf("stiffness: %v N/m is not at least 0", m.k)
	}
	if m.k > 0 {
		m.perStiff = 1 / m.k
	}
	return m, nil
}

func (m *maxwell) Start(y float64) {
	m.f, m.u, m.y = 0, 0, y
	m.work.start(0, y)
}

func (m *maxwell) Advance(y, _, dt float64) float64 {
	m.follow(y, dt)
	m.work.move(m.f, y)
	return m.f
}

// Preview returns the force that Advance would return, N, and changes nothing.
func (m *maxwell) Preview(y, _, dt float64) float64 {
	next := *m
	next.follow(y, dt)
	return next.f
}

// Energy returns what the spring stores and what was dissipated since Start, J.
func (m *maxwell) Energy() (stored, dissipated float64) {
	stored = 0.5 * m.f * m.f * m.perStiff
	return stored, m.work.total() - stored
}

// Stiffness returns that of the spring, N/m.
func (m *maxwell) Stiffness() float64 {
	if m.c == 0 {
		return 0
	}
	return m.k
}

func (m *maxwell) follow(y, dt float64) {
	dy := y - m.y
	m.y = y
	switch {
	case m.k == 0 || m.c == 0:
	case m.alpha == 1:
		if dt != m.dt {
			m.dt = dt
			m.e, m.p = relax(dt * m.k / m.c)
		}
		m.f = m.e*m.f + m.k*m.p*dy
	case !(dt > 0):
		m.f += m.k * dy
		m.u = math.Copysign(math.Pow(math.Abs(m.f)/m.c, m.beta), m.f)
	default:
		m.step(dy, dt)
	}
}

// relax returns e^(−r) and (1 − e^(−r))/r.
func relax(r float64) (e, p float64) {
	if r == 0 {
		return 1, 1
	}
	return math.Exp(-r), -math.Expm1(-r) / r
}

// step is the implicit step for α ≠ 1.
func (m *maxwell) step(dy, dt float64) {
	kdt := m.k * dt
	theta := max(0.5, 1-1/(kdt*m.quickest(dy/dt)))
	rhs := m.f + m.k*dy - (1-theta)*kdt*m.u
	m.f, m.u = m.balance(theta*kdt, math.Abs(rhs))
	if rhs < 0 {
		m.f, m.u = -m.f, -m.u
	}
}

// quickest returns the largest du/df = β·|u|^(1−α)/c while the damper's velocity
// goes from u to w.
func (m *maxwell) quickest(w float64) float64 {
	a, b := math.Abs(m.u), math.Abs(w)
	if m.alpha < 1 {
		return m.beta * m.power(max(a, b)) / m.c
	}
	if m.u*w <= 0 {
		return math.Inf(1)
	}
	return m.beta * m.power(min(a, b)) / m.c
}

// power is u^(1−α).
func (m *maxwell) power(u float64) float64 {
	switch m.alpha {
	case 0.5:
		return math.Sqrt(u)
	case 2:
		return 1 / u
	}
	return math.Pow(u, 1-m.alpha)
}

// balance solves f + b·u = s for the damper's force f and velocity u, both at
// least 0, b > 0.
func (m *maxwell) balance(b, s float64) (f, u float64) {
	if m.alpha < 1 { // f/c = x, u = x^β
		x, xp := powerRoot(m.c, b, m.beta, s)
		return m.c * x, xp
	}
	x, xp := powerRoot(b, m.c, m.alpha, s)
	return m.c * xp, x
}

// powerRoot solves a·x + b·x^p = s for x ≥ 0, where a, b > 0, p > 1, s ≥ 0, and
// returns x^p too. Each of the terms alone gives a bound above; from the lower
// of the two, where the sum is at most twice what it should be, Newton's rule
// comes down to the root of the convex function without passing it.
func powerRoot(a, b, p, s float64) (x, xp float64) {
	if s == 0 {
		return 0, 0
	}
	if p == 2 {
		x = 2 * s / (a + math.Sqrt(a*a+4*b*s))
		return x, x * x
	}
	x = s / a
	xp = math.Pow(x, p)
	if !(b*xp <= s) {
		xp = s / b
		x = math.Pow(xp, 1/p)
	}
	for range 60 { // some 5 are enough
		next := x - (a*x+b*xp-s)/(a+p*b*xp/x)
		if !(next < x) {
			break
		}
		done := x-next <= 1e-9*x // squared, that is nothing
		x, xp = next, math.Pow(next, p)
		if done {
			break
		}
	}
	return x, xp
}
