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
	"math"
	"strconv"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/gauge"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
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
	Velocity float64 // of the actuator, and of what is commanded, m/s, physical
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
	Method     kind.Values // settings of the integrator; those not given have their defaults
	Initial    []float64   // displacements held before t = 0, m; nil: zero

	Channels []Channel
	Window   float64 // trailing window of energy and subspace, model seconds
	Ticks    int64   // expected length, to size the kept record
	Memory   int     // ticks kept for a compensator that takes over; 0: none
	Spectra  bool    // compare response spectra of measured and target
	Judge    bool    // keep gauges; the reference response needs none. Limits hold always
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
	x, v, a    []float64               // views of its state: asked for once, not every tick
	centred    []float64
	load       []float64 // p at t_k: external minus specimen forces
	external   []float64 // external load at t_k
	externalWas,
	xWas []float64

	energy *gauge.Energy // nil without a structure
	yields bool          // the structure has hysteretic storeys
	hyst   float64       // dissipated by hysteretic storeys so far
	drive  float64       // excitation at t_k
	ticks  int64         // ticks done

	outcome Outcome
	trip    *Trip
}

// channel is the running state of a Channel.
type channel struct {
	Channel
	in                               Drive   // target of this tick and its derivatives, physical
	target, command, measured, force float64 // of this tick's end
	velocity                         float64 // of the actuator
	hurry                            float64 // what the command asks for: its change over the tick, m/s
	perTick                          float64 // 1/s
	dissipated                       float64
	memory                           memory
	tracking                         *gauge.Tracking
	record                           *gauge.Record
	spectrum                         *gauge.Spectrum // nil unless asked for
	peakCommand, peakVelocity        float64
	peakHurry                        float64
	peakForce                        float64
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
		if l.integrator, err = substructure.NewWith(cfg.Integrator, cfg.Structure, l.dt, cfg.Method); err != nil {
			return nil, err
		}
		l.x, l.v, l.a, l.centred = l.integrator.X(), l.integrator.V(), l.integrator.A(), l.integrator.Centred()
		l.yields = cfg.Structure.Yields()
		l.load, l.external = make([]float64, n), make([]float64, n)
		l.externalWas, l.xWas = make([]float64, n), make([]float64, n)
		if cfg.Judge {
			l.energy = gauge.NewEnergy(window, l.dt)
		}
	}
	for _, c := range cfg.Channels {
		ch := channel{Channel: c, perTick: 1 / cfg.Tick}
		if cfg.Memory > 0 {
			ch.memory.ticks = make([]moment, cfg.Memory)
		}
		if cfg.Judge {
			ch.tracking = gauge.NewTracking(window)
			ch.record = gauge.NewRecord(cfg.Tick, int(min(cfg.Ticks, math.MaxInt32)))
			ch.record.Response = cfg.Structure == nil
			if cfg.Spectra {
				ch.spectrum = gauge.NewSpectrum(l.dt)
			}
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
	if !l.startAt(l.cfg.Initial) {
		// Numbers of such a start are kept out of the figures.
		l.drive = 0
		l.startAt(nil)
	}
}

// startAt puts the loop at rest at the displacements x0, nil for zero. It stops
// where a channel stands beyond all reason, so that the loop has diverged, and
// reports whether it got to the end.
func (l *Loop) startAt(x0 []float64) bool {
	before := l.outcome
	if x0 == nil && l.integrator != nil {
		x0 = make([]float64, l.cfg.Structure.N())
	}
	for j := range l.channels {
		c, x := &l.channels[j], l.drive
		if l.integrator != nil {
			x = l.cfg.Structure.Project(x0, j)
		}
		if !(math.Abs(x) < divergence) {
			l.diverge(c, "target", x)
			return false
		}
		c.start(x)
		if l.limit(c); l.outcome == Diverged && before != Diverged {
			return false
		}
	}
	if l.integrator != nil {
		l.setLoad()
		l.integrator.Start(x0, l.load)
		l.startEnergy()
	}
	return true
}

// start puts a channel at rest under the target x: commanded what the
// compensator asks for there, and standing where the actuator then stands.
func (c *channel) start(x float64) {
	c.memory.at, c.memory.full = 0, false
	c.Compensator.Start(x, x)
	c.target, c.command, c.velocity = x, c.Compensator.Command(compensator.Input{X: x, Y: x}), 0
	y := c.Actuator.Start(c.command, c.Specimen)
	c.Displacement.Start(y)
	c.Force.Start(c.Specimen.Force())
	c.measured, c.force = c.Displacement.Read(y), c.Force.Read(c.Specimen.Force())
	c.Compensator.Start(x, c.measured)
	_, c.dissipated = c.Specimen.Energy()
	c.hurry, c.peakHurry = 0, 0
	c.peakCommand, c.peakVelocity, c.peakForce = math.Abs(c.command), 0, math.Abs(c.force)
	if c.tracking != nil {
		c.tracking.Start(c.target, c.measured)
		c.record.Start(c.target, c.measured)
	}
	if c.spectrum != nil {
		c.spectrum.Start(c.target, c.measured)
	}
}

// Tick carries the loop from t_k to t_{k+1}; d is the excitation at t_{k+1}.
// It reports whether the loop still runs. It allocates nothing, but for the
// report of its end.
func (l *Loop) Tick(d Drive) bool {
	if l.outcome != Running {
		return false
	}
	l.drive = d.X
	l.ticks++
	if l.integrator != nil {
		copy(l.xWas, l.x)
		l.integrator.Predict()
	}
	if !l.aim(d) {
		return false
	}
	var t gauge.EnergyTick
	for j := range l.channels {
		l.channels[j].advance(&t)
	}
	if l.integrator != nil {
		copy(l.externalWas, l.external)
		l.setLoad()
		l.integrator.Correct(l.load)
	}
	l.judge(&t)
	return l.outcome == Running
}

// aim works out what every channel is to do, and stops the loop before any
// actuator moves if that is beyond all reason.
func (l *Loop) aim(d Drive) bool {
	for i, x := range l.x {
		if !(math.Abs(x) < divergence) {
			l.diverge(nil, "displacement of level "+strconv.Itoa(i+1), x)
			return false
		}
	}
	for j := range l.channels {
		ch := &l.channels[j]
		x, v, a := d.X, d.V, d.A
		if l.integrator != nil {
			s := l.cfg.Structure
			x, v, a = s.Project(l.x, j), s.Project(l.v, j), s.Project(l.a, j)
		}
		if !(math.Abs(x) < divergence) {
			l.diverge(ch, "target", x)
			return false
		}
		ch.in = Drive{x, v * l.velocity, a * l.accelerate}
	}
	return true
}

// advance takes one channel through compensate, act and sense, and adds its
// work by the trapezoid rule. It is the force that goes back into the structure
// that works on the target, so that the balance closes.
func (c *channel) advance(t *gauge.EnergyTick) {
	xWas, yWas, rWas, uWas := c.target, c.measured, c.force, c.command
	c.target = c.in.X
	// The input is put together where it is handed over: one that is kept, and
	// so copied just after it was written, stalls the tick for a tenth of its
	// time (stores of 8 bytes, loads of 16).
	c.command = c.Compensator.Command(compensator.Input{X: c.in.X, V: c.in.V, A: c.in.A, Y: yWas, R: rWas})
	if c.memory.ticks != nil {
		c.memory.add(compensator.Input{X: c.in.X, V: c.in.V, A: c.in.A, Y: yWas, R: rWas}, c.command)
	}
	c.hurry = (c.command - uWas) * c.perTick
	y, v := c.Actuator.Advance(c.command, c.Specimen)
	c.velocity = v
	c.measured = c.Displacement.Read(y)
	c.force = c.Force.Read(c.Specimen.Force())

	r := 0.5 * (rWas + c.force)
	dy := c.measured - yWas
	t.Injected += r * (dy - (c.target - xWas))
	t.Specimen += r * dy
	_, gone := c.Specimen.Energy()
	t.Dissipated += gone - c.dissipated
	c.dissipated = gone
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

// Structure returns the numerical substructure; nil when the target is driven.
func (l *Loop) Structure() *substructure.Structure { return l.cfg.Structure }

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
