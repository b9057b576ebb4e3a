package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var servoHydraulicKind = kind.Entry[NewActuator]{
	Kind: kind.Kind{
		Name:     "servo-hydraulic",
		Doc:      "servo-valve, cylinder and inner displacement controller: lag that depends on force, flow and pressure that saturate",
		Equation: "Q = Q_R·x_v·√((p_s − sgn(x_v)·p_L)/p_R), ṗ_L = (4β/V)·(Q − A·ẏ − C_l·p_L), m·ÿ = A·p_L − r − friction; x_v of second order behind e = kp·(u − y) + ki·∫(u − y) − kd·ẏ − kdp·p_L; friction viscous below 1 mm/s",
		Source:   "Merritt 1967",
		Settings: []kind.Setting{
			kind.Number("supply_pressure", quantity.Pressure, "supply pressure p_s over return").Default(21e6).Range(1e6, 1e8),
			kind.Number("rated_flow", quantity.Flow, "flow Q_R of the open valve at a pressure drop p_R of 7 MPa").Default(250e-3/60).Range(1e-6, 1),
			kind.Number("piston_area", quantity.Area, "piston area A, the same on both sides").Default(12.5e-3).Range(1e-5, 1),
			kind.Number("chamber_volume", quantity.Volume, "oil volume V of both chambers together").Default(4e-3).Range(1e-6, 1),
			kind.Number("bulk_modulus", quantity.Pressure, "effective bulk modulus β of the oil, with air and hoses").Default(1e9).Range(1e7, 1e10),
			kind.Number("leakage", quantity.Leakage, "leakage C_l across the piston, flow per load pressure").Default(1e-11).Range(0, 1e-7),
			kind.Number("piston_mass", quantity.Mass, "moving mass m of piston, rod and fixture").Default(100).Range(0.1, 1e5),
			kind.Number("friction", quantity.Force, "Coulomb friction of the seals").Default(1e3).Range(0, 1e6),
			kind.Number("valve_frequency", quantity.Frequency, "natural frequency of the valve's spool").Default(80).Range(1, 5000),
			kind.Number("valve_damping", quantity.None, "damping ratio of the valve's spool").Default(0.8).Range(0.05, 10),
			kind.Number("kp", quantity.PerLength, "proportional gain: opening per error; lower it for a heavy specimen: the default is good up to about half a tonne").Default(175).Range(0, 1e5),
			kind.Number("ki", quantity.PerTravel, "integral gain: opening per error and time").Default(200).Range(0, 1e6),
			kind.Number("kd", quantity.PerVelocity, "velocity gain: opening taken off per velocity of the piston").Default(0).Range(0, 1e3),
			kind.Number("kdp", quantity.PerPressure, "load-pressure feedback: opening taken off per load pressure").Default(1e-9).Range(0, 1e-5),
			kind.Number("delay", quantity.Time, "dead time of the electronics before the controller sees the command").Default(1e-3).Range(0, 1),
		},
	},
	New: newServoHydraulic,
}

const (
	// ratedDrop is p_R, Pa: the whole pressure drop at which a valve's flow is
	// rated, 1000 psi in the trade.
	ratedDrop = 7e6
	// creep is the speed, m/s, below which the friction of the seals is
	// viscous.
	creep = 1e-3
	// resolved is how far, in radians, the fastest oscillation may turn in one
	// sub-step.
	resolved = 0.2
	// leastSteps and mostSteps bound the sub-steps of a tick.
	leastSteps, mostSteps = 4, 1024
)

