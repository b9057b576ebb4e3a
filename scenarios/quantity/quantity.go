// Package quantity reads and writes physical values with units: "12.5 kN/mm"
// to 1.25e7 N/m and back. It knows dimensions (length, mass, time, plane
// angle) and refuses to mix them; it knows nothing of scenarios or settings.
//
// Everything inside the program is SI; text with a unit exists only where
// people read or write.
package quantity

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
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

// Parse reads a number with an optional unit, "12.5 kN/mm", and returns the
// value in SI with its dimension. A number alone is dimensionless. NaN,
// infinities and values that overflow are refused.
func Parse(text string) (si float64, dim Dim, err error) {
	s := strings.TrimSpace(text)
	if s == "" {
		return 0, None, errors.New("no value given")
	}
	i := numberEnd(s)
	v, err := strconv.ParseFloat(s[:i], 64)
	if i == 0 || err != nil || math.IsInf(v, 0) {
		return 0, None, fmt.Errorf("%q does not begin with a finite number", text)
	}
	u, err := ParseUnit(s[i:])
	if err != nil {
		return 0, None, fmt.Errorf("%q: %w", text, err)
	}
	si = u.SI(v)
	if math.IsInf(si, 0) || math.IsNaN(si) {
		return 0, None, fmt.Errorf("%q is beyond the largest number", text)
	}
	return si, u.Dim, nil
}

// ParseAs reads text like Parse and checks that it has the wanted dimension.
func ParseAs(text string, want Dim) (float64, error) {
	si, dim, err := Parse(text)
	if err != nil {
		return 0, err
	}
	if dim != want {
		return 0, &DimError{Text: text, Got: dim, Want: want}
	}
	return si, nil
}

// DimError says that a value has another dimension than the one wanted.
type DimError struct {
	Text      string
	Got, Want Dim
}

func (e *DimError) Error() string {
	if e.Got == None {
		return fmt.Sprintf("%q has no unit; it must be %s", e.Text, e.Want)
	}
	return fmt.Sprintf("%q is %s; it must be %s", e.Text, e.Got, e.Want)
}

// numberEnd returns the length of the decimal number at the start of s.
func numberEnd(s string) int {
	i := 0
	digits := func() (any bool) {
		for i < len(s) && s[i] >= '0' && s[i] <= '9' {
			i++
			any = true
		}
		return any
	}
	if i < len(s) && (s[i] == '+' || s[i] == '-') {
		i++
	}
	whole := digits()
	if i < len(s) && s[i] == '.' {
		i++
		if !digits() && !whole {
			return 0
		}
	} else if !whole {
		return 0
	}
	if j := i; i < len(s) && (s[i] == 'e' || s[i] == 'E') {
		i++
		if i < len(s) && (s[i] == '+' || s[i] == '-') {
			i++
		}
		if !digits() {
			i = j
		}
	}
	return i
}

// ParseUnit reads a unit: factors joined by "/", "*", "·" or a space, each
// with an optional power ("mm^-2", "m²"). A "/" divides by the one factor
// behind it. Empty text is the dimensionless unit 1.
func ParseUnit(text string) (Unit, error) {
	u := Unit{num: 1, den: 1}
	s := strings.TrimSpace(text)
	for first := true; s != ""; first = false {
		sign := 1
		if !first {
			s, sign = separator(s)
		}
		name, exp, rest, err := factor(s)
		if err != nil {
			return Unit{}, err
		}
		f, ok := units[name]
		if !ok {
			return Unit{}, unknownUnit(name)
		}
		if u, err = u.times(f, sign*exp); err != nil {
			return Unit{}, fmt.Errorf("unit %q: %w", strings.TrimSpace(text), err)
		}
		s = rest
	}
	return u, nil
}

func (u Unit) times(f Unit, exp int) (Unit, error) {
	dim, ok := u.Dim.plus(f.Dim, exp)
	if !ok || exp < -maxExponent || exp > maxExponent {
		return Unit{}, errors.New("power out of range")
	}
	num, den := f.num, f.den
	if exp < 0 {
		num, den, exp = den, num, -exp
	}
	for range exp {
		u.num *= num
		u.den *= den
	}
	u.Dim = dim
	return u, nil
}

// separator eats what stands between two factors and says whether the next
// one multiplies (1) or divides (-1).
func separator(s string) (rest string, sign int) {
	sign = 1
	for s != "" {
		switch {
		case s[0] == ' ' || s[0] == '*':
			s = s[1:]
		case strings.HasPrefix(s, "·"):
			s = s[len("·"):]
		case s[0] == '/' && sign == 1:
			s, sign = s[1:], -1
		default:
			return s, sign
		}
	}
	return s, sign
}

var superscripts = map[rune]byte{
	'⁰': '0', '¹': '1', '²': '2', '³': '3', '⁴': '4', '⁵': '5', '⁶': '6', '⁷': '7', '⁸': '8', '⁹': '9', '⁻': '-',
}

