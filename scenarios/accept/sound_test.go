package accept

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"strings"

	"antelag/rtloop"
)

// sound checks what must hold of every verdict, whatever was run.
func sound(v *Verdict) error {
	for i := range v.Lanes {
		l := &v.Lanes[i]
		if err := errors.Join(ended(l), decided(l), figures(l)); err != nil {
			return fmt.Errorf("lane %s: %w", l.Name, err)
		}
	}
	if _, err := encode(v); err != nil {
		return err
	}
	for _, colour := range []bool{false, true} {
		var text strings.Builder
		if err := v.WriteText(&text, colour); err != nil {
			return err
		}
		if s := text.String(); strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
			return fmt.Errorf("the text shows what is no number:\n%s", s)
		}
	}
	return nil
}

// encode is the verdict as JSON without what the run cost.
func encode(v *Verdict) ([]byte, error) {
	w := *v
	w.Compute = Compute{}
	return json.Marshal(&w)
}

// ended checks that the lane ended in one of three ways, and says why.
func ended(l *Lane) error {
	t := l.Trip
	switch {
	case l.Outcome == rtloop.Completed && t == nil:
	case l.Outcome == rtloop.Tripped && t != nil && t.Value.Defined() && t.Value > t.Allowed && t.Time <= l.Ran:
	case l.Outcome == rtloop.Diverged && t != nil && t.Limit != "" && !(math.Abs(float64(t.Value)) < float64(t.Allowed)) && t.Time <= l.Ran:
	default:
		return fmt.Errorf("%s with %+v after %v s", l.Outcome, t, l.Ran)
	}
	return nil
}

// decided checks that the lane passes where it completed and every limit was
// met by a figure that is a number, and only there.
func decided(l *Lane) error {
	pass := l.Outcome == rtloop.Completed
	for _, j := range l.Accept {
		if j.Pass && !j.Got.Defined() {
			return fmt.Errorf("%s passes though undefined", j.Limit)
		}
		pass = pass && j.Pass
	}
	if l.Pass != pass {
		return fmt.Errorf("passes: %v; by outcome and limits: %v", l.Pass, pass)
	}
	return nil
}

// figures checks those of a completed lane: each is finite, or NaN where its
// description has a case for that. None is infinite.
func figures(l *Lane) error {
	if l.Outcome != rtloop.Completed {
		return nil
	}
	var bad []string
	check := func(name string, mayBeUndefined bool, f rtloop.Figure) {
		if math.IsInf(float64(f), 0) || !mayBeUndefined && !f.Defined() {
			bad = append(bad, fmt.Sprintf("%s is %v", name, float64(f)))
		}
	}
	for i := range l.Channels {
		c := &l.Channels[i]
		still := c.PeakTarget == 0
		for name, f := range map[string]rtloop.Figure{"nrmse": c.NRMSE, "peak_error_ratio": c.PeakErrorRatio, "amplitude_ratio": c.AmplitudeRatio} {
			check(name, still, f)
		}
		for name, f := range map[string]rtloop.Figure{"delay": c.Delay, "fei.amplitude": c.FEI.Amplitude, "fei.delay": c.FEI.Delay,
			"fei.frequency": c.FEI.Frequency, "spectrum_error": c.SpectrumError} {
			check(name, true, f)
		}
		for name, f := range map[string]rtloop.Figure{"peak_error": c.PeakError, "tracking_indicator": c.TrackingIndicator,
			"peak_target": c.PeakTarget, "peak_command": c.PeakCommand, "peak_velocity": c.PeakVelocity, "peak_force": c.PeakForce} {
			check(name, false, f)
		}
		for name, f := range c.Coefficients {
			check("coefficient "+name, false, f)
		}
		for _, b := range c.Response {
			check("frequency of a band", false, b.Frequency)
			check("amplitude of a band", false, b.Amplitude)
			check("delay of a band", false, b.Delay)
		}
	}
	e := &l.Energy
	driven := math.IsNaN(float64(e.Input)) // the target: there is no structure
	for name, f := range terms(e) {
		check(name, driven, f)
	}
	check("balance_error", driven, e.BalanceError)
	check("window", false, e.Window)
	for name, f := range map[string]rtloop.Figure{"margin_min": e.MarginMin, "margin_final": e.MarginFinal,
		"added_damping": e.AddedDamping, "response_error": l.ResponseError} {
		check(name, true, f)
	}
	if bad != nil {
		return errors.New(strings.Join(bad, ", "))
	}
	return nil
}

