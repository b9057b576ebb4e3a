package excitation

import (
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var sweepKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name: "sweep",
		Doc:  "a sine whose frequency runs from one value to another over the whole run",
		Equation: "x(t) = A sin φ(t); linear: φ = 2π(f0 t + (f1 − f0) t²/(2D)); " +
			"log: φ = 2π f0 D/ln(f1/f0)·((f1/f0)^(t/D) − 1)",
		Source: "common practice",
		Settings: []kind.Setting{
			kind.Driven("amplitude", "amplitude A; a negative one starts downward"),
			kind.Number("from", quantity.Frequency, "frequency f0 at the start").Range(lowestFrequency, highestFrequency).Sample(`"0.2 Hz"`),
			kind.Number("to", quantity.Frequency, "frequency f1 at the end of the run").Range(lowestFrequency, highestFrequency).Sample(`"10 Hz"`),
			kind.Word("law", "how the frequency runs: by equal Hz or by equal octaves in equal time", "linear", "log"),
		},
	},
	New: newSweep,
}

// linearSweep is x(t) = A·sin φ(t), φ = 2π·(f0·t + (f1−f0)·t²/(2D)), with D
// the duration of the run, s. The instantaneous frequency φ̇/2π runs from f0
// at t = 0 to f1 at D by equal Hz in equal time, upward or downward.
type linearSweep struct {
	clock
	amplitude, from float64
	half            float64 // (f1−f0)/(2D), Hz/s
}

// logSweep is x(t) = A·sin φ(t), φ = 2π·f0·D/ln(f1/f0)·((f1/f0)^(t/D) − 1),
// with D the duration of the run, s. The instantaneous frequency is
// f0·(f1/f0)^(t/D): equal octaves in equal time.
type logSweep struct {
	clock
	amplitude, from float64
	rate            float64 // ln(f1/f0)/D, 1/s
}

func newSweep(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	a, from, to := v.Num("amplitude"), v.Num("from"), v.Num("to")
	if v.Text("law") == "log" && from != to {
		// Log1p keeps the digits of a ratio close to one.
		return &logSweep{clk, a, from, math.Log1p((to-from)/from) / c.Duration}, nil
	}
	return &linearSweep{clk, a, from, (to - from) / (2 * c.Duration)}, nil
}

func (s *linearSweep) Fill(dst []float64) {
	for i := range dst {
		t := s.tick()
		dst[i] = s.amplitude * sinCycles((s.from+s.half*t)*t)
	}
}

func (s *logSweep) Fill(dst []float64) {
	for i := range dst {
		dst[i] = s.amplitude * sinCycles(s.from/s.rate*math.Expm1(s.rate*s.tick()))
	}
}
