// Package quantity reads and writes physical values with units: "12.5 kN/mm"
// to 1.25e7 N/m and back. It knows dimensions (length, mass, time, plane
// angle) and refuses to mix them; it knows nothing of scenarios or settings.
//
// Everything inside the program is SI; text with a unit exists only where
// people read or write.
package quantity

import (
	"strconv"
	"strings"
)

// Dim is a dimension: the integer exponents of length, mass, time and plane
// angle. Angle counts as a dimension of its own so that "3 rad/s" is not
// taken for 3 Hz.
type Dim struct{ Length, Mass, Time, Angle int8 }

// The dimensions that settings use.
var (
	None         = Dim{}
	Length       = Dim{Length: 1}
	Area         = Dim{Length: 2}
	Volume       = Dim{Length: 3}
	PerArea      = Dim{Length: -2}
	PerAreaTime  = Dim{Length: -2, Time: -1}
	Mass         = Dim{Mass: 1}
	Time         = Dim{Time: 1}
	Frequency    = Dim{Time: -1}
	Angle        = Dim{Angle: 1}
	Velocity     = Dim{Length: 1, Time: -1}
	Acceleration = Dim{Length: 1, Time: -2}
	Force        = Dim{Length: 1, Mass: 1, Time: -2}
	Stiffness    = Dim{Mass: 1, Time: -2}
	Damping      = Dim{Mass: 1, Time: -1}
	Cubic        = Dim{Length: -2, Mass: 1, Time: -2}
	Pressure     = Dim{Length: -1, Mass: 1, Time: -2}
	Flow         = Dim{Length: 3, Time: -1}
	Energy       = Dim{Length: 2, Mass: 1, Time: -2}
	Leakage      = Dim{Length: 4, Mass: -1, Time: 1}
	PerLength    = Dim{Length: -1}
	PerVelocity  = Dim{Length: -1, Time: 1}
	PerTravel    = Dim{Length: -1, Time: -1}
	PerPressure  = Dim{Length: 1, Mass: -1, Time: 2}
)

// names gives each common dimension its word, and the units that people read
// it in, smallest first; the first entry of si is the coherent SI unit.
var names = map[Dim]struct {
	word string
	si   string
	read []string
}{
	None:         {"a plain number", "", []string{""}},
	Length:       {"a length", "m", []string{"um", "mm", "m", "km"}},
	Area:         {"an area", "m^2", []string{"mm^2", "m^2"}},
	Volume:       {"a volume", "m^3", []string{"L", "m^3"}},
	PerArea:      {"a number per area", "m^-2", []string{"m^-2", "mm^-2"}},
	PerAreaTime:  {"a number per area and time", "m^-2*s^-1", []string{"m^-2*s^-1", "mm^-2*s^-1"}},
	Mass:         {"a mass", "kg", []string{"kg", "t"}},
	Time:         {"a time", "s", []string{"us", "ms", "s"}},
	Frequency:    {"a frequency", "Hz", []string{"Hz"}},
	Angle:        {"an angle", "rad", []string{"rad"}},
	Velocity:     {"a velocity", "m/s", []string{"mm/s", "m/s"}},
	Acceleration: {"an acceleration", "m/s^2", []string{"m/s^2"}},
	Force:        {"a force", "N", []string{"N", "kN", "MN"}},
	Stiffness:    {"a stiffness", "N/m", []string{"N/m", "N/mm", "kN/mm"}},
	Damping:      {"a damping coefficient", "N*s/m", []string{"N*s/m", "kN*s/m"}},
	Cubic:        {"a cubic stiffness", "N/m^3", []string{"N/m^3"}},
	Pressure:     {"a pressure", "Pa", []string{"Pa", "kPa", "MPa"}},
	Flow:         {"a flow", "m^3/s", []string{"L/min", "m^3/s"}},
	Energy:       {"an energy", "J", []string{"J", "kJ", "MJ"}},
	Leakage:      {"a flow per pressure", "m^3/s/Pa", []string{"m^3/s/Pa"}},
	PerLength:    {"a number per length", "m^-1", []string{"m^-1", "mm^-1"}},
	PerVelocity:  {"a number per velocity", "s/m", []string{"s/m"}},
	PerTravel:    {"a number per length and time", "m^-1*s^-1", []string{"m^-1*s^-1"}},
	PerPressure:  {"a number per pressure", "Pa^-1", []string{"Pa^-1"}},
}

// String gives the dimension as a phrase with its SI unit: "a stiffness (N/m)".
func (d Dim) String() string {
	n, ok := names[d]
	switch {
	case !ok:
		return "a value in " + d.SI()
	case n.si == "":
		return n.word
	}
	return n.word + " (" + n.si + ")"
}

// SI gives the coherent SI unit of the dimension, as text that ParseUnit reads.
func (d Dim) SI() string {
	if n, ok := names[d]; ok {
		return n.si
	}
	var parts []string
	for _, p := range []struct {
		unit string
		exp  int8
	}{{"kg", d.Mass}, {"m", d.Length}, {"s", d.Time}, {"rad", d.Angle}} {
		switch p.exp {
		case 0:
		case 1:
			parts = append(parts, p.unit)
		default:
			parts = append(parts, p.unit+"^"+strconv.Itoa(int(p.exp)))
		}
	}
	return strings.Join(parts, "*")
}

// maxExponent bounds the exponents of a Dim while a unit is read.
const maxExponent = 9

// plus adds n times the exponents of e; ok is false if one leaves the range
// that any physical value needs.
func (d Dim) plus(e Dim, n int) (sum Dim, ok bool) {
	ok = true
	add := func(a, b int8) int8 {
		s := int(a) + n*int(b)
		if s < -maxExponent || s > maxExponent {
			ok = false
			return 0
		}
		return int8(s)
	}
	sum = Dim{add(d.Length, e.Length), add(d.Mass, e.Mass), add(d.Time, e.Time), add(d.Angle, e.Angle)}
	return sum, ok
}

// Unit is a unit of measure: a value of v units is v·num/den in SI. The two
// are kept apart so that "8 ms" is the float64 nearest to 0.008.
type Unit struct {
	num, den float64
	Dim      Dim
}

// SI converts v of this unit to SI.
func (u Unit) SI(v float64) float64 { return v * u.num / u.den }

// From converts an SI value to this unit.
func (u Unit) From(si float64) float64 { return si * u.den / u.num }
