package scenarios

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// check refuses what could be built but could not mean anything.
func (b *builder) check() error {
	for _, judge := range []func() error{b.checkStep, b.checkMemory, b.checkResolved, b.checkMass} {
		if err := judge(); err != nil {
			return err
		}
	}
	return nil
}

// checkResolved refuses frequencies of the excitation that the ticks cannot
// tell from lower ones.
func (b *builder) checkResolved() error {
	e, highest := b.s.Excitation, 1/(2*b.step())
	for i := range e.Kind.Settings {
		s := &e.Kind.Settings[i]
		v, given := e.Part.Values[s.Name]
		if s.Dim == quantity.Frequency && s.Type == kind.NumberType && given && v.Num >= highest {
			return b.s.doc.errorAt("excitation."+s.Name, fmt.Errorf("%s is not below half the rate in model time, %s", s.Format(v.Num), s.Format(highest)))
		}
	}
	return nil
}

// checkMass refuses specimens with more mass than the structure has where they
// are: their inertia comes back a tick late, and a loop that feeds a force
// −m·a(t − dt) into a mass M grows for m > M with any actuator.
func (b *builder) checkMass() error {
	if b.structure == nil {
		return nil
	}
	n := b.structure.N()
	extra := mat.NewSymDense(n, nil)
	heavy := false
	for j := range b.s.Channels {
		s, err := b.specimen(j)
		if err != nil {
			return err
		}
		m := s.Mass()
		if m == 0 {
			continue
		}
		heavy = true
		direction := make([]float64, n)
		for i := range direction {
			unit := make([]float64, n)
			unit[i] = 1
			direction[i] = b.structure.Project(unit, j)
		}
		extra.SymRankOne(extra, m, mat.NewVecDense(n, direction))
	}
	if !heavy {
		return nil
	}
	var ratio mat.Dense
	if err := ratio.Solve(b.structure.Mass(), extra); err != nil {
		return err
	}
	var eigen mat.Eigen
	if !eigen.Factorize(&ratio, mat.EigenNone) {
		return errors.New("substructure: the mass ratio cannot be found")
	}
	largest := 0.0
	for _, v := range eigen.Values(nil) {
		largest = max(largest, real(v))
	}
	if largest >= 1 {
		return b.s.doc.errorAt("channel[0]", fmt.Errorf("the specimens' masses are %s times the structure's own where they act; their inertia acts a tick late and the loop would grow with any actuator: they must be below 1 times (let the numerical part hold more of the mass)",
			quantity.Short(math.Round(100*largest)/100, quantity.None)))
	}
	return nil
}

// What the gauges keep, bytes: a tick of every lane's channel in the record (up
// to two segments of 2²⁰) and in the window of its subspace, a tick of every lane
// in the window of its energy.
const (
	bytesPerTick  = 16
	recordTicks   = 1 << 20
	windowBytes   = 32
	largestMemory = 8 << 30
)

// checkMemory refuses a test whose gauges would not fit into the memory of a
// common machine, before anything is allocated.
func (b *builder) checkMemory() error {
	lanes, channels := float64(1+len(b.s.Lanes)), float64(len(b.s.Channels))
	total := lanes * b.laneBytes(float64(b.ticks), b.window)
	if total > largestMemory {
		return b.s.doc.errorAt("loop", fmt.Errorf("%g lanes of %g channels with %.3g ticks in the energy window would keep %.3g GB of ticks; at most %.3g GB (a shorter energy_window or fewer lanes need less)",
			lanes, channels, b.window/b.step(), total/1e9, float64(largestMemory)/1e9))
	}
	return nil
}

// laneBytes is what the gauges of one lane keep.
func (b *builder) laneBytes(ticks, window float64) float64 {
	record := min(ticks, 2*recordTicks) * bytesPerTick
	trail := window / b.step() * windowBytes
	return float64(len(b.s.Channels))*(record+trail) + trail
}

// checkStep refuses a step at which the integrator is unstable whatever the
// actuator does: explicit Newmark from 2/ω_max on.
func (b *builder) checkStep() error {
	if b.structure == nil || b.s.Substructure.Values.Text("integrator") != "newmark-explicit" {
		return nil
	}
	f := b.structure.Frequencies()
	fastest := f[len(f)-1]
	if limit := 2 / fastest; b.step() >= limit {
		return b.s.doc.errorAt("loop.rate", fmt.Errorf("the model step of %s is not below %s, where newmark-explicit becomes unstable with the highest mode at %s; raise the rate or use CR",
			quantity.Short(b.step(), quantity.Time), quantity.Short(limit, quantity.Time), quantity.Short(fastest/(2*math.Pi), quantity.Frequency)))
	}
	return nil
}

// Footprint is about what the gauges of one lane keep during a run, bytes.
func (s *Scenario) Footprint() int64 {
	ticks := s.Loop.Num("rate") * s.Loop.Num("duration") * s.Loop.Num("slowdown")
	window := targetWindow // that of a structure is not known before it is built
	if s.Loop.Has("energy_window") {
		window = s.Loop.Num("energy_window")
	}
	b := builder{s: s}
	return int64(b.laneBytes(ticks, window))
}
