package excitation

import (
	"errors"
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var cyclicKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name: "cyclic",
		Doc:  "sine cycles of stepwise amplitude: a list, or the AISC 341 beam-to-column loading sequence",
		Equation: "x(t) = A_i sin(2π t/T) in every cycle of step i, joined at zero; after the list 0. aisc-341: " +
			"A_i = L θ_i, 6 cycles each at θ = 0.00375, 0.005, 0.0075 rad, 4 at 0.01, 2 each at 0.015, 0.02, 0.03, 0.04 " +
			"and at every further 0.01 until the run ends",
		Source: "common practice; aisc-341: ANSI/AISC 341, chapter K, beam-to-column connections (from memory)",
		Settings: []kind.Setting{
			kind.Word("protocol", "where the amplitudes come from: this list, or the sequence of that standard", protocolList, protocolAISC),
			drivenList("amplitudes", "amplitudes A_i in their order; a negative one starts downward, zero is a pause").
				Optional().Sample(`["0.05 g", "0.1 g"]`),
			kind.Numbers("repeats", quantity.None, "cycles at each amplitude: one whole number for all, or one for each; without it one cycle each").
				Optional().Range(1, 1e6).Sample("2"),
			kind.Number("unit_amplitude", quantity.Length, "with protocol aisc-341: displacement L for a storey drift angle of 1 rad, so the length over which the drift is taken").
				Optional().Range(-1000, 1000),
			kind.Number("period", quantity.Time, "period T of every cycle").Range(1./highestFrequency, longest).Sample(`"0.5 s"`),
		},
	},
	New: newCyclic,
}

const (
	protocolList = "list"
	protocolAISC = "aisc-341"
)

// drivenList describes a list of values of what is driven.
func drivenList(name, doc string) kind.Setting {
	s := kind.Numbers(name, quantity.None, doc)
	s.Driven = true
	return s
}

// cyclic is x(t) = A_i·sin(2π·t/T), A_i in what is driven, T in s, i the step
// that the cycle ⌊t/T⌋ belongs to. Whole cycles are joined at zero, so x is
// continuous; its velocity 2π·A_i/T steps where the amplitude does, at the
// first instant, and at the end. After the last cycle of a list x is exactly
// zero, at rest. The sequence of AISC 341 has no end: behind its table come
// two cycles at every further 0.01 rad for as long as the run goes on, which
// may cut the last cycle short.
type cyclic struct {
	clock
	period float64 // T
	steps  []amplitudeStep
	more   float64 // growth at every further two cycles behind the steps; 0: nothing comes
	i      int     // the present step; len(steps) behind them
}

// amplitudeStep is a number of cycles at one amplitude.
type amplitudeStep struct {
	amplitude float64
	end       float64 // cycles from the start of the motion to the end of the step
}

// aisc341 is the loading sequence for beam-to-column moment connections:
// cycles and storey drift angle, rad (ANSI/AISC 341, chapter K; from memory).
// Two cycles at each further 0.01 rad follow.
var aisc341 = []struct{ cycles, angle float64 }{
	{6, 0.00375}, {6, 0.005}, {6, 0.0075}, {4, 0.01}, {2, 0.015}, {2, 0.02}, {2, 0.03}, {2, 0.04},
}

const (
	aiscFurther       = 0.01 // rad
	aiscFurtherCycles = 2
)

func newCyclic(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	s := &cyclic{clock: clk, period: v.Num("period")}
	if v.Text("protocol") == protocolAISC {
		err = s.sequence(c.Drives, v)
	} else {
		err = s.list(v)
	}
	if err != nil {
		return nil, err
	}
	return s, nil
}

// sequence takes the steps of AISC 341.
func (s *cyclic) sequence(d Drives, v kind.Values) error {
	for _, name := range []string{"amplitudes", "repeats"} {
		if v.Has(name) {
			return fmt.Errorf("%s: protocol %q has its own; leave %s out, or set protocol = %q", name, protocolAISC, name, protocolList)
		}
	}
	switch {
	case d != Target:
		return fmt.Errorf("protocol: %s prescribes displacements, so it goes with drives = %q only, not %q", protocolAISC, Words[Target], Words[d])
	case !v.Has("unit_amplitude"):
		return fmt.Errorf("unit_amplitude: is missing; protocol %q needs it: the displacement for a storey drift angle of 1 rad", protocolAISC)
	}
	unit, end := v.Num("unit_amplitude"), 0.0
	for _, step := range aisc341 {
		end += step.cycles
		s.steps = append(s.steps, amplitudeStep{unit * step.angle, end})
	}
	s.more = unit * aiscFurther
	return nil
}

// list takes the steps from the settings.
func (s *cyclic) list(v kind.Values) error {
	switch {
	case v.Has("unit_amplitude"):
		return fmt.Errorf("unit_amplitude: means something with protocol = %q only; leave it out", protocolAISC)
	case !v.Has("amplitudes"):
		return errors.New("amplitudes: is missing; cyclic needs a list of amplitudes, or a protocol")
	}
	amplitudes, repeats := v.List("amplitudes"), []float64{1}
	if v.Has("repeats") {
		repeats = v.List("repeats")
	}
	if n := len(repeats); n != 1 && n != len(amplitudes) {
		return fmt.Errorf("repeats: %d numbers for %d amplitudes; give one for all, or one for each", n, len(amplitudes))
	}
	end := 0.0
	for i, a := range amplitudes {
		n := repeats[min(i, len(repeats)-1)]
		if n != math.Trunc(n) {
			return fmt.Errorf("repeats: %g is not a whole number of cycles", n)
		}
		end += n
		s.steps = append(s.steps, amplitudeStep{a, end})
	}
	return nil
}

// amplitude returns the amplitude in the given cycle, counted from 0 and not
// before that of the call before.
func (s *cyclic) amplitude(cycle float64) float64 {
	for s.i < len(s.steps) && cycle >= s.steps[s.i].end {
		s.i++
	}
	if s.i < len(s.steps) {
		return s.steps[s.i].amplitude
	}
	last := &s.steps[len(s.steps)-1]
	if s.more == 0 {
		return 0
	}
	return last.amplitude + s.more*(1+math.Floor((cycle-last.end)/aiscFurtherCycles))
}

func (s *cyclic) Fill(dst []float64) {
	for i := range dst {
		cycles := s.tick() / s.period
		if a := s.amplitude(cycles); a != 0 {
			dst[i] = a * sinCycles(cycles)
		} else {
			dst[i] = 0
		}
	}
}
