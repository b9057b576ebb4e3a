package quantity

import (
	"math"
	"strconv"
	"strings"
)

// Format writes an SI value for people: four significant digits in the unit
// that keeps the number short, "12.50 kN/mm". A value that is undefined, NaN or
// infinite, is "–".
func Format(si float64, dim Dim) string { return format(si, dim, 4) }

func format(si float64, dim Dim, digits int) string {
	if math.IsNaN(si) || math.IsInf(si, 0) {
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