// ServoHydraulic is a double-acting, double-rod cylinder behind a four-way
// servo-valve and an inner controller of the displacement (Merritt 1967):
//
//	w = u(t−τ)
//	e = k_p·(w − y) + k_i∫(w − y)dt − k_d·ẏ − k_dp·p_L,   |e| ≤ 1
//	ẍ_v + 2ζ_vω_vẋ_v + ω_v²x_v = ω_v²·e,                 |x_v| ≤ 1
//	Q = Q_R·x_v·√((p_s − sgn(x_v)·p_L)/p_R)
//	ṗ_L = (4β/V)·(Q − A·ẏ − C_l·p_L),                     |p_L| ≤ p_s
//	m·ÿ = A·p_L − r − F·ẏ/max(|ẏ|, 1 mm/s)
//
// u the command, m; τ the delay of the electronics, s; y the displacement, m; e
// the valve's command and x_v its opening, 1 when fully open; Q the load flow,
// m³/s; Q_R the rated flow at p_R = 7 MPa; p_s the supply pressure and p_L the
// load pressure, the difference between the chambers, Pa; A the piston area,
// m²; V the volume of both chambers, m³; β the bulk modulus, Pa; C_l the
// leakage, m³/(s·Pa); m the moving mass, the specimen's included, kg; r the
// force of the specimen, N; F the Coulomb friction, N.
//
// Closed forms that follow: no-load speed Q_R√(p_s/p_R)/A; 1/√3 of it at
// p_L = ⅔p_s, where the power is largest; stall force A·p_s; oil-column
// frequency √(4βA²/(V·m)).
//
// At the edges:
//   - The valve's command stops at ±1, and the integral does not grow further
//     in a direction in which it has stopped. The spool stops dead at ±1.
//   - The derivative acts on the motion alone: the command has jumps.
//   - When the specimen drives the piston, p_L can reach the supply pressure
//     or, against the open valve, pass it. Relief valves across the piston take
//     the flow then, so that p_L stays at ±p_s; the root is never of a negative
//     number. A force beyond the stall force A·p_s pushes the piston back.
//   - Friction is viscous below 1 mm/s, so that the piston can rest under any
//     load without chatter; it does not hold a load.
//   - The cylinder has no ends.
//   - It starts at rest holding the specimen's force: p_L = r/A, the spool open
//     by what leaks, the integral at what keeps it there (where k_i is 0, a
//     constant bias). Where the force is more than it can hold, it starts with
//     p_L at the supply pressure and the valve as it would have to be.
//
// Each tick is cut into equal sub-steps, at least 4, and as many as turn valve,
// oil column and specimen by no more than 0.2 rad in one. The spool, which
// sees the controller's output extrapolated to the sub-step's end, is advanced
// exactly for a straight line (see swing). Pressure and piston go by the
// second-order backward differentiation formula (Gear 1971)
//
//	z⁺ − z = (z − z⁻)/3 + (2/3)·h·ż⁺,   z any of p_L, ẏ, y,
//
// implicit in everything, the specimen included: the velocity at the end of the
// sub-step is found by bracketed secants such that the forces balance there.
// The formula is L-stable: an oil spring, a brace or a damper too stiff for the
// step is followed quasi-statically and does not ring. Its error is of order
// (ωh)². To a sub-step the load pressure is the solution of a quadratic
// equation in the root.
//
// A specimen's masses (see Massive) move with the piston and are part of m; the
// force that the specimen reports contains their inertia all the same. An
// element that is no Previewer is met with its last force.
//
// With its defaults, those of an invented actuator of 250 kN, the loop answers
// some 11 ms late, little more on a specimen of 20 kN/mm. A specimen of more
// than about half a tonne needs lower gains, as it brings the oil column down
// to where the valve still answers.
type ServoHydraulic struct {
	line delayLine // of u

	supply, area          float64 // p_s, A
	flow                  float64 // Q_R/√p_R
	oil                   float64 // 4β/V
	leakage               float64 // C_l
	pistonMass            float64
	friction, perCreep    float64 // F, and F/creep
	valveOmega, valveZeta float64
	kp, ki, kd, kdp       float64
	least                 int  // sub-steps a tick at least
	exact                 bool // balance to rounding, see Refine
	steps                 servoSteps
	state                 servoState
}

var _ Actuator = (*ServoHydraulic)(nil)

