package rtloop

import (
	"math"

	"antelag/rtloop/gauge"
)

// startEnergy opens the energy balance: what is stored at t = 0 counts as
// input.
func (l *Loop) startEnergy() {
	l.hyst = l.integrator.Hysteresis()
	if l.energy == nil {
		return
	}
	stored := 0.0
	for j := range l.channels {
		s, _ := l.channels[j].Specimen.Energy()
		stored += s
	}
	t := gauge.EnergyTick{Specimen: stored}
	l.measureStructure(&t)
	t.Input = t.Strain + stored
	l.energy.Start(t)
}

// measureStructure fills in what the numerical substructure has at this
// instant.
func (l *Loop) measureStructure(t *gauge.EnergyTick) {
	s, v := l.cfg.Structure, l.integrator.Centred()
	t.VCV = s.VCV(v)
	t.VMV = s.VMV(v)
	t.AMA = s.AMA(l.integrator.A())
	t.Strain = l.integrator.Strain()
}

// judge updates limits, gauges and peaks at the tick's end. Numbers of a
// diverged tick are kept out of the gauges, so that what was found until then
// stays readable.
func (l *Loop) judge(injected, specimen, dissipated float64) {
	for j := range l.channels {
		if l.limit(&l.channels[j]); l.outcome == Diverged {
			return
		}
	}
	for j := range l.channels {
		ch := &l.channels[j]
		ch.tracking.Add(ch.target, ch.measured)
		ch.record.Add(ch.target, ch.measured)
		ch.peakCommand = max(ch.peakCommand, math.Abs(ch.command))
		ch.peakVelocity = max(ch.peakVelocity, math.Abs(ch.velocity))
		ch.peakForce = max(ch.peakForce, math.Abs(ch.force))
	}
	if l.integrator == nil {
		return
	}
	x := l.integrator.X()
	input := 0.0
	for i := range x {
		input += 0.5 * (l.externalWas[i] + l.external[i]) * (x[i] - l.xWas[i])
	}
	gone := l.integrator.Hysteresis()
	t := gauge.EnergyTick{
		Injected: injected, Specimen: specimen, Dissipated: dissipated,
		Input: input, Hysteresis: gone - l.hyst,
	}
	l.hyst = gone
	l.measureStructure(&t)
	l.energy.Add(&t)
}

// limit trips the loop when a channel has passed one of its limits. The
// comparisons are so written that NaN passes a limit too.
func (l *Loop) limit(c *channel) {
	stroke := max(math.Abs(c.command), math.Abs(c.measured))
	lag := math.Abs(c.target - c.measured)
	switch {
	case l.outcome != Running:
	case !(stroke < divergence):
		l.sane(c, "command or measured displacement", stroke)
	case !(stroke <= c.Limits.Stroke):
		l.tripOn(c, "stroke", stroke, c.Limits.Stroke)
	case !(math.Abs(c.velocity) <= c.Limits.Velocity):
		l.tripOn(c, "velocity", math.Abs(c.velocity), c.Limits.Velocity)
	case !(math.Abs(c.force) <= c.Limits.Force):
		l.tripOn(c, "force", math.Abs(c.force), c.Limits.Force)
	case !(lag <= c.Limits.Error):
		l.tripOn(c, "error", lag, c.Limits.Error)
	}
}

// sane stops the loop as diverged when a displacement is beyond anything that
// a test can mean, or no number at all.
func (l *Loop) sane(c *channel, what string, v float64) bool {
	if math.Abs(v) < divergence {
		return true
	}
	l.tripOn(c, what, v, divergence)
	l.outcome = Diverged
	return false
}

func (l *Loop) tripOn(c *channel, limit string, value, allowed float64) {
	c.tripped.Limit = limit
	c.tripped.Value, c.tripped.Allowed = Figure(value), Figure(allowed)
	c.tripped.Time = l.Time()
	l.trip, l.outcome = c.tripped, Tripped
}
