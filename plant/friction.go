package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var frictionKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "friction",
		Doc:      "sliding bearing or friction damper: elastic up to slip, friction that changes with speed",
		Equation: "f = k·(y − x), |f| ≤ μ·N, μ = μ_fast − (μ_fast − μ_slow)·e^(−|ẏ|/v_r), x the slip",
		Source:   "Constantinou, Mokha & Reinhorn 1990",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "stiffness k before slip").Range(0, 1e12),
			kind.Number("normal_force", quantity.Force, "normal force N on the sliding face").Range(0, 1e9),
			kind.Number("slow", quantity.None, "coefficient of friction μ_slow at zero speed").Range(0, 2).Sample("0.05"),
			kind.Number("fast", quantity.None, "coefficient of friction μ_fast at high speed").Range(0, 2).Sample("0.1"),
			kind.Number("speed", quantity.Velocity, "speed v_r over which it goes from one to the other").Default(0.05).Range(1e-6, 100),
		},
	},
	New: newFriction,
}

// friction is a spring that slips where its force meets the friction,
//
//	f = k·(y − x),   |f| ≤ μ·N,   μ = μ_fast − (μ_fast − μ_slow)·e^(−|ẏ|/v_r),
//
// f the force, N; y the displacement, m; x the slip, m, which moves only while
// the force is at its bound; k the stiffness before slip, N/m; N the normal
// force, N, which does not change; μ the coefficient of friction at velocity
// ẏ, m/s, between μ_slow at rest and μ_fast, v_r the speed at which 63 % of the
// way is gone.
//
// Each Advance is a straight path at whose end the velocity is the one it is
// given: the force follows y and stops at the bound for that velocity. Where
// the bound has come down, as it does when sliding slows, the spring relaxes by
// slip. Elastic motion leaves no trace in x and thus does not drift.
//
// Stored is f²/2k. Dissipated is the work by the trapezoid rule on ticks less
// what is stored; at constant speed a full cycle between ±y_m dissipates
// 4μN·(y_m − μN/k).
type friction struct {
	k, perStiff float64 // N/m; m/N, or 0 for k = 0, when there is no force
	fast, drop  float64 // μ_fast·N and (μ_fast − μ_slow)·N, N
	least       float64 // of both bounds, N: no need to look at the speed below it
	perSpeed    float64 // 1/v_r, s/m

	x, f, y float64
	atStart float64 // stored by Start, J
	work    work
}

var _ Element = (*friction)(nil)
var _ Previewer = (*friction)(nil)

func newFriction(v kind.Values) (Element, error) {
	n, slow, fast := v.Num("normal_force"), v.Num("slow"), v.Num("fast")
	if !(v.Num("speed") > 0) {
		return nil, fmt.Errorf("speed: %v m/s is not above 0", v.Num("speed"))
	}
	e := &friction{
		k: v.Num("stiffness"), fast: fast * n, drop: (fast - slow) * n,
		least: min(fast, slow) * n, perSpeed: 1 / v.Num("speed"),
	}
	if e.k > 0 {
		e.perStiff = 1 / e.k
	}
	return e, nil
}

// Start puts the element at displacement y, m, along a slow path from zero.
// What that dissipated does not count.
func (e *friction) Start(y float64) {
	e.x, e.f, e.y = 0, 0, 0
	e.follow(y, 0)
	e.work.start(e.f, y)
	e.atStart = e.stored()
}

func (e *friction) Advance(y, v, _ float64) float64 {
	e.follow(y, v)
	e.work.move(e.f, y)
	return e.f
}

// Preview returns the force that Advance would return, N, and changes nothing.
func (e *friction) Preview(y, v, _ float64) float64 {
	next := *e
	next.follow(y, v)
	return next.f
}

// Energy returns what is stored now and what was dissipated since Start, J.
func (e *friction) Energy() (stored, dissipated float64) {
	stored = e.stored()
	return stored, e.work.total() - (stored - e.atStart)
}

// Stiffness returns that before slip, N/m.
func (e *friction) Stiffness() float64 { return e.k }

func (e *friction) follow(y, v float64) {
	if y != e.y { // else rounding could move a force at its bound
		e.y, e.f = y, e.k*(y-e.x)
	}
	if math.Abs(e.f) <= e.least {
		return
	}
	bound := e.fast - e.drop*math.Exp(-math.Abs(v)*e.perSpeed)
	if e.f > bound {
		e.f, e.x = bound, y-bound*e.perStiff
	} else if e.f < -bound {
		e.f, e.x = -bound, y+bound*e.perStiff
	}
}

func (e *friction) stored() float64 { return 0.5 * e.f * e.f * e.perStiff }