// factor reads one unit name with its power from the start of s.
func factor(s string) (name string, exp int, rest string, err error) {
	i := 0
	for i < len(s) {
		r, n := utf8.DecodeRuneInString(s[i:])
		if _, super := superscripts[r]; super || r == '·' || strings.ContainsRune(" */^-+0123456789", r) {
			break
		}
		i += n
	}
	if i == 0 {
		return "", 0, "", fmt.Errorf("a unit is missing at %q", s)
	}
	name, s = s[:i], s[i:]
	var power []byte
	if strings.HasPrefix(s, "^") {
		s = s[1:]
		j := 0
		for j < len(s) && (s[j] >= '0' && s[j] <= '9' || j == 0 && (s[j] == '-' || s[j] == '+')) {
			j++
		}
		power, s = []byte(s[:j]), s[j:]
		if len(power) == 0 {
			return "", 0, "", fmt.Errorf("a power is missing behind %q", name+"^")
		}
	} else {
		for s != "" {
			r, n := utf8.DecodeRuneInString(s)
			c, super := superscripts[r]
			if !super && r >= '0' && r <= '9' { // "m2"
				c, super = byte(r), true
			}
			if !super {
				break
			}
			power, s = append(power, c), s[n:]
		}
	}
	if len(power) == 0 {
		return name, 1, s, nil
	}
	exp, err = strconv.Atoi(string(power))
	if err != nil {
		return "", 0, "", fmt.Errorf("%q is no power of a unit", power)
	}
	return name, exp, s, nil
}

// Format writes an SI value for people: four significant digits in the unit
// that keeps the number short, "12.50 kN/mm". An undefined value is "–".
func Format(si float64, dim Dim) string { return format(si, dim, 4) }

func format(si float64, dim Dim, digits int) string {
	if math.IsNaN(si) {
		return "–"
	}
	unit := dim.SI()
	if n, ok := names[dim]; ok && si != 0 {
		for _, r := range n.read {
			unit = r
			if u, _ := ParseUnit(r); math.Abs(u.From(si)) < 1000 {
				break
			}
		}
		// A length below a millimetre still reads better in mm than in um
		// for steel and oil; the micrometre is for what is truly small.
		if unit == "um" && math.Abs(si) >= 1e-5 {
			unit = "mm"
		}
		if unit == "us" && math.Abs(si) >= 1e-5 {
			unit = "ms"
		}
	}
	u, _ := ParseUnit(unit)
	return FormatIn(si, u, unit, digits)
}

// FormatIn writes an SI value in a given unit with the given number of
// significant digits.
func FormatIn(si float64, u Unit, unit string, digits int) string {
	v := u.From(si)
	s := strconv.FormatFloat(v, 'g', digits, 64)
	if !strings.Contains(s, "e") {
		s = fixed(v, digits)
	}
	if unit == "" {
		return s
	}
	return s + " " + pretty(unit)
}

// fixed writes v with so many significant digits and no exponent, keeping
// trailing zeros so that columns of figures line up.
func fixed(v float64, digits int) string {
	if v == 0 {
		return "0"
	}
	after := digits - 1 - int(math.Floor(math.Log10(math.Abs(v))))
	return strconv.FormatFloat(v, 'f', max(0, after), 64)
}

// pretty turns the typed form of a unit into the printed one: "m/s^2" to "m/s²".
var prettier = strings.NewReplacer("um", "µm", "us", "µs", "^-1", "⁻¹", "^-2", "⁻²", "^2", "²", "^3", "³", "*", "·")

func pretty(unit string) string { return prettier.Replace(unit) }

// Exact writes an SI value with its SI unit so that Parse gives back the very
// same float64: "0.008 s".
func Exact(si float64, dim Dim) string {
	s := strconv.FormatFloat(si, 'g', -1, 64)
	if unit := dim.SI(); unit != "" {
		return s + " " + unit
	}
	return s
}

// Short writes an SI value for people in as few digits as tell it apart, up
// to six: "8 ms", "0.02 mm". It is for settings; results use Format.
func Short(si float64, dim Dim) string {
	s := format(si, dim, 6)
	number, unit, _ := strings.Cut(s, " ")
	if strings.Contains(number, ".") && !strings.Contains(number, "e") {
		number = strings.TrimRight(strings.TrimRight(number, "0"), ".")
	}
	if unit == "" {
		return number
	}
	return number + " " + unit
}

// Plain is like Short but with a unit as it is typed, "m/s^2", not "m/s²".
func Plain(si float64, dim Dim) string {
	return typed.Replace(Short(si, dim))
}

var typed = strings.NewReplacer("µ", "u", "⁻¹", "^-1", "⁻²", "^-2", "²", "^2", "³", "^3", "·", "*")
