package rtloop

import "math"

// What a running loop can be asked between two ticks. All of it is for the
// goroutine that runs the ticks, costs the same however long the run is, and
// allocates nothing.

// Channels returns how many channels the loop has.
func (l *Loop) Channels() int { return len(l.channels) }

// Method returns the kind of compensator that channel j has now.
func (l *Loop) Method(j int) string { return l.channels[j].Method }

// Trip returns which limit ended the loop, nil while none has.
func (l *Loop) Trip() *Trip { return l.trip }

// Step returns the model seconds of a tick.
func (l *Loop) Step() float64 { return l.dt }

// Period returns the physical seconds of a tick.
func (l *Loop) Period() float64 { return l.cfg.Tick }

// NRMSE returns rms(target − measured)/rms(target) of channel j so far; NaN
// while the target has been zero, or where no gauges are kept.
func (l *Loop) NRMSE(j int) float64 {
	if t := l.channels[j].tracking; t != nil {
		return t.NRMSE()
	}
	return math.NaN()
}

// PeakError returns the largest |target − measured| of channel j so far, m.
func (l *Loop) PeakError(j int) float64 {
	if t := l.channels[j].tracking; t != nil {
		return t.PeakError()
	}
	return math.NaN()
}

// Delay returns the delay of channel j's synchronization subspace, physical
// seconds, positive when late; NaN while it is undefined.
func (l *Loop) Delay(j int) float64 {
	if t := l.channels[j].tracking; t != nil {
		return t.Subspace().Delay * l.cfg.Tick
	}
	return math.NaN()
}

// AtRest reports whether channel j moves so little now that its synchronization
// subspace says nothing (see gauge.Tracking).
func (l *Loop) AtRest(j int) bool {
	t := l.channels[j].tracking
	return t != nil && t.AtRest()
}

// Judged reports whether there is energy to judge: a structure is integrated.
func (l *Loop) Judged() bool { return l.energy != nil }

// MarginMin returns the smallest energy margin so far; NaN while none was
// defined.
func (l *Loop) MarginMin() float64 {
	if l.energy == nil {
		return math.NaN()
	}
	return l.energy.MarginMin()
}

// AddedDamping returns the damping ratio that the tracking error of all
// channels looks like over the trailing window, negative where it puts energy
// in; NaN while it is undefined.
func (l *Loop) AddedDamping() float64 {
	if l.energy == nil {
		return math.NaN()
	}
	return l.energy.AddedDamping()
}

// Window returns the trailing window of energy and subspace, model seconds.
func (l *Loop) Window() float64 { return l.cfg.Window }
