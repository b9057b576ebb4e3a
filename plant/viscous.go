package plant

import (
	"errors"
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var viscousKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "viscous",
		Doc:      "viscous damper, linear or of a power of the velocity",
		Equation: "f = c·|ẏ|^α·sgn ẏ",
		Source:   "FEMA 356 (2000), fluid viscous devices",
		Settings: dampingSettings(),
	},
	New: newViscous,
}

// dampingSettings are those of a damper by damping, or by force at speed.
func dampingSettings() []kind.Setting {
	return []kind.Setting{
		kind.Number("damping", quantity.Damping, "coefficient c of a linear damper; or give force and speed").Optional().Range(0, 1e12).Sample(`"50 kN*s/m"`),
		kind.Number("force", quantity.Force, "force that the damper has at the given speed").Optional().Range(0, 1e9),
		kind.Number("speed", quantity.Velocity, "speed at which it has the given force").Optional().Range(1e-6, 100),
		kind.Number("exponent", quantity.None, "velocity exponent α; other than 1 with force and speed only").Default(1).Range(0.1, 2),
	}
}

// law picks how |ẏ|^α is worked out; the powers that dampers mostly have need
// no logarithm.
type law int

const (
	power law = iota
	linear
	root
	square
)

// viscous is a damper whose force is a power of the velocity,
//
//	f = c·|ẏ|^α·sgn ẏ,
//
// f the force, N; ẏ the velocity, m/s; α the exponent; c the coefficient,
// N·(s/m)^α, from the force F at speed V: c = F/V^α. It has no force at rest,
// stores nothing and dissipates ∫ f dy, summed by the trapezoid rule on ticks.
// Its velocity is the one it is given; it does not look at dt.
type viscous struct {
	c, alpha float64
	law      law
	work     work
}

var _ Element = (*viscous)(nil)

func newViscous(v kind.Values) (Element, error) {
	c, alpha, err := dampingLaw(v, "viscous")
	if err != nil {
		return nil, err
	}
	return &viscous{c: c, alpha: alpha, law: lawOf(alpha)}, nil
}

// dampingLaw reads coefficient c, N·(s/m)^α, and exponent α of a damper that is
// given by damping, or by force, speed and exponent.
func dampingLaw(v kind.Values, of string) (c, alpha float64, err error) {
	alpha = v.Num("exponent")
	if !(alpha > 0) {
		return 0, 0, fmt.Errorf("exponent: %v is not above 0", alpha)
	}
	switch {
	case v.Has("damping") && v.Has("force"):
		return 0, 0, errors.New("damping: is given beside force; give damping, or force and speed")
	case v.Has("damping") && v.Has("speed"):
		return 0, 0, errors.New("damping: is given beside speed; give damping, or force and speed")
	case v.Has("damping") && alpha != 1:
		return 0, 0, fmt.Errorf("exponent: %v goes with force and speed; a damper given by damping has exponent 1", alpha)
	case v.Has("damping"):
		return v.Num("damping"), alpha, nil
	case v.Has("force") && v.Has("speed"):
		if !(v.Num("speed") > 0) {
			return 0, 0, fmt.Errorf("speed: %v m/s is not above 0", v.Num("speed"))
		}
		return v.Num("force") / math.Pow(v.Num("speed"), alpha), alpha, nil
	case v.Has("force"):
		return 0, 0, errors.New("speed: is missing; force needs the speed at which the damper has it")
	case v.Has("speed"):
		return 0, 0, errors.New("force: is missing; speed needs the force that the damper has at it")
	}
	return 0, 0, fmt.Errorf("damping: is missing; %s needs damping, or force and speed", of)
}

func lawOf(alpha float64) law {
	switch alpha {
	case 1:
		return linear
	case 0.5:
		return root
	case 2:
		return square
	}
	return power
}

func (d *viscous) Start(y float64) { d.work.start(0, y) }

func (d *viscous) Advance(y, v, _ float64) float64 {
	f := d.force(v)
	d.work.move(f, y)
	return f
}

// Preview returns the force at velocity v, N.
func (d *viscous) Preview(_, v, _ float64) float64 { return d.force(v) }

func (d *viscous) force(v float64) float64 {
	switch d.law {
	case linear:
		return d.c * v
	case root:
		return math.Copysign(d.c*math.Sqrt(math.Abs(v)), v)
	case square:
		return d.c * v * math.Abs(v)
	}
	return math.Copysign(d.c*math.Pow(math.Abs(v), d.alpha), v)
}

func (d *viscous) Energy() (stored, dissipated float64) { return 0, d.work.total() }

func (d *viscous) Stiffness() float64 { return 0 }
