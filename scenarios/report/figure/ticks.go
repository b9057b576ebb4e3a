package figure

import (
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot"
)

// scale is one axis ready to be drawn.
type scale struct {
	low, high float64
	log       bool
	power     int // of ten, which the tick labels leave out
	ticks     []plot.Tick
}

// span finds the ends of an axis from its data (low > high if there are none).
// Curves have some room left around them if air is set.
func (a Axis) span(low, high float64, air bool) scale {
	s := scale{log: a.Log}
	if !(low <= high) {
		low, high = 0, 1
		if a.Log {
			low, high = 1, 10
		}
	}
	s.low, s.high = low, high
	if air {
		s.pad(0.05)
	}
	if a.Low != 0 || a.High != 0 {
		if placeable(a.Low, a.Log) {
			s.low = a.Low
		}
		if placeable(a.High, a.Log) {
			s.high = a.High
		}
	}
	s.open()
	return s
}

func (s *scale) pad(share float64) {
	if s.log {
		f := math.Pow(s.high/s.low, share)
		s.low, s.high = s.low/f, s.high*f
		return
	}
	d := share * (s.high - s.low)
	s.low, s.high = s.low-d, s.high+d
}

// open keeps the ends apart, so that there is something to divide by.
func (s *scale) open() {
	if s.high < s.low {
		s.low, s.high = s.high, s.low
	}
	middle := (s.low + s.high) / 2
	switch {
	case s.log && s.high < s.low*1.001:
		s.low, s.high = s.low/2, s.high*2
	case !s.log && s.high-s.low <= 1e-9*math.Abs(middle) || s.high == s.low:
		d := 0.1 * math.Abs(middle)
		if d == 0 {
			d = 1
		}
		s.low, s.high = middle-d, middle+d
	}
}

// divide chooses about n ticks.
func (s *scale) divide(n int) {
	s.ticks, s.power = nil, 0
	if s.log && s.decades(n) {
		return
	}
	step := niceStep((s.high - s.low) / float64(max(n, 2)))
	most := math.Max(math.Abs(s.low), math.Abs(s.high))
	if most >= 1e5 || most < 1e-2 {
		s.power = 3 * int(math.Floor(math.Log10(most)/3))
	}
	unit := math.Pow(10, float64(s.power))
	after := max(0, -int(math.Floor(math.Log10(step/unit)+1e-9)))
	for i := math.Ceil(s.low/step - 1e-9); i*step <= s.high+1e-9*step; i++ {
		s.ticks = append(s.ticks, plot.Tick{Value: i * step, Label: minus(strconv.FormatFloat(i*step/unit+0, 'f', after, 64))})
		if len(s.ticks) > 50 {
			break
		}
	}
	if len(s.ticks) < 2 && n < 64 { // one alone gives no scale
		s.divide(2 * n)
	}
}

// decades ticks a logarithmic axis. It reports false where the axis is so
// short that the ticks of a straight one say more.
func (s *scale) decades(n int) bool {
	long := math.Log10(s.high / s.low)
	if long < 0.7 {
		return false
	}
	every := max(1, int(math.Ceil(long/float64(max(n, 2)))))
	for d := int(math.Floor(math.Log10(s.low))); d <= int(math.Ceil(math.Log10(s.high))); d++ {
		for digit := 1.0; digit < 10; digit++ {
			v := digit * math.Pow(10, float64(d))
			if v < s.low*(1-1e-9) || v > s.high*(1+1e-9) || digit > 1 && every > 1 {
				continue
			}
			t := plot.Tick{Value: v}
			if digit == 1 && d%every == 0 || long < 2.5 && (digit == 2 || digit == 5) {
				t.Label = decade(v, d, digit)
			}
			s.ticks = append(s.ticks, t)
		}
	}
	return true
}

func decade(v float64, d int, digit float64) string {
	if d >= -3 && d <= 4 {
		return strconv.FormatFloat(v, 'f', max(0, -d), 64)
	}
	return strconv.FormatFloat(digit, 'f', 0, 64) + "e" + minus(strconv.Itoa(d))
}

// niceStep is the least of 1, 2, 5 times a power of ten that is not below v.
func niceStep(v float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{1, 2, 5} {
		if v <= m*p*(1+1e-9) {
			return m * p
		}
	}
	return 10 * p
}

// number writes a value in a few digits, for labels inside a picture.
func number(v float64) string {
	switch a := math.Abs(v); {
	case math.IsNaN(v):
		return "undefined"
	case math.IsInf(v, 0):
		return minus(strings.Replace(strconv.FormatFloat(v, 'g', 4, 64), "Inf", "∞", 1))
	case a != 0 && (a >= 1e6 || a < 1e-4):
		mantissa, exponent, _ := strings.Cut(strconv.FormatFloat(v, 'e', -1, 64), "e")
		if len(mantissa) > 5 {
			mantissa, exponent, _ = strings.Cut(strconv.FormatFloat(v, 'e', 3, 64), "e")
		}
		power, _ := strconv.Atoi(exponent)
		return minus(mantissa) + "e" + minus(strconv.Itoa(power))
	}
	return minus(strconv.FormatFloat(round(v, 5), 'f', -1, 64))
}

// round keeps so many significant digits.
func round(v float64, digits int) float64 {
	r, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'g', digits, 64), 64)
	return r
}

// minus writes the sign as in print.
func minus(s string) string {
	if strings.Trim(s, "-0.") == "" {
		s = strings.TrimPrefix(s, "-")
	}
	return strings.Replace(s, "-", "−", 1)
}

// label writes what an axis means, with its unit, and the power of ten that the
// tick labels leave out. (The font has not all raised digits.)
func (a Axis) label(power int) string {
	unit, name := clean(a.Unit), clean(a.Label)
	if power != 0 {
		unit = strings.TrimSpace("1e" + minus(strconv.Itoa(power)) + " " + unit)
	}
	switch {
	case unit == "":
		return name
	case name == "":
		return unit
	}
	return name + " (" + unit + ")"
}
