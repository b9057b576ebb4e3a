package rtloop

import (
	"context"
	"math"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// The parts that the tests of this package put together.

// newPart builds a kind of a table; call hands the builder what it needs.
func newPart[B, T any](tb testing.TB, table *kind.Table[B], name string, given kind.Values, call func(B, kind.Values) (T, error)) T {
	tb.Helper()
	entry, err := table.Find(name)
	if err != nil {
		tb.Fatal(err)
	}
	values, err := entry.Resolve(given)
	if err != nil {
		tb.Fatal(err)
	}
	part, err := call(entry.New, values)
	if err != nil {
		tb.Fatal(err)
	}
	return part
}

func newCompensator(tb testing.TB, tick float64, name string, given kind.Values) compensator.Compensator {
	tb.Helper()
	return newPart(tb, &compensator.Kinds, name, given,
		func(build compensator.New, v kind.Values) (compensator.Compensator, error) { return build(tick, v) })
}

func newActuator(tb testing.TB, timing plant.Timing, given kind.Values) plant.Actuator {
	tb.Helper()
	return newPart(tb, &plant.Actuators, "lag-delay", given,
		func(build plant.NewActuator, v kind.Values) (plant.Actuator, error) { return build(timing, v) })
}

func newElement(tb testing.TB, name string, given kind.Values) plant.Element {
	tb.Helper()
	return newPart(tb, &plant.Elements, name, given,
		func(build plant.NewElement, v kind.Values) (plant.Element, error) { return build(v) })
}

// perfectChannel has neither lag nor noise nor compensator.
func perfectChannel(tb testing.TB, tick float64, elements ...plant.Element) Channel {
	tb.Helper()
	return Channel{
		Name: "c", Method: "none",
		Compensator:  newCompensator(tb, tick, "none", nil),
		Actuator:     newActuator(tb, plant.Timing{Tick: tick}, nil),
		Specimen:     plant.NewSpecimen(elements...),
		Displacement: plant.NewPerfectSensor(), Force: plant.NewPerfectSensor(), Limits: NoLimits,
	}
}

// oscillator is one storey whose stiffness is partly specimen, released from
// 10 mm: m = 100 t, 1.5 Hz.
type oscillator struct {
	rate, slowdown float64
	damping        float64 // ratio of the whole
	share          float64 // of the stiffness, in the specimen
	delay, lag     float64 // of the actuator, s
	method         string
	settings       kind.Values
	integrator     string
}

const (
	oscillatorMass  = 100e3
	oscillatorOmega = 2 * math.Pi * 1.5
	releasedFrom    = 0.010
)

func (o oscillator) loop(tb testing.TB) *Loop {
	tb.Helper()
	if o.method == "" {
		o.method = "none"
	}
	if o.integrator == "" {
		o.integrator = "CR"
	}
	if o.slowdown == 0 {
		o.slowdown = 1
	}
	k := oscillatorMass * oscillatorOmega * oscillatorOmega
	s, err := substructure.FromStoreys(
		[]substructure.Storey{{Mass: oscillatorMass, Stiffness: (1 - o.share) * k, Damping: 2 * o.damping * oscillatorOmega * oscillatorMass}},
		substructure.Damping{},
		[]substructure.Attachment{{From: 0, To: 1, Stiffness: o.share * k}})
	if err != nil {
		tb.Fatal(err)
	}
	tick := 1 / o.rate
	c := perfectChannel(tb, tick, newElement(tb, "spring", kind.Values{"stiffness": kind.Num(o.share * k)}))
	c.Method = o.method
	c.Compensator = newCompensator(tb, tick, o.method, o.settings)
	c.Actuator = newActuator(tb, plant.Timing{Tick: tick}, kind.Values{"delay": kind.Num(o.delay), "lag": kind.Num(o.lag)})
	l, err := NewLoop(Config{
		Tick: tick, Slowdown: o.slowdown, Drives: excitation.Ground, Structure: s, Integrator: o.integrator,
		Initial: []float64{releasedFrom}, Channels: []Channel{c},
		Window: 5 * 2 * math.Pi / oscillatorOmega, Ticks: 1 << 16, Judge: true,
	})
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

// ringDown lets the oscillator go and returns its growth: the peak displacement
// over the period from the second instant, over that from the first. A loop that
// diverges on the way has grown without bound.
func ringDown(l *Loop, from, to float64) (growth float64) {
	l.Start(Drive{})
	period := 2 * math.Pi / oscillatorOmega
	var early, late float64
	for l.Time() < to+period {
		if !l.Tick(Drive{}) {
			return math.Inf(1)
		}
		x := math.Abs(l.channels[0].target)
		switch t := l.Time(); {
		case t >= from && t < from+period:
			early = max(early, x)
		case t >= to:
			late = max(late, x)
		}
	}
	return late / early
}

// fixedMotion plays samples and then zeros.
type fixedMotion struct {
	samples []float64
	at      int
}

func (m *fixedMotion) Fill(dst []float64) {
	for i := range dst {
		dst[i] = 0
		if m.at < len(m.samples) {
			dst[i] = m.samples[m.at]
		}
		m.at++
	}
}

// shaking is a broadband ground acceleration of so many samples, m/s².
func shaking(n int, step float64) []float64 {
	out := make([]float64, n)
	for i := range out {
		t := float64(i) * step
		for k, f := range []float64{0.7, 1.1, 1.9, 3.3, 5.7, 9.1} {
			out[i] += 1.5 / float64(k+1) * math.Sin(2*math.Pi*f*t+float64(k*k))
		}
	}
	return out
}

func runRig(tb testing.TB, r *Rig) {
	tb.Helper()
	if err := r.Run(context.Background(), nil); err != nil {
		tb.Fatal(err)
	}
}
