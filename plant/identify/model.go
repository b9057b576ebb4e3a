package identify

import (
	"math"
	"math/cmplx"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// shape is a kind of actuator as the fit sees it: parameters that shape the
// answer to a command, for a gain of 1. Gain and offset come on top.
//
// The first parameter is always the total delay D, s, of delay and lag together:
// it is what any motion tells best. The others bend the answer:
//
//	lag-delay      m = T², s²;             τ = D − T
//	second-order   a = 2ζ/ω, b = 1/ω, s;   τ = D − a
//
// To slow motion e^(−sτ)/(1+Ts) is e^(−sD)·(1 + s²T²/2): the answer is nearly a
// straight line in D and m, also at T = 0, where it is level in T. With b = 0 the
// second-order is a lag-delay.
type shape struct {
	kind string
	n    int     // parameters
	tick float64 // of the record, s
}

func delayShape(tick float64) shape       { return shape{"lag-delay", 1, tick} } // without the lag
func lagDelayShape(tick float64) shape    { return shape{"lag-delay", 2, tick} }
func secondOrderShape(tick float64) shape { return shape{"second-order", 3, tick} }

// longestTime is the largest delay and lag that the kinds take, s.
const longestTime = 1.0

// clamp puts parameters where the actuator's settings allow them.
func (s shape) clamp(p []float64) {
	p[0] = min(max(p[0], 0), longestTime)
	switch s.n {
	case 2:
		p[1] = min(max(p[1], 0), p[0]*p[0])
	case 3:
		// ζ = a/2b between 0.01 and 50, and ω below 1e5 Hz.
		p[0] = max(p[0], 1e-6)
		p[1] = min(max(p[1], 1e-6), p[0])
		p[2] = min(max(p[2], p[1]/100, 2e-6), p[1]*50)
		// What swings faster than half the rate swings between the samples.
		if p[2] < s.tick/math.Pi {
			p[2] = max(min(p[2], p[1]/2), p[1]/100)
		}
	}
}

// lag is T or 2ζ/ω.
func (s shape) lag(p []float64) float64 {
	switch s.n {
	case 2:
		return math.Sqrt(p[1])
	case 3:
		return p[1]
	}
	return 0
}

// dead is the dead time τ.
func (s shape) dead(p []float64) float64 { return max(p[0]-s.lag(p), 0) }

// nudge is by how much to move parameter i to see what it does.
func (s shape) nudge(p []float64, i int) float64 {
	tick := s.tick
	if i == 1 && s.n == 2 {
		return min(0.25*tick*tick, max(0.05*p[1], 0.01*tick*tick))
	}
	h := 0.01 * tick
	if i > 0 {
		h = max(min(h, 0.01*p[i]), 1e-5*tick)
	}
	return h
}

// settings are the parameters in the words of the kind.
func (s shape) settings(p []float64, gain float64) kind.Values {
	v := kind.Values{"delay": kind.Num(s.dead(p)), "gain": kind.Num(gain)}
	if s.n < 3 {
		v["lag"] = kind.Num(s.lag(p))
		return v
	}
	v["frequency"] = kind.Num(1 / (2 * math.Pi * p[2]))
	v["damping_ratio"] = kind.Num(p[1] / (2 * p[2]))
	return v
}

// run lets the actuator itself, of gain 1, carry the command out from rest.
func (s shape) run(dst []float64, rec *Record, p []float64) error {
	entry, err := plant.Actuators.Find(s.kind)
	if err != nil {
		return err
	}
	a, err := entry.New(plant.Timing{Tick: rec.Tick, Hold: rec.Hold}, s.settings(p, 1))
	if err != nil {
		return err
	}
	none := plant.NewSpecimen()
	dst[0] = a.Start(rec.Command[0], none)
	for k := 1; k < len(dst); k++ {
		dst[k], _ = a.Advance(rec.Command[k], none)
	}
	return nil
}

// lateness is the phase delay, s, at the angular frequency omega, rad/s; at 0
// it is delay and lag together.
func (s shape) lateness(p []float64, omega float64) float64 {
	if omega == 0 {
		return p[0]
	}
	lag := s.lag(p)
	return p[0] - lag + math.Atan2(omega*lag, s.stiff(p, omega))/omega
}

// at is the frequency response for a gain of 1.
func (s shape) at(p []float64, omega float64) complex128 {
	sin, cos := math.Sincos(-omega * s.dead(p))
	return complex(cos, sin) / complex(s.stiff(p, omega), omega*s.lag(p))
}

// stiff is the real part of what the answer is divided by.
func (s shape) stiff(p []float64, omega float64) float64 {
	if s.n < 3 {
		return 1
	}
	return 1 - omega*omega*p[2]*p[2]
}

func (f *Fit) at(omega float64) complex128 {
	return complex(f.Gain.Value, 0) * f.shape.at(f.param, omega)
}

func phaseDelay(f *Fit, omega float64) float64 { return f.shape.lateness(f.param, omega) }

// Settings are the fitted settings of the kind, SI, inside the ranges that its
// table allows.
func (f *Fit) Settings() kind.Values {
	v := f.shape.settings(f.param, f.Gain.Value)
	entry, err := plant.Actuators.Find(f.Kind)
	if err != nil {
		return v // the shapes name kinds of the table
	}
	for name, value := range v {
		if s, err := entry.Setting(name); err == nil && s.HasRange() {
			v[name] = kind.Num(min(max(value.Num, s.Min), s.Max))
		}
	}
	return v
}

// At is the gain and phase delay, s, of the fit at a frequency, Hz.
func (f *Fit) At(hz float64) (gain, delay float64) {
	omega := 2 * math.Pi * hz
	return cmplx.Abs(f.at(omega)), phaseDelay(f, omega)
}
