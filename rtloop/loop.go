// Package rtloop is the loop of a hybrid test: tick by tick it couples a
// numerical substructure with compensators, actuators and specimens, and
// judges what happens. One whole loop is a Loop; a Rig runs several side by
// side on the same motion, beside the reference response.
//
// The package is handed its parts ready made and knows nothing of scenario
// files, screens or logs. Everything is SI. The structure lives in model
// time, everything physical (actuators, specimens, sensors, compensators,
// limits, delays) in physical time: with a slowdown λ one tick is dt_p
// physical seconds and dt = dt_p/λ model seconds.
package rtloop

import (
	"fmt"
	"math"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/gauge"
	"antelag/rtloop/substructure"
)

// Channel is one actuator with its specimen, sensors, compensator and limits,
// as it is handed to NewLoop. The parts have state: they belong to one Loop.
type Channel struct {
	Name         string
	Method       string // the kind of compensator, for reports
	Compensator  compensator.Compensator
	Actuator     plant.Actuator
	Specimen     *plant.Specimen
	Displacement *plant.Sensor
	Force        *plant.Sensor
	Limits       Limits
}

// Limits are the largest magnitudes that a channel may reach before the loop
// trips; +Inf where there is none.
type Limits struct {
	Stroke   float64 // of command and measured displacement, m
	Velocity float64 // of the actuator, m/s, physical
	Force    float64 // measured, N
	Error    float64 // of target − measured, m
}

// NoLimits never trip.
var NoLimits = Limits{math.Inf(1), math.Inf(1), math.Inf(1), math.Inf(1)}

// Config is what a Loop is made of.
type Config struct {
	Tick     float64 // physical seconds a tick, > 0
	Slowdown float64 // physical seconds per model second, > 0
	Drives   excitation.Drives
	Level    int // which level an applied force acts on, 1 … n

	// Structure is the numerical substructure whose attachments are the
	// channels, in the same order; nil when the excitation drives the target.
	Structure  *substructure.Structure
	Integrator string
	Initial    []float64 // displacements held before t = 0, m; nil: zero

	Channels []Channel
	Window   float64 // trailing window of energy and subspace, model seconds
	Ticks    int64   // expected length, to size the kept record
	Judge    bool    // keep gauges; the reference response needs none
}

// Drive is one sample of the excitation: its value, and for a driven target
// also its first two derivatives in model time.
type Drive struct{ X, V, A float64 }

// Outcome says how a loop stands.
type Outcome int

const (
	Running Outcome = iota
	Completed
	Tripped
	Diverged
	Interrupted
)

func (o Outcome) String() string {
	return [...]string{"running", "completed", "tripped", "diverged", "interrupted"}[o]
}

// MarshalText writes the outcome as a word.
func (o Outcome) MarshalText() ([]byte, error) { return []byte(o.String()), nil }

// Trip says which limit was passed, where, when and by how much.
type Trip struct {
	Limit   string  `json:"limit"` // stroke, velocity, force, error; or what diverged
	Channel string  `json:"channel"`
	Value   Figure  `json:"value"`   // SI
	Allowed Figure  `json:"allowed"` // SI
	Time    float64 `json:"time_s"`  // model seconds
}

// divergence is the displacement of a level or target, m, that no structural
// test can mean: beyond it the loop has diverged, whatever its limits.
const divergence = 1000.0

// Loop is one whole hybrid test: the tick that couples everything.
type Loop struct {
	cfg        Config
	dt         float64 // model seconds a tick
	velocity   float64 // model to physical velocity, 1/λ
	accelerate float64 // model to physical acceleration, 1/λ²

	channels   []channel
	integrator substructure.Integrator // nil when the target is driven
	load       []float64               // p at t_k: external minus specimen forces
	external   []float64               // external load at t_k
	externalWas,
	xWas []float64

	energy *gauge.Energy // nil without a structure
	hyst   float64       // dissipated by hysteretic storeys so far
	drive  float64       // excitation at t_k
	ticks  int64         // ticks done

	outcome Outcome
	trip    *Trip
}

// channel is the running state of a Channel.
type channel struct {
	Channel
	target, command, measured, force float64 // of this tick's end
	velocity                         float64 // of the actuator
	dissipated                       float64
	tracking                         *gauge.Tracking
	record                           *gauge.Record
	peakCommand, peakVelocity        float64
	peakForce                        float64
	tripped                          *Trip // room for the trip, so that tripping allocates nothing
}

// NewLoop builds a loop. It is not started.
func NewLoop(cfg Config) (*Loop, error) {
	l := &Loop{
		cfg: cfg, dt: cfg.Tick / cfg.Slowdown,
		velocity: 1 / cfg.Slowdown, accelerate: 1 / (cfg.Slowdown * cfg.Slowdown),
	}
	window := max(2, int(math.Round(cfg.Window/l.dt)))
	if cfg.Structure != nil {
		n := cfg.Structure.N()
		var err error
		if l.integrator, err = substructure.New(cfg.Integrator, cfg.Structure, l.dt); err != nil {
			return nil, fmt.Errorf("integrator: %w", err)
		}
		l.load, l.external = make([]float64, n), make([]float64, n)
		l.externalWas, l.xWas = make([]float64, n), make([]float64, n)
		if cfg.Judge {
			l.energy = gauge.NewEnergy(window, l.dt)
		}
	}
	for _, c := range cfg.Channels {
		ch := channel{Channel: c, tripped: &Trip{Channel: c.Name}}
		if cfg.Judge {
			ch.tracking = gauge.NewTracking(window)
			ch.record = gauge.NewRecord(cfg.Tick, int(min(cfg.Ticks+1, math.MaxInt32)))
		}
		l.channels = append(l.channels, ch)
	}
	return l, nil
}

