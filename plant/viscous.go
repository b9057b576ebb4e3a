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
		Settings: []kind.Setting{
			kind.Number("damping", quantity.Damping, "coefficient c of a linear damper; or give force and speed").Optional().Range(0, 1e12).Sample(`"50 kN*s/m"`),
			kind.Number("force", quantity.Force, "force that the damper has at the given speed").Optional().Range(0, 1e9),
			kind.Number("speed", quantity.Velocity, "speed at which it has the given force").Optional().Range(1e-6, 100),
			kind.Number("exponent", quantity.None, "velocity exponent α; other than 1 with force and speed only").Default(1).Range(0.1, 2),
		},
	},
	New: newViscous,
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
	alpha := v.Num("exponent")
	if !(alpha > 0) {
		return nil, fmt.Errorf("exponent: %v is not above 0", alpha)
	}
	d := &viscous{alpha: alpha}
	switch {
	case v.Has("damping") && v.Has("force"):
		return nil, errors.New("damping: is given beside force; give damping, or force and speed")
	case v.Has("damping") && v.Has("speed"):
		return nil, errors.New("damping: is given beside speed; give damping, or force and speed")
	case v.Has("damping") && alpha != 1:
		return nil, fmt.Errorf("exponent: %v goes with force and speed; a damper given by damping has exponent 1", alpha)
	case v.Has("damping"):
		d.c = v.Num("damping")
	case v.Has("force") && v.Has("speed"):
		if !(v.Num("speed") > 0) {
			return nil, fmt.Errorf("speed: %v m/s is not above 0", v.Num("speed"))
		}
		d.c = v.Num("force") / math.Pow(v.Num("speed"), alpha)
	case v.Has("force"):
		return nil, errors.New("speed: is missing; force needs the speed at which the damper has it")
	case v.Has("speed"):
		return nil, errors.New("force: is missing; speed needs the force that the damper has at it")
	default:
		return nil, errors.New("damping: is missing; viscous needs damping, or force and speed")
	}
	switch alpha {
	case 1:
		d.law = linear
	case 0.5:
		d.law = root
	case 2:
		d.law = square
	}
	return d, nil
}

func (d *viscous) Start(y float64) { d.work.start(0, y) }

func (d *viscous) Advance(y, v, _ float64) float64 {
	f := d.force(v)
	d.work.move(f, y)
	return f
}

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
