package rtloop

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// noisyLane is a lane of the standard case with sensor noise.
func noisyLane(t *testing.T, method string) *Lane {
	t.Helper()
	l := standardLoop(t, method, 1<<14)
	given, err := plant.SensorSettings.Resolve(kind.Values{"displacement_noise": kind.Num(1e-5), "force_noise": kind.Num(50)})
	if err != nil {
		t.Fatal(err)
	}
	for j, prefix := range []string{"displacement", "force"} {
		s, err := plant.NewSensor(standardTick, given, prefix, uint64(j+1))
		if err != nil {
			t.Fatal(err)
		}
		if j == 0 {
			l.channels[0].Displacement = s
		} else {
			l.channels[0].Force = s
		}
	}
	return &Lane{Name: method, Loop: l}
}

// rowsOf runs the lanes and returns what the first did, tick by tick.
func rowsOf(t *testing.T, methods ...string) []Row {
	t.Helper()
	const ticks = 5000
	rig := &Rig{Motion: &fixedMotion{samples: shaking(ticks+1, standardTick)}, Ticks: ticks, Step: standardTick}
	for _, m := range methods {
		rig.Lanes = append(rig.Lanes, noisyLane(t, m))
	}
	var rows []Row
	rig.Lanes[0].Observe = func(l *Loop) error {
		rows = append(rows, l.Row(0))
		return nil
	}
	runRig(t, rig)
	if len(rows) != ticks+1 {
		t.Fatalf("%d rows", len(rows))
	}
	return rows
}

func TestRunRepeatsBitForBit(t *testing.T) {
	first := rowsOf(t, "adaptive-time-series")
	again := rowsOf(t, "adaptive-time-series")
	beside := rowsOf(t, "adaptive-time-series", "none", "polynomial", "adaptive-inverse")
	for k := range first {
		if first[k] != again[k] {
			t.Fatalf("row %d: run again, %+v became %+v", k, first[k], again[k])
		}
		if first[k] != beside[k] {
			t.Fatalf("row %d: beside other lanes, %+v became %+v", k, first[k], beside[k])
		}
	}
}

// The response error of a lane with a perfect actuator is zero; with a late
// one it is what a direct comparison of the two histories says.
func TestResponseError(t *testing.T) {
	const tick, ticks, k = 1.0 / 1024, 8000, 5e6
	motion := shaking(ticks+1, tick)
	loop := func(delay float64, judge bool) *Loop {
		c := perfectChannel(t, tick, newElement(t, "spring", kind.Values{"stiffness": kind.Num(k)}))
		c.Actuator = newActuator(t, plant.Timing{Tick: tick}, kind.Values{"delay": kind.Num(delay)})
		return mustLoop(t, Config{Tick: tick, Slowdown: 1, Integrator: "CR", Window: 1, Judge: judge, Channels: []Channel{c}, Ticks: ticks,
			Structure: mustStoreys(t, []substructure.Storey{{Mass: 50e3, Stiffness: 9e6}, {Mass: 40e3, Stiffness: 8e6}},
				[]substructure.Attachment{{From: 0, To: 1, Stiffness: k}})})
	}
	rig := &Rig{Motion: &fixedMotion{samples: motion}, Ticks: ticks, Step: tick, Reference: loop(0, false),
		Lanes: []*Lane{{Name: "perfect", Loop: loop(0, true)}, {Name: "late", Loop: loop(0.004, true)}}}
	runRig(t, rig)
	if e := rig.Lanes[0].ResponseError(); e != 0 {
		t.Errorf("a perfect actuator has a response error of %g", e)
	}
	ref, late := loop(0, false), loop(0.004, false)
	ref.Start(Drive{X: motion[0]})
	late.Start(Drive{X: motion[0]})
	var e, s float64
	for _, x := range motion[1:] {
		ref.Tick(Drive{X: x})
		late.Tick(Drive{X: x})
		for i, xr := range ref.Displacements() {
			d := late.Displacements()[i] - xr
			e += d * d
			s += xr * xr
		}
	}
	want := math.Sqrt(e / s)
	if got := rig.Lanes[1].ResponseError(); want < 0.01 || math.Abs(got-want) > 1e-12 {
		t.Errorf("response error %.15g, want %.15g", got, want)
	}
}

// A motion that dies out as e^(−ζωt) has, over a trailing window W, the amplitude
// √(2σ_xx) = A₀·e^(−ζωt)·√((e^(2ζωW) − 1)/(2ζωW)); the window counts as at rest
// once that is 0.5 % of A₀.
func TestAtRest(t *testing.T) {
	const zeta = 0.02
	l := oscillator{rate: 1024, damping: zeta}.loop(t)
	l.Start(Drive{})
	rate := 2 * zeta * oscillatorOmega
	window := l.Window()
	want := math.Log(math.Sqrt(math.Expm1(rate*window)/(rate*window))/0.005) / (rate / 2)
	for !l.AtRest(0) || l.Time() < window {
		if !l.Tick(Drive{}) {
			t.Fatal("it never comes to rest")
		}
	}
	// Where in its swing the window ends changes σ_xx by up to 1/(4π·5) of
	// itself, and with it the instant by 0.016/(2ζω), below a tenth of a second.
	if got := l.Time(); math.Abs(got-want) > 0.1 {
		t.Errorf("at rest from %.3f s, want %.3f s", got, want)
	}
}

