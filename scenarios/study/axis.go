package study

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// Range is a setting with the ends between which it varies.
type Range struct {
	Path      string
	Setting   kind.Setting
	Low, High float64 // SI
	Log       bool    // evenly in the logarithm
}

// Axis is a range with a number of values on it, both ends among them.
type Axis struct {
	Range
	N int
}

const (
	rangeForm = "a range is given as SETTING=a:b, like damper.compensator.delay=\"8 ms:20 ms\", with :log after it for a logarithmic one"
	axisForm  = "a grid is given as SETTING=a:b:n, like damper.compensator.delay=\"8 ms:20 ms:25\", with :log after it for a logarithmic one"
)

// ParseRange reads "PATH=a:b" or "PATH=a:b:log" for a setting of the scenario
// that is a number.
func ParseRange(s *scenarios.Scenario, text string) (Range, error) {
	path, parts, err := split(text, rangeForm)
	if err != nil {
		return Range{}, err
	}
	r := Range{Path: path}
	if len(parts) == 3 && parts[2] == "log" {
		r.Log, parts = true, parts[:2]
	}
	if len(parts) != 2 {
		return r, fmt.Errorf("%q: %s", text, rangeForm)
	}
	err = r.read(s, parts[0], parts[1])
	if err == nil && r.Low == r.High {
		err = fmt.Errorf("%s: there is nothing between %s and %s", path, parts[0], parts[1])
	}
	return r, err
}

// ParseAxis reads "PATH=a:b:n" or "PATH=a:b:n:log" for a setting of the scenario
// that is a number.
func ParseAxis(s *scenarios.Scenario, text string) (Axis, error) {
	path, parts, err := split(text, axisForm)
	if err != nil {
		return Axis{}, err
	}
	a := Axis{Range: Range{Path: path}}
	if len(parts) == 4 && parts[3] == "log" {
		a.Log, parts = true, parts[:3]
	}
	if len(parts) != 3 {
		return a, fmt.Errorf("%q: %s", text, axisForm)
	}
	if err := a.read(s, parts[0], parts[1]); err != nil {
		return a, err
	}
	n, err := strconv.Atoi(parts[2])
	switch {
	case err != nil || n < 1 || n > maxRuns:
		return a, fmt.Errorf("%s: %q is no number of values; allowed is a whole number from 1 on", path, parts[2])
	case n == 1 && a.Low != a.High:
		return a, fmt.Errorf("%s: one value cannot be both %s and %s; give at least 2", path, parts[0], parts[1])
	case n > 1 && a.Low == a.High:
		return a, fmt.Errorf("%s: there is nothing between %s and %s", path, parts[0], parts[1])
	}
	a.N = n
	return a, a.checkWhole()
}

func split(text, form string) (path string, parts []string, err error) {
	c, err := scenarios.ParseChange(text)
	if err != nil {
		return "", nil, fmt.Errorf("%q: %s", text, form)
	}
	parts = strings.Split(strings.Trim(c.Value, `"`), ":")
	for i := range parts {
		parts[i] = strings.Trim(strings.TrimSpace(parts[i]), `"`)
	}
	return c.Path, parts, nil
}

// read takes the two ends.
func (r *Range) read(s *scenarios.Scenario, low, high string) error {
	at, err := s.Locate(r.Path)
	if err != nil {
		return err
	}
	r.Setting = at.Setting
	if t := r.Setting.Type; t != kind.NumberType && t != kind.IntegerType {
		return fmt.Errorf("%s is not a single number; it takes %s", r.Path, r.Setting.Allowed())
	}
	for i, text := range []string{low, high} {
		v, err := r.Setting.Read(number(text))
		if err != nil {
			return fmt.Errorf("%s: %w", r.Path, err)
		}
		*[]*float64{&r.Low, &r.High}[i] = v.Num
	}
	switch {
	case r.Low > r.High:
		return fmt.Errorf("%s: %s is above %s; the smaller end comes first", r.Path, low, high)
	case r.Log && r.Low <= 0:
		return fmt.Errorf("%s: a logarithmic range begins above zero, not at %s", r.Path, low)
	}
	return nil
}

// number takes a plain number for one, and leaves the rest to who reads text
// with units.
func number(text string) any {
	if v, err := strconv.ParseFloat(text, 64); err == nil {
		return v
	}
	return text
}

// checkWhole refuses a grid that would put a whole-numbered setting between two
// whole numbers.
func (a *Axis) checkWhole() error {
	if a.Setting.Type != kind.IntegerType {
		return nil
	}
	if a.Log || a.N > 1 && math.Mod(a.High-a.Low, float64(a.N-1)) != 0 {
		return errors.New(a.Path + ": takes whole numbers; choose n so that all steps are whole, like 1:4:4")
	}
	return nil
}

// At returns value i of n, SI.
func (a *Axis) At(i int) float64 {
	if a.N == 1 {
		return a.Low
	}
	return a.Range.At(float64(i) / float64(a.N-1))
}

// At returns the value at the part f of the range, from 0 to 1. The ends are
// exact.
func (r *Range) At(f float64) float64 {
	switch {
	case f <= 0:
		return r.Low
	case f >= 1:
		return r.High
	case r.Log:
		return min(max(r.Low*math.Pow(r.High/r.Low, f), r.Low), r.High)
	}
	v := min(r.Low+f*(r.High-r.Low), r.High)
	if r.Setting.Type == kind.IntegerType {
		v = math.Round(v)
	}
	return v
}

// Part is the reverse of At.
func (r *Range) Part(v float64) float64 {
	if r.Log {
		return math.Log(v/r.Low) / math.Log(r.High/r.Low)
	}
	return (v - r.Low) / (r.High - r.Low)
}

// String writes the range so that it reads back the same.
func (r *Range) String() string {
	text := r.Path + "=" + Exact(&r.Setting, r.Low) + ":" + Exact(&r.Setting, r.High)
	if r.Log {
		text += ":log"
	}
	return text
}

// String writes the axis so that it reads back the same.
func (a *Axis) String() string {
	text := a.Path + "=" + Exact(&a.Setting, a.Low) + ":" + Exact(&a.Setting, a.High) + ":" + strconv.Itoa(a.N)
	if a.Log {
		text += ":log"
	}
	return text
}
