package margin

import (
	"errors"
	"fmt"
	"strconv"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Range is a setting and the values that a map gives it, evenly spaced.
type Range struct {
	Path      string
	Low, High float64 // SI
	N         int
	Dim       quantity.Dim

	setting kind.Setting
}

// fewest and most are how many values a range may have.
const fewest, most = 2, 2000

const rangeForm = "PATH=FROM:TO:COUNT, like damper.actuator.delay=0 ms:20 ms:80"

// ParseMap reads two ranges, "X=a:b:n,Y=a:b:n".
func ParseMap(s *scenarios.Scenario, text string) (x, y Range, err error) {
	// A comma is no part of a path, a number or a unit.
	parts := strings.Split(text, ",")
	if len(parts) != 2 {
		return x, y, fmt.Errorf("%q is not two ranges with a comma between them; a range is %s", text, rangeForm)
	}
	if x, err = ParseRange(s, parts[0]); err != nil {
		return x, y, err
	}
	if y, err = ParseRange(s, parts[1]); err != nil {
		return x, y, err
	}
	return x, y, checkPair(s, x, y)
}

// checkPair refuses two ranges of one setting, which may be written in two ways.
func checkPair(s *scenarios.Scenario, x, y Range) error {
	if full(s, x.Path) == full(s, y.Path) {
		return fmt.Errorf("%s: both ranges are of this setting; a map is over two settings", y.Path)
	}
	return nil
}

// full is a path with its channel by number and single elements named.
func full(s *scenarios.Scenario, path string) string {
	first, rest, _ := strings.Cut(path, ".")
	for j := range s.Channels {
		if s.Channels[j].Name == first {
			first = "channel[" + strconv.Itoa(j) + "]"
		}
	}
	if section, setting, _ := strings.Cut(rest, "."); section == "specimen" {
		rest = "specimen[0]." + setting
	}
	return first + "." + rest
}

// ParseRange reads one range, "damper.actuator.delay=0 ms:20 ms:80". The unit of the
// second value counts for the first where that has none.
func ParseRange(s *scenarios.Scenario, text string) (Range, error) {
	path, values, ok := strings.Cut(text, "=")
	path = strings.TrimSpace(path)
	parts := strings.Split(values, ":")
	if !ok || path == "" || len(parts) != 3 {
		return Range{}, fmt.Errorf("%q is no range; a range is %s", strings.TrimSpace(text), rangeForm)
	}
	at, err := s.Locate(path)
	if err != nil {
		return Range{}, fmt.Errorf("%s: %w", path, err)
	}
	r := Range{Path: path, Dim: at.Setting.Dim, setting: at.Setting}
	if t := at.Setting.Type; t != kind.NumberType && t != kind.IntegerType {
		return r, fmt.Errorf("%s: is %s; a map needs a setting that is one number", path, at.Setting.Allowed())
	}
	if r.N, err = strconv.Atoi(strings.TrimSpace(parts[2])); err != nil || r.N < fewest || r.N > most {
		return r, fmt.Errorf("%s: %q is no count of values, %d to %d; a range is %s", path, strings.TrimSpace(parts[2]), fewest, most, rangeForm)
	}
	if r.High, err = r.end(parts[1], ""); err != nil {
		return r, err
	}
	if r.Low, err = r.end(parts[0], unitOf(parts[1])); err != nil {
		return r, err
	}
	return r, r.check()
}

// end reads one end of a range.
func (r *Range) end(text, unit string) (float64, error) {
	text = strings.TrimSpace(text)
	if unitOf(text) == "" && unit != "" {
		text += " " + unit
	}
	raw := any(text)
	if v, dim, err := quantity.Parse(text); err == nil && dim == quantity.None && unitOf(text) == "" {
		raw = v // with no unit, which zero may have
	}
	v, err := r.setting.Read(raw)
	if err != nil {
		return 0, fmt.Errorf("%s: %w", r.Path, err)
	}
	return v.Num, nil
}

// unitOf is what stands behind the number.
func unitOf(text string) string {
	return strings.TrimSpace(strings.TrimLeft(strings.TrimSpace(text), "0123456789+-.eE"))
}

// check judges the range as a whole.
func (r *Range) check() error {
	if r.N < fewest || r.N > most {
		return fmt.Errorf("%s: %d values; a range has %d to %d", r.Path, r.N, fewest, most)
	}
	if !(r.Low < r.High) {
		return fmt.Errorf("%s: the range goes from %s to %s; it must rise", r.Path, r.setting.Format(r.Low), r.setting.Format(r.High))
	}
	for i := range r.N {
		if err := r.setting.Check(kind.Num(r.Value(i))); err != nil {
			if r.setting.Type == kind.IntegerType {
				return fmt.Errorf("%s: value %d of the range: %w", r.Path, i+1, err)
			}
			return fmt.Errorf("%s: %w", r.Path, err)
		}
	}
	return nil
}

// complete fills in what the scenario knows of a range that was made by hand.
func (r *Range) complete(s *scenarios.Scenario) error {
	at, err := s.Locate(r.Path)
	if err != nil {
		return fmt.Errorf("%s: %w", r.Path, err)
	}
	if t := at.Setting.Type; t != kind.NumberType && t != kind.IntegerType {
		return fmt.Errorf("%s: is %s; a map needs a setting that is one number", r.Path, at.Setting.Allowed())
	}
	r.setting, r.Dim = at.Setting, at.Setting.Dim
	return r.check()
}

// Value returns value i, SI.
func (r *Range) Value(i int) float64 {
	if i == r.N-1 {
		return r.High
	}
	return r.Low + (r.High-r.Low)*float64(i)/float64(r.N-1)
}

// Values returns all values, SI.
func (r *Range) Values() []float64 {
	out := make([]float64, r.N)
	for i := range out {
		out[i] = r.Value(i)
	}
	return out
}

// change makes value i a change of the scenario.
func (r *Range) change(i int) scenarios.Change {
	text := strconv.FormatFloat(r.Value(i), 'g', -1, 64)
	if unit := r.Dim.SI(); unit != "" {
		text += " " + unit
	}
	return scenarios.Change{Path: r.Path, Value: text}
}

var errNothing = errors.New("the map has no cell that could be worked out")
