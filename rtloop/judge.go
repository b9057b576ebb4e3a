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
	s, v := l.cfg.Structure, l.centred
	t.VCV = s.VCV(v)
	t.VMV = s.VMV(v)
	t.AMA = s.AMA(l.a)
	t.Strain = l.integrator.Strain()
}

// judge updates limits, gauges and peaks at the tick's end. Numbers of a
// diverged tick are kept out of the gauges, so that what was found until then
// stays readable.
func (l *Loop) judge(t *gauge.EnergyTick) {
	for j := range l.channels {
		if l.limit(&l.channels[j]); l.outcome == Diverged {
			return
		}
	}
	if !l.cfg.Judge {
		return
	}
	for j := range l.channels {
		ch := &l.channels[j]
		ch.tracking.Add(ch.target, ch.measured)
		ch.record.Add(ch.target, ch.measured)
		if ch.spectrum != nil {
			ch.spectrum.Add(ch.target, ch.measured)
		}
		raise(&ch.peakCommand, ch.command)
		raise(&ch.peakVelocity, ch.velocity)
		raise(&ch.peakHurry, ch.hurry)
		raise(&ch.peakForce, ch.force)
	}
	if l.integrator != nil {
		l.balance(t)
	}
}

// raise lifts a peak to |v| if that is more. The limits have kept NaN away;
// max, which minds it, takes longer.
func raise(peak *float64, v float64) {
	if v = math.Abs(v); v > *peak {
		*peak = v
	}
}

// balance completes what the channels did in this tick and adds it to the
// energy of the loop.
func (l *Loop) balance(t *gauge.EnergyTick) {
	input := 0.0
	for i, x := range l.x {
		input += 0.5 * (l.externalWas[i] + l.external[i]) * (x - l.xWas[i])
	}
	t.Input = input
	if l.yields {
		gone := l.integrator.Hysteresis()
		t.Hysteresis = gone - l.hyst
		l.hyst = gone
	}
	l.measureStructure(t)
	l.energy.Add(t)
}

// limit trips the loop when a channel has passed one of its limits, or stops it
// as diverged when a number is none or beyond all reason. The comparisons are so
// written that NaN fails them.
func (l *Loop) limit(c *channel) {
	stroke := math.Abs(c.command)
	if y := math.Abs(c.measured); y > stroke || math.IsNaN(y) {
		stroke = y
	}
	speed, force, lag := math.Abs(c.velocity), math.Abs(c.force), math.Abs(c.target-c.measured)
	switch {
	case !(stroke < divergence):
		l.diverge(c, "command or measured displacement", stroke)
	case !(force <= math.MaxFloat64):
		l.diverge(c, "measured force", force)
	case !(speed <= math.MaxFloat64):
		l.diverge(c, "velocity", speed)
	case l.outcome != Running:
	case stroke > c.Limits.Stroke:
		l.tripOn(c, "stroke", stroke, c.Limits.Stroke)
	case speed > c.Limits.Velocity:
		l.tripOn(c, "velocity", speed, c.Limits.Velocity)
	case math.Abs(c.hurry) > c.Limits.Velocity:
		l.tripOn(c, "command velocity", math.Abs(c.hurry), c.Limits.Velocity)
	case force > c.Limits.Force:
		l.tripOn(c, "force", force, c.Limits.Force)
	case lag > c.Limits.Error:
		l.tripOn(c, "error", lag, c.Limits.Error)
	}
}

// diverge stops the loop: a value is beyond anything that a test can mean, or
// no number at all. c is nil where no channel is to blame.
func (l *Loop) diverge(c *channel, what string, v float64) {
	l.trip = &Trip{Limit: what, Value: Figure(v), Allowed: divergence, Time: l.Time()}
	if c != nil {
		l.trip.Channel = c.Name
	}
	l.outcome = Diverged
}

func (l *Loop) tripOn(c *channel, limit string, value, allowed float64) {
	l.trip = &Trip{limit, c.Name, Figure(value), Figure(allowed), l.Time()}
	l.outcome = Tripped
}
