package rtloop

import (
	"math"
	"testing"

	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// With a perfect actuator the hybrid loop is the all-numerical solution: here
// the same structure with the specimens' springs assembled into it, integrated
// without any channel. The two sum the same forces in another order, so they
// agree to rounding, which grows with the number of ticks.
func TestPerfectActuatorIsAllNumerical(t *testing.T) {
	const tick, ticks = 1.0 / 1024, 20 * 1024
	storeys := func(extra ...float64) []substructure.Storey {
		s := []substructure.Storey{{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6}}
		for i, k := range extra {
			s[i].Stiffness += k
		}
		return s
	}
	const k1, k2 = 6e6, 4e6
	motion := shaking(ticks+1, tick)
	for _, name := range substructure.Integrators.Names() {
		t.Run(name, func(t *testing.T) {
			hybrid := mustStoreys(t, storeys(), []substructure.Attachment{{From: 0, To: 1, Stiffness: k1}, {From: 2, To: 1, Stiffness: k2}})
			spring := func(k float64) plant.Element { return newElement(t, "spring", kind.Values{"stiffness": kind.Num(k)}) }
			a := mustLoop(t, Config{Tick: tick, Slowdown: 1, Structure: hybrid, Integrator: name, Judge: true, Window: 1,
				Channels: []Channel{perfectChannel(t, tick, spring(k1)), perfectChannel(t, tick, spring(k2))}})
			b := mustLoop(t, Config{Tick: tick, Slowdown: 1, Integrator: name, Window: 1,
				Structure: mustStoreys(t, storeys(k1, k2), nil)})
			a.Start(Drive{X: motion[0]})
			b.Start(Drive{X: motion[0]})
			var worst, peak float64
			for _, x := range motion[1:] {
				a.Tick(Drive{X: x})
				b.Tick(Drive{X: x})
				for i, xb := range b.Displacements() {
					worst = max(worst, math.Abs(a.Displacements()[i]-xb))
					peak = max(peak, math.Abs(xb))
				}
			}
			// One rounding a tick, 1e-16 of the peak, adding up without growth
			// in a damped structure; a thousand of them is generous.
			if peak < 1e-3 || worst > 1e-13*peak {
				t.Errorf("worst difference %g of peak %g m", worst, peak)
			}
			for j := range a.channels {
				if e := a.channels[j].tracking.PeakError(); e != 0 {
					t.Errorf("channel %d: a perfect actuator has a tracking error of %g m", j, e)
				}
			}
		})
	}
}

// The same for a specimen with memory: a hysteretic storey in the structure
// against the same element behind a perfect actuator.
func TestPerfectActuatorHysteretic(t *testing.T) {
	const tick, ticks = 1.0 / 1024, 10 * 1024
	const k, yield, hardening = 8e6, 0.01, 0.1
	motion := shaking(ticks+1, tick)
	for _, name := range substructure.Integrators.Names() {
		t.Run(name, func(t *testing.T) {
			numerical := mustStoreys(t, []substructure.Storey{{Mass: 50e3, Stiffness: k, YieldDisplacement: yield, Hardening: hardening}}, nil)
			hybrid := mustStoreys(t, []substructure.Storey{{Mass: 50e3}}, []substructure.Attachment{{From: 0, To: 1, Stiffness: k}})
			a := mustLoop(t, Config{Tick: tick, Slowdown: 1, Structure: hybrid, Integrator: name, Window: 1,
				Channels: []Channel{perfectChannel(t, tick, plant.NewBoucWen(k, yield, hardening, 1, 0.5))}})
			b := mustLoop(t, Config{Tick: tick, Slowdown: 1, Structure: numerical, Integrator: name, Window: 1})
			a.Start(Drive{X: motion[0]})
			b.Start(Drive{X: motion[0]})
			var worst, peak float64
			for _, x := range motion[1:] {
				a.Tick(Drive{X: x})
				b.Tick(Drive{X: x})
				worst = max(worst, math.Abs(a.Displacements()[0]-b.Displacements()[0]))
				peak = max(peak, math.Abs(b.Displacements()[0]))
			}
			if peak < 2*yield || worst > 1e-12*peak {
				t.Errorf("worst difference %g of peak %g m", worst, peak)
			}
		})
	}
}

// Slowing down is a change of physical time only: a test at slowdown λ is the
// test at real speed with every physical time constant divided by λ.
func TestSlowdownScalesPhysicalTime(t *testing.T) {
	const slow = 4.0
	delay := func(d float64) kind.Values { return kind.Values{"order": kind.Num(2), "delay": kind.Num(d)} }
	a := oscillator{rate: 1024, slowdown: slow, damping: 0.02, share: 0.4, delay: 0.02, lag: 0.012, method: "polynomial", settings: delay(0.03)}.loop(t)
	b := oscillator{rate: slow * 1024, damping: 0.02, share: 0.4, delay: 0.02 / slow, lag: 0.012 / slow, method: "polynomial", settings: delay(0.03 / slow)}.loop(t)
	a.Start(Drive{})
	b.Start(Drive{})
	for range 20000 {
		a.Tick(Drive{})
		b.Tick(Drive{})
		if a.Row(0) != b.Row(0) {
			t.Fatalf("at %g s: %+v and %+v", a.Time(), a.Row(0), b.Row(0))
		}
	}
	// A reported delay is physical seconds: λ times that of the fast test.
	if da, db := a.Result().Channels[0].Delay, b.Result().Channels[0].Delay; math.Abs(float64(da-slow*db)) > 1e-12 {
		t.Errorf("delays %g and %g", da, db)
	}
}

// Under slowdown a viscous specimen feels the physical velocity, 1/λ of the
// model's: it gives 1/λ of the force. The reference, at real speed, does not.
func TestSlowdownWeakensViscousSpecimen(t *testing.T) {
	const tick, c, omega = 1.0 / 1024, 1e5, 2 * math.Pi
	for _, slow := range []float64{1, 5} {
		ch := perfectChannel(t, tick, newElement(t, "viscous", kind.Values{"damping": kind.Num(c)}))
		l := mustLoop(t, Config{Tick: tick, Slowdown: slow, Drives: excitation.Target, Channels: []Channel{ch}, Window: 1, Judge: true})
		l.Start(Drive{})
		peak := 0.0
		for k := range int(2 * 1024 * slow) {
			l.Tick(Drive{X: 0.01 * math.Sin(omega*float64(k+1)*tick/slow)})
			peak = max(peak, math.Abs(l.Row(0).Force))
		}
		// The velocity over a tick is that of a chord: smaller by a sinc.
		chord := omega * tick / slow / 2
		want := c * 0.01 * omega / slow * math.Sin(chord) / chord
		if math.Abs(peak-want) > 1e-5*want { // the peak of samples, (ω·dt)²/8 at most
			t.Errorf("slowdown %g: peak force %g N, want %g", slow, peak, want)
		}
	}
}

func mustStoreys(tb testing.TB, s []substructure.Storey, at []substructure.Attachment) *substructure.Structure {
	tb.Helper()
	out, err := substructure.FromStoreys(s, substructure.Damping{Ratios: []float64{0.03}}, at)
	if err != nil {
		tb.Fatal(err)
	}
	return out
}

func mustLoop(tb testing.TB, cfg Config) *Loop {
	tb.Helper()
	l, err := NewLoop(cfg)
	if err != nil {
		tb.Fatal(err)
	}
	return l
}
