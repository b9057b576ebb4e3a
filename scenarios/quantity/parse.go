package quantity

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
)

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
	if strings.HasPrefix(s, "1/") {
		s = s[1:] // "1/mm"
	}
	for first := !strings.HasPrefix(s, "/"); s != ""; first = false { // "/mm" divides at once
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
