package baseline

import (
	"math"
	"strconv"
	"strings"

	"antelag/scenarios/quantity"
)

const undefined = "undefined"

// percent is the unit in which ratios are read and written.
var percent = func() quantity.Unit {
	u, err := quantity.ParseUnit("%")
	if err != nil {
		panic(err) // a unit that quantity has
	}
	return u
}()

// value writes a figure in so many significant digits, in the unit that suits
// it, as ParseAs reads it: "0.079 ms", "93.5 %".
func value(si float64, dim quantity.Dim, digits int) string {
	switch {
	case math.IsNaN(si):
		return undefined
	case dim == quantity.None:
		return strconv.FormatFloat(percent.From(si), 'g', digits, 64) + " %"
	}
	_, unit, _ := strings.Cut(quantity.Plain(si, dim), " ")
	u, err := quantity.ParseUnit(unit)
	if err != nil {
		return quantity.Exact(si, dim)
	}
	return strconv.FormatFloat(u.From(si), 'g', digits, 64) + " " + unit
}

// fileDigits are the significant digits in a file: their rounding is half a
// thousandth of the tightest tolerance, a hundred-thousandth of the figure.
const fileDigits = 9

// apart writes two values for people, in as few digits as tell them apart, but
// no fewer than four.
func apart(was, is float64, dim quantity.Dim) (string, string) {
	for digits := 4; digits < 17; digits++ {
		a, b := value(was, dim, digits), value(is, dim, digits)
		if a != b || was == is {
			return a, b
		}
	}
	return value(was, dim, 17), value(is, dim, 17)
}

// parse reads what value wrote.
func parse(text string, dim quantity.Dim) (float64, error) {
	if text == undefined {
		return math.NaN(), nil
	}
	return quantity.ParseAs(text, dim)
}