func TestTrips(t *testing.T) {
	for _, c := range []struct {
		limit  string
		limits Limits
	}{
		{"stroke", Limits{0.005, math.Inf(1), math.Inf(1), math.Inf(1)}},
		{"velocity", Limits{math.Inf(1), 0.05, math.Inf(1), math.Inf(1)}},
		{"command velocity", Limits{math.Inf(1), 0.05, math.Inf(1), math.Inf(1)}},
		{"force", Limits{math.Inf(1), math.Inf(1), 5000, math.Inf(1)}},
		{"error", Limits{math.Inf(1), math.Inf(1), math.Inf(1), 0.0005}},
	} {
		t.Run(c.limit, func(t *testing.T) {
			const ticks = 8000
			lane := &Lane{Name: "x", Loop: standardLoop(t, "none", ticks)}
			lane.Loop.channels[0].Limits = c.limits
			if c.limit == "velocity" { // an actuator that runs ahead of its command
				lane.Loop.channels[0].Actuator = newActuator(t, plant.Timing{Tick: standardTick}, kind.Values{"gain": kind.Num(1.5)})
			}
			rows := 0
			lane.Observe = func(*Loop) error { rows++; return nil }
			rig := &Rig{Motion: &fixedMotion{samples: shaking(ticks+1, standardTick)}, Ticks: ticks, Step: standardTick, Lanes: []*Lane{lane}}
			runRig(t, rig)
			l := lane.Loop
			if l.Outcome() != Tripped || l.trip.Limit != c.limit || l.trip.Channel != "damper" {
				t.Fatalf("outcome %v, trip %+v", l.Outcome(), l.trip)
			}
			if !(l.trip.Value > l.trip.Allowed) || l.trip.Time != l.Time() {
				t.Errorf("trip %+v at %g s", l.trip, l.Time())
			}
			// The row of the trip is there, and none after it.
			if int64(rows) != l.Ticks()+1 || l.Ticks() >= ticks {
				t.Errorf("%d rows, %d ticks", rows, l.Ticks())
			}
		})
	}
}

// nan is a compensator that goes wrong after some ticks.
type nan struct {
	compensator.Compensator
	after int
}

func (n *nan) Command(in compensator.Input) float64 {
	if n.after--; n.after < 0 {
		return math.NaN()
	}
	return in.X
}

func TestDivergence(t *testing.T) {
	const ticks = 20000
	run := func(l *Loop) LaneResult {
		lane := &Lane{Name: "x", Loop: l}
		runRig(t, &Rig{Motion: &fixedMotion{samples: shaking(ticks+1, standardTick)}, Ticks: ticks, Step: standardTick, Lanes: []*Lane{lane}})
		return l.Result()
	}
	t.Run("no number", func(t *testing.T) {
		l := standardLoop(t, "none", ticks)
		l.channels[0].Compensator = &nan{l.channels[0].Compensator, 101} // the first is asked for at the start
		r := run(l)
		if r.Outcome != Diverged || r.Trip == nil || l.Ticks() != 101 {
			t.Fatalf("%v after %d ticks: %+v", r.Outcome, l.Ticks(), r.Trip)
		}
		if !r.Channels[0].NRMSE.Defined() || !r.Channels[0].PeakCommand.Defined() {
			t.Errorf("what was found before is lost: %+v", r.Channels[0])
		}
	})
	t.Run("a level that no channel touches", func(t *testing.T) {
		// Two storeys at a step far beyond the stable one of explicit Newmark;
		// the channel pushes the lower, stiff one between two ticks only.
		s := mustStoreys(t, []substructure.Storey{{Mass: 1e3, Stiffness: 1e9}, {Mass: 1, Stiffness: 1e9}}, []substructure.Attachment{{From: 0, To: 1, Stiffness: 0}})
		l := mustLoop(t, Config{Tick: 0.01, Slowdown: 1, Structure: s, Integrator: "newmark-explicit", Window: 1, Judge: true,
			Channels: []Channel{perfectChannel(t, 0.01)}})
		r := run(l)
		if r.Outcome != Diverged || r.Trip.Channel != "" || !strings.HasPrefix(r.Trip.Limit, "displacement of level") {
			t.Fatalf("%v: %+v", r.Outcome, r.Trip)
		}
	})
	t.Run("unstable", func(t *testing.T) {
		r := run(oscillator{rate: 1024, share: 1, delay: 0.08}.loop(t))
		if r.Outcome != Diverged || !(math.Abs(float64(r.Trip.Value)) >= divergence) {
			t.Fatalf("%v: %+v", r.Outcome, r.Trip)
		}
	})
}