// Start puts the loop at rest at t = 0 with the first sample of the
// excitation: the structure and all actuators stand at the initial
// displacements as if they had for ever.
func (l *Loop) Start(first Drive) {
	l.ticks, l.outcome, l.trip, l.drive = 0, Running, nil, first.X
	x0 := l.cfg.Initial
	if x0 == nil && l.integrator != nil {
		x0 = make([]float64, l.cfg.Structure.N())
	}
	for j := range l.channels {
		ch := &l.channels[j]
		x := first.X
		if l.integrator != nil {
			x = l.cfg.Structure.Project(x0, j)
		}
		ch.Actuator.Start(x, ch.Specimen)
		ch.Compensator.Start(x)
		ch.Displacement.Start(x)
		ch.Force.Start(ch.Specimen.Force())
		ch.target, ch.command, ch.velocity = x, x, 0
		ch.measured, ch.force = ch.Displacement.Read(x), ch.Force.Read(ch.Specimen.Force())
		_, ch.dissipated = ch.Specimen.Energy()
		ch.peakCommand, ch.peakVelocity, ch.peakForce = math.Abs(x), 0, math.Abs(ch.force)
		if l.cfg.Judge {
			ch.tracking.Start(ch.target, ch.measured)
			ch.record.Start(ch.target, ch.measured)
		}
	}
	if l.integrator != nil {
		l.setLoad()
		l.integrator.Start(x0, l.load)
		l.startEnergy()
	}
}

// Tick carries the loop from t_k to t_{k+1}; d is the excitation at t_{k+1}.
// It reports whether the loop still runs. It allocates nothing.
func (l *Loop) Tick(d Drive) bool {
	if l.outcome != Running {
		return false
	}
	if l.integrator != nil {
		copy(l.xWas, l.integrator.X())
		l.integrator.Predict()
	}
	l.drive = d.X
	l.ticks++
	var injected, specimen, dissipated float64
	for j := range l.channels {
		ch := &l.channels[j]
		in := compensator.Input{X: d.X, V: d.V, A: d.A, Y: ch.measured, R: ch.force}
		if l.integrator != nil {
			s := l.cfg.Structure
			in.X = s.Project(l.integrator.X(), j)
			in.V = s.Project(l.integrator.V(), j)
			in.A = s.Project(l.integrator.A(), j)
		}
		in.V *= l.velocity
		in.A *= l.accelerate
		if !l.sane(ch, "target", in.X) {
			return false
		}
		xWas, yWas, rWas := ch.target, ch.measured, ch.force
		ch.advance(in)
		// Work by the trapezoid rule. It is the force that goes back into the
		// structure that works on the target, so that the balance closes.
		r := 0.5 * (rWas + ch.force)
		dy := ch.measured - yWas
		injected += r * (dy - (ch.target - xWas))
		specimen += r * dy
		_, gone := ch.Specimen.Energy()
		dissipated += gone - ch.dissipated
		ch.dissipated = gone
	}
	if l.integrator != nil {
		copy(l.externalWas, l.external)
		l.setLoad()
		l.integrator.Correct(l.load)
	}
	if l.cfg.Judge {
		l.judge(injected, specimen, dissipated)
	}
	return l.outcome == Running
}

// advance takes one channel through compensate, act and sense.
func (c *channel) advance(in compensator.Input) {
	c.target = in.X
	c.command = c.Compensator.Command(in)
	y, v := c.Actuator.Advance(c.command, c.Specimen)
	c.velocity = v
	c.measured = c.Displacement.Read(y)
	c.force = c.Force.Read(c.Specimen.Force())
}

// setLoad assembles p from the excitation and the measured forces.
func (l *Loop) setLoad() {
	s := l.cfg.Structure
	if l.cfg.Drives == excitation.Ground {
		s.GroundLoad(l.external, l.drive)
	} else {
		l.external[l.cfg.Level-1] = l.drive
	}
	copy(l.load, l.external)
	for j := range l.channels {
		s.AddForce(l.load, j, l.channels[j].force)
	}
}

// Time returns the model time of the last tick's end, s.
func (l *Loop) Time() float64 { return float64(l.ticks) * l.dt }

// Ticks returns how many ticks have been done.
func (l *Loop) Ticks() int64 { return l.ticks }

// Outcome says how the loop stands.
func (l *Loop) Outcome() Outcome { return l.outcome }

// Displacements returns a view of the displacements of all levels relative to
// the ground, m; nil when the target is driven.
func (l *Loop) Displacements() []float64 {
	if l.integrator == nil {
		return nil
	}
	return l.integrator.X()
}

// Row is what a log keeps of one channel at one instant.
type Row struct{ Target, Command, Measured, Force float64 }

// Row returns channel j at the last tick's end: m, m, m, N.
func (l *Loop) Row(j int) Row {
	c := &l.channels[j]
	return Row{c.target, c.command, c.measured, c.force}
}

// Excitation returns the excitation at the last tick's end.
func (l *Loop) Excitation() float64 { return l.drive }

// Margin returns the energy margin over the trailing window; NaN while it is
// undefined.
func (l *Loop) Margin() float64 {
	if l.energy == nil {
		return math.NaN()
	}
	return l.energy.Margin()
}
