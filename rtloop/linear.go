package rtloop

import (
	"errors"
	"fmt"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/substructure"
)

// ErrNoLoop says that the excitation drives the target: no force comes back.
var ErrNoLoop = errors.New("the excitation drives the target, so no force comes back and there is no loop that could be unstable")

// ChannelError says what is wrong with one channel, counted from 0.
type ChannelError struct {
	Channel int
	Name    string
	Err     error
}

func (e *ChannelError) Error() string { return "channel " + e.Name + ": " + e.Err.Error() }
func (e *ChannelError) Unwrap() error { return e.Err }

// Linear returns the loop that l is for small motions about rest at zero, and
// puts it there: storeys and specimen elements at their tangent, compensators
// with the coefficients of now, sensors without bias, noise and quantum, no limits
// and no gauges. It goes through the same tick. Errors are ErrNoLoop and
// *ChannelError.
//
// The new loop takes the actuators over, so l must not run any more.
func (l *Loop) Linear() (*Loop, error) {
	if l.integrator == nil {
		return nil, ErrNoLoop
	}
	cfg := l.cfg
	cfg.Structure = cfg.Structure.Elastic()
	cfg.Initial, cfg.Memory, cfg.Judge, cfg.Spectra = nil, 0, false, false
	cfg.Channels = make([]Channel, len(l.channels))
	for j := range l.channels {
		c := l.channels[j].Channel
		specimen, err := c.Specimen.Tangent()
		if err != nil {
			return nil, &ChannelError{j, c.Name, err}
		}
		if r, ok := c.Actuator.(plant.Refiner); ok {
			r.Refine()
		}
		c.Specimen, c.Compensator = specimen, compensator.Frozen(c.Compensator)
		c.Displacement, c.Force = c.Displacement.Linear(), c.Force.Linear()
		c.Limits = NoLimits
		cfg.Channels[j] = c
	}
	linear, err := NewLoop(cfg)
	if err != nil {
		return nil, fmt.Errorf("linearized loop: %w", err)
	}
	linear.Start(Drive{})
	return linear, nil
}

// TakeLearned gives the loop copies of those compensators of another loop that
// learn, with what they have learned, at rest and learning no more. The loops have
// the same channels; where they have other kinds of compensators, nothing is taken.
func (l *Loop) TakeLearned(from *Loop) {
	for j := range l.channels {
		if c, ok := from.channels[j].Compensator.(compensator.Adaptive); ok && l.channels[j].Method == from.channels[j].Method {
			l.channels[j].Compensator = c.Frozen()
		}
	}
}

// Integrator returns what carries the structure; nil when the target is driven.
func (l *Loop) Integrator() substructure.Integrator { return l.integrator }

// Part returns the parts of channel j as they are now.
func (l *Loop) Part(j int) Channel { return l.channels[j].Channel }

// Rates returns what velocities and accelerations of the structure are multiplied
// by to become physical ones: 1/λ and 1/λ², λ the slowdown.
func (l *Loop) Rates() (velocity, acceleration float64) { return l.velocity, l.accelerate }

// State appends what the loop carries from tick to tick: displacements,
// velocities and accelerations of all levels, what else the integrator carries,
// and for each channel the measured displacement and force and what actuator,
// specimen, sensors and compensator carry. Hysteretic storeys and gauges are no
// part of it, nor is what a compensator learns: it is the state of a loop that
// Linear has made. It has the same length and order at any time.
func (l *Loop) State(dst []float64) []float64 {
	dst = append(dst, l.x...)
	dst = append(dst, l.v...)
	dst = append(dst, l.a...)
	dst = append(dst, l.integrator.Memory()...)
	for j := range l.channels {
		c := &l.channels[j]
		dst = append(dst, c.measured, c.force)
		c.memories(func(v *float64) { dst = append(dst, *v) })
	}
	return dst
}

// SetState puts the loop into a state that State has given, of this loop or of
// another one that is made alike: the next ticks are those that followed there.
func (l *Loop) SetState(state []float64) {
	n := len(l.x)
	l.integrator.SetState(state[:n], state[n:2*n], state[2*n:3*n])
	state = state[3*n:]
	state = state[copy(l.integrator.Memory(), state):]
	for j := range l.channels {
		c := &l.channels[j]
		c.measured, c.force = state[0], state[1]
		state = state[2:]
		c.memories(func(v *float64) {
			*v = state[0]
			state = state[1:]
		})
	}
}

func (c *channel) memories(each func(*float64)) {
	c.Actuator.Memory(each)
	c.Specimen.Memory(each)
	c.Displacement.Memory(each)
	c.Force.Memory(each)
	c.Compensator.Memory(each)
}