func TestInterruptAndObserveError(t *testing.T) {
	const ticks = 100000
	rig := func() *Rig {
		return &Rig{Motion: &fixedMotion{samples: shaking(ticks, standardTick)}, Ticks: ticks, Step: standardTick,
			Lanes: []*Lane{{Name: "x", Loop: standardLoop(t, "none", ticks)}, {Name: "y", Loop: standardLoop(t, "inverse", ticks)}}}
	}
	ctx, cancel := context.WithCancel(context.Background())
	r := rig()
	if err := r.Run(ctx, func(int64) { cancel() }); err != nil {
		t.Fatal(err)
	}
	if o := r.Lanes[0].Loop.Outcome(); o != Interrupted || r.Lanes[0].Loop.Ticks() == 0 {
		t.Errorf("outcome %v after %d ticks", o, r.Lanes[0].Loop.Ticks())
	}
	if err := r.Run(context.Background(), nil); err == nil {
		t.Error("a rig ran twice")
	}
	full := errors.New("no space left")
	r = rig()
	r.Lanes[1].Observe = func(l *Loop) error {
		if l.Ticks() > 50 {
			return full
		}
		return nil
	}
	err := r.Run(context.Background(), nil)
	if !errors.Is(err, full) || !strings.Contains(err.Error(), "lane y") {
		t.Errorf("got %v", err)
	}
	if o := r.Lanes[0].Loop.Outcome(); o != Interrupted && o != Completed {
		t.Errorf("the other lane is left %v", o)
	}
}

func TestTickAllocatesNothing(t *testing.T) {
	var cases []standard
	for _, name := range compensator.Kinds.Names() {
		cases = append(cases, standard{method: name})
	}
	for _, name := range plant.Actuators.Names() {
		cases = append(cases, standard{actuator: name})
	}
	for _, name := range plant.Elements.Names() {
		cases = append(cases, standard{element: name}, standard{element: name, actuator: "servo-hydraulic"})
	}
	for _, name := range substructure.Names() {
		cases = append(cases, standard{integrator: name})
	}
	motion := standardMotion()
	for _, c := range cases {
		l := c.loop(t, 1<<14)
		l.Start(motion[0])
		i := 0
		if n := testing.AllocsPerRun(2000, func() {
			i++
			l.Tick(motion[i&(len(motion)-1)])
		}); n != 0 {
			t.Errorf("%+v: %g allocations a tick", c, n)
		}
		if l.Outcome() != Running {
			t.Errorf("%+v: the loop %v: %+v", c, l.Outcome(), l.trip)
		}
	}
}

// The derivatives of a driven target are those of the signal to second order
// of the step.
func TestTargetDerivatives(t *testing.T) {
	const step, omega = 1.0 / 1000, 2 * math.Pi * 3
	samples := make([]float64, 5000)
	for i := range samples {
		samples[i] = math.Sin(omega * float64(i) * step)
	}
	d := driver{source: &fixedMotion{samples: samples}, step: step}
	d.first(true)
	drives := make([]Drive, 1000)
	d.fill(drives)
	d.fill(drives[:500])
	for i, got := range drives[:500] {
		at := omega * float64(1001+i) * step
		bound := (omega * step) * (omega * step) / 6
		if got.X != samples[1001+i] || math.Abs(got.V-omega*math.Cos(at)) > omega*bound ||
			math.Abs(got.A+omega*omega*math.Sin(at)) > omega*omega*bound {
			t.Fatalf("sample %d: %+v", i, got)
		}
	}
}

func TestForceDrivesItsLevel(t *testing.T) {
	const tick, ticks = 1.0 / 1024, 30 * 1024
	s, err := substructure.FromStoreys(
		[]substructure.Storey{{Mass: 10e3, Stiffness: 4e6}, {Mass: 10e3, Stiffness: 2e6}},
		substructure.Damping{Ratios: []float64{0.1}}, []substructure.Attachment{{From: 1, To: 2, Stiffness: 1e6}})
	if err != nil {
		t.Fatal(err)
	}
	ch := perfectChannel(t, tick, newElement(t, "spring", kind.Values{"stiffness": kind.Num(1e6)}))
	l := mustLoop(t, Config{Tick: tick, Slowdown: 1, Drives: excitation.Force, Level: 2, Structure: s, Integrator: "CR",
		Channels: []Channel{ch}, Window: 1, Judge: true})
	l.Start(Drive{})
	for range ticks {
		l.Tick(Drive{X: 6000})
	}
	// A constant force in the end stands on the springs in series: 6000/4e6 m
	// below, 6000/(2e6+1e6) m in the upper storey. What still swings has
	// decayed by e^(−ζω·30 s) < 1e-15.
	x := l.Displacements()
	if math.Abs(x[0]-1.5e-3) > 1e-12 || math.Abs(x[1]-3.5e-3) > 1e-12 || math.Abs(l.Row(0).Target-2e-3) > 1e-12 {
		t.Errorf("displacements %v, target %g", x, l.Row(0).Target)
	}
}
