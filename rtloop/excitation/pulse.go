package excitation

import (
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var pulseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "pulse",
		Doc:      "one half sine from the first instant on, then nothing",
		Equation: "x(t) = A sin(π t/w) for 0 ≤ t ≤ w, else 0",
		Source:   "common practice",
		Settings: []kind.Setting{
			kind.Driven("amplitude", "height A of the pulse; a negative one points downward"),
			kind.Number("width", quantity.Time, "width w of the pulse").Range(1e-4, longest),
		},
	},
	New: newPulse,
}

// pulse is x(t) = A·sin(π·t/w) for 0 ≤ t ≤ w and exactly zero after, A in what
// is driven, w in s.
type pulse struct {
	clock
	amplitude, width float64
}

func newPulse(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	return &pulse{clk, v.Num("amplitude"), v.Num("width")}, nil
}

func (s *pulse) Fill(dst []float64) {
	for i := range dst {
		dst[i] = 0
		if t := s.tick(); t < s.width {
			dst[i] = s.amplitude * math.Sin(math.Pi*(t/s.width))
		}
	}
}
