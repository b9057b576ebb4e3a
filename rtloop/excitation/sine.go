package excitation

import (
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var sineKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "sine",
		Doc:      "a steady sine from the first instant on",
		Equation: "x(t) = A sin(2π f t)",
		Source:   "common practice",
		Settings: []kind.Setting{
			kind.Driven("amplitude", "amplitude A; a negative one starts downward"),
			kind.Number("frequency", quantity.Frequency, "frequency f").Range(lowestFrequency, highestFrequency),
		},
	},
	New: newSine,
}

// sine is x(t) = A·sin(2π·f·t), A in what is driven, f in Hz, t in s from the
// start of the run. It starts at zero with its full velocity 2π·f·A and never
// ends.
type sine struct {
	clock
	amplitude, frequency float64
}

func newSine(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	return &sine{clk, v.Num("amplitude"), v.Num("frequency")}, nil
}

func (s *sine) Fill(dst []float64) {
	for i := range dst {
		dst[i] = s.amplitude * sinCycles(s.frequency*s.tick())
	}
}

// sinCycles is sin(2π·c). Whole cycles are dropped before the product with
// 2π, so that the phase is as exact late in a long run as c itself.
func sinCycles(c float64) float64 { return math.Sin(2 * math.Pi * (c - math.Floor(c))) }
