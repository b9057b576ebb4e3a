package margin

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study"
)

// Range is a setting and the values that a map gives it.
type Range = study.Axis

// most is how many values a range may have.
const most = 2000

const mapForm = "a map is given as X=a:b:n,Y=a:b:n, like damper.actuator.delay=0:\"20 ms\":80,damper.compensator.delay=0:\"20 ms\":80"

// ParseMap reads two ranges, "X=a:b:n,Y=a:b:n".
func ParseMap(s *scenarios.Scenario, text string) (x, y Range, err error) {
	// A comma is no part of a path, a number or a unit.
	parts := strings.Split(text, ",")
	if len(parts) != 2 {
		return x, y, fmt.Errorf("%q is not two ranges with a comma between them; %s", text, mapForm)
	}
	if x, err = study.ParseAxis(s, parts[0]); err != nil {
		return x, y, err
	}
	if y, err = study.ParseAxis(s, parts[1]); err != nil {
		return x, y, err
	}
	return x, y, checkRanges(s, &x, &y)
}

// checkRanges refuses what makes no map.
func checkRanges(s *scenarios.Scenario, x, y *Range) error {
	for _, r := range []*Range{x, y} {
		if _, err := s.Locate(r.Path); err != nil {
			return fmt.Errorf("%s: %w", r.Path, err)
		}
		if r.N < 2 || r.N > most {
			return fmt.Errorf("%s: %d values; a map takes 2 to %d", r.Path, r.N, most)
		}
	}
	if study.Same(s, x.Path, y.Path) {
		return fmt.Errorf("%s: both ranges are of this setting; a map is over two settings", y.Path)
	}
	return nil
}

// full is a path with its channel by number and single elements named, so that one
// setting has one.
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

// values are all values of a range, SI.
func values(r *Range) []float64 {
	out := make([]float64, r.N)
	for i := range out {
		out[i] = r.At(i)
	}
	return out
}

// change makes value i of a range a change of the scenario.
func change(r *Range, i int) scenarios.Change {
	v := r.At(i)
	text := strconv.FormatFloat(v, 'g', -1, 64)
	if r.Setting.Type == kind.IntegerType {
		text = strconv.FormatFloat(math.Round(v), 'f', -1, 64)
	}
	if r.Setting.Dim != quantity.None {
		text += " " + r.Setting.Dim.SI()
	}
	return scenarios.Change{Path: r.Path, Value: text}
}

var errNothing = errors.New("the map has no cell that makes a test")