// terms are those of the energy balance.
func terms(e *rtloop.EnergyResult) map[string]rtloop.Figure {
	return map[string]rtloop.Figure{"input": e.Input, "kinetic": e.Kinetic, "strain": e.Strain, "damped": e.Damped,
		"specimen": e.Specimen, "injected": e.Injected}
}

// motion sees what a loop does, to tell whether its ticks resolve it.
type motion struct {
	dt     float64
	turn   float64  // fastest mode of the whole structure, rad a tick
	levels []signal // displacements
	forces []signal // measured
	drive  signal
	peak   float64 // largest kinetic energy, J
	stiff  float64 // largest stiffness of the whole structure against one level, N/m
	far    float64 // largest displacement, m
	step   []float64
	ticks  int
}

// signal is a series of samples of which the sizes of value, change and
// change of the change are summed up.
type signal struct {
	last, step         float64
	value, slope, bend float64 // sums of squares
}

func (s *signal) add(v float64, n int) {
	step := v - s.last
	s.value += v * v
	if n > 0 {
		s.slope += step * step
	}
	if n > 1 {
		s.bend += (step - s.step) * (step - s.step)
	}
	s.last, s.step = v, step
}

// observe is called at the start and after every tick of a loop with a
// structure and so many channels.
func (m *motion) observe(l *rtloop.Loop, channels int) {
	s, x := l.Structure(), l.Displacements()
	if m.levels == nil {
		m.turn = s.Frequencies()[s.N()-1] * m.dt
		for i := range s.N() {
			m.stiff = max(m.stiff, s.TotalStiffness().At(i, i))
		}
		m.levels, m.forces, m.step = make([]signal, s.N()), make([]signal, channels), make([]float64, s.N())
	}
	for i, v := range x {
		m.levels[i].add(v, m.ticks)
		m.step[i] = m.levels[i].step
		m.far = max(m.far, math.Abs(v))
	}
	for j := range m.forces {
		m.forces[j].add(l.Row(j).Force, m.ticks)
	}
	m.drive.add(l.Excitation(), m.ticks)
	if m.ticks > 0 {
		m.peak = max(m.peak, s.VMV(m.step)/(2*m.dt*m.dt))
	}
	m.ticks++
}

// What a motion must keep to for its ticks to resolve it: the trapezoid rule
// then errs by some thousandths.
const (
	mostTurn   = 0.2  // of the fastest mode, rad a tick
	mostBend   = 0.05 // rms change of velocity in a tick over rms velocity, of every level
	mostChange = 0.2  // rms change in a tick over rms, of every force and of the excitation
)

// resolved reports whether the ticks resolve what moved: the modes, the
// displacements, and, without chatter, the forces and the excitation.
func (m *motion) resolved() bool {
	good := m.turn <= mostTurn && m.drive.slope <= mostChange*mostChange*m.drive.value
	for _, s := range m.levels {
		good = good && s.bend <= mostBend*mostBend*s.slope
	}
	for _, s := range m.forces {
		good = good && s.slope <= mostChange*mostChange*s.value
	}
	return good
}

// balanced checks that the energy of a completed lane adds up within 1 % of
// the most that was there: the largest term at the end, or the largest kinetic
// energy, where the excitation has taken back what it gave. Rounding is let
// pass: of a stiff structure that moves as a whole little else is strained.
func (m *motion) balanced(l *Lane) error {
	e := &l.Energy
	largest := 0.0
	for _, f := range terms(e) {
		largest = max(largest, math.Abs(float64(f)))
	}
	residual := float64(e.BalanceError) * largest
	rounding := 1e-14 * m.stiff * m.far * m.far
	if most := max(largest, m.peak); !(residual <= 0.01*most+rounding) {
		return fmt.Errorf("the balance is open by %g J of %g J, with %.3g rad a tick", residual, most, m.turn)
	}
	return nil
}