func newServoHydraulic(t Timing, v kind.Values) (Actuator, error) {
	line, err := newDelayLine(t, v.Num("delay"))
	if err != nil {
		return nil, err
	}
	for _, name := range []string{"supply_pressure", "rated_flow", "piston_area", "chamber_volume", "bulk_modulus", "piston_mass", "valve_frequency", "valve_damping"} {
		if x := v.Num(name); !(x > 0) || math.IsInf(x, 0) {
			return nil, fmt.Errorf("%s: %v is not above 0", name, x)
		}
	}
	for _, name := range []string{"leakage", "friction", "kp", "ki", "kd", "kdp"} {
		if x := v.Num(name); !(x >= 0) || math.IsInf(x, 0) {
			return nil, fmt.Errorf("%s: %v is not at least 0", name, x)
		}
	}
	p := &ServoHydraulic{
		line: line, supply: v.Num("supply_pressure"), area: v.Num("piston_area"),
		flow: v.Num("rated_flow") / math.Sqrt(ratedDrop), leakage: v.Num("leakage"),
		oil:        4 * v.Num("bulk_modulus") / v.Num("chamber_volume"),
		pistonMass: v.Num("piston_mass"), friction: v.Num("friction"), perCreep: v.Num("friction") / creep,
		valveOmega: angular(v.Num("valve_frequency")), valveZeta: v.Num("valve_damping"),
		kp: v.Num("kp"), ki: v.Num("ki"), kd: v.Num("kd"), kdp: v.Num("kdp"),
		least: leastSteps,
	}
	if n := p.needed(p.valveOmega); n > mostSteps {
		return nil, fmt.Errorf("valve_frequency: %v Hz needs %d sub-steps in a tick of %v s; at most %d", v.Num("valve_frequency"), n, t.Tick, mostSteps)
	}
	column := p.columnOmega(0, p.pistonMass)
	if n := p.needed(column); n > mostSteps {
		return nil, fmt.Errorf("piston_mass: with %v kg the oil column is at %.4g Hz and needs %d sub-steps in a tick of %v s; at most %d",
			p.pistonMass, column/angular(1), n, t.Tick, mostSteps)
	}
	return p, nil
}

// columnOmega is the frequency, rad/s, of a mass, kg, between the oil column,
// 4βA²/V stiff, and a specimen of stiffness k, N/m.
func (p *ServoHydraulic) columnOmega(k, mass float64) float64 {
	return math.Sqrt((p.oil*p.area*p.area + k) / mass)
}

// needed is how many sub-steps in a tick resolve a frequency, rad/s.
func (p *ServoHydraulic) needed(omega float64) int {
	return int(min(math.Ceil(omega*p.line.tick/resolved), 1<<40))
}

func (p *ServoHydraulic) Start(u float64, s *Specimen) (y float64) {
	s.Start(u)
	p.line.start(u)
	mass := p.pistonMass + s.Mass()
	// A specimen stiffer than the steps can resolve is met quasi-statically.
	n := max(p.needed(p.valveOmega), p.needed(p.columnOmega(s.Stiffness(), mass)))
	p.steps = p.cut(max(p.least, min(n, mostSteps)), mass, s.Stiffness())
	p.state = p.rest(u, s.Force())
	return u
}

func (p *ServoHydraulic) Advance(u float64, s *Specimen) (y, v float64) {
	c, b, a := p.line.push(u)
	bc, ac := b-c, a-c
	for i := range p.steps.in {
		in := &p.steps.in[i]
		p.command(in.from.of(c, bc, ac), in.to.of(c, bc, ac))
		p.move(s)
	}
	return p.state.y, p.state.v
}

// Opening returns the valve's opening x_v at the end of the last tick, −1 … 1.
func (p *ServoHydraulic) Opening() float64 { return p.state.x.y }

// Pressure returns the load pressure p_L at the end of the last tick, Pa.
func (p *ServoHydraulic) Pressure() float64 { return p.state.p }
