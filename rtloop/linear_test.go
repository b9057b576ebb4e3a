package rtloop

import (
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// everyStandard is the standard loop with every integrator, every compensator and
// every actuator in turn.
func everyStandard() map[string]standard {
	all := map[string]standard{}
	for _, name := range substructure.Names() {
		all[name] = standard{method: "polynomial", integrator: name}
	}
	for _, name := range compensator.Kinds.Names() {
		all[name] = standard{method: name}
	}
	for _, name := range plant.Actuators.Names() {
		all[name] = standard{method: "polynomial", actuator: name}
	}
	for _, name := range plant.Elements.Names() {
		all[name] = standard{method: "polynomial", element: name}
	}
	return all
}

// A linear loop whose state is set to that of another goes on as that one does, to
// the last bit; with the servo-hydraulic actuator, to the tolerance of its balance.
func TestStateContinues(t *testing.T) {
	for name, s := range everyStandard() {
		build := func() *Loop {
			l, err := s.loop(t, 4096).Linear()
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			return l
		}
		a, b := build(), build()
		shake := shaking(900, standardTick)
		for k := range 500 {
			a.Tick(Drive{X: shake[k]})
		}
		for range 7 { // rings need not stand alike
			b.Tick(Drive{X: 1})
		}
		b.SetState(a.State(nil))
		if !slices.Equal(a.State(nil), b.State(nil)) {
			t.Fatalf("%s: the state that was set reads otherwise", name)
		}
		tolerance := 0.0
		if name == "servo-hydraulic" {
			tolerance = 1e-9
		}
		// The load at the tick is excitation too.
		a.drive, b.drive = 0, 0
		for k := 500; k < 900; k++ {
			a.Tick(Drive{X: shake[k]})
			b.Tick(Drive{X: shake[k]})
			p, q := a.Row(0), b.Row(0)
			if d := math.Abs(p.Measured - q.Measured); d > tolerance*math.Abs(p.Measured) || tolerance == 0 && p != q {
				t.Fatalf("%s: tick %d: %+v and %+v", name, k, p, q)
			}
		}
	}
}

// A small motion of a loop is that of its linear loop: of a Bouc-Wen element 1e-9 of
// its yield displacement leaves 1e-9.
func TestLinearLoopIsTheLoopInSmallMotions(t *testing.T) {
	for name, s := range everyStandard() {
		if s.element == "viscous" || name == "adaptive-time-series" {
			continue // its example is linear; it does not learn from so little
		}
		loop := s.loop(t, 4096)
		linear, err := s.loop(t, 4096).Linear()
		if err != nil {
			t.Fatal(err)
		}
		const size = 1e-9
		loop.Start(Drive{})
		largest, worst := 0.0, 0.0
		for _, ug := range shaking(2000, standardTick) {
			loop.Tick(Drive{X: size * ug})
			linear.Tick(Drive{X: size * ug})
			p, q := loop.Row(0), linear.Row(0)
			largest, worst = max(largest, math.Abs(q.Target)), max(worst, math.Abs(p.Target-q.Target))
		}
		tolerance := 1e-6
		if name == "servo-hydraulic" {
			tolerance = 1e-3 // of motions so small its balance keeps three digits
		}
		if !(worst <= tolerance*largest) || largest == 0 {
			t.Errorf("%s: differs by %g of the largest displacement", name, worst/largest)
		}
	}
}

func TestLinearErrors(t *testing.T) {
	if _, err := (standard{method: "none"}).driven(t).Linear(); !errors.Is(err, ErrNoLoop) {
		t.Errorf("a driven target: %v", err)
	}
	l := standardLoop(t, "none", 100)
	l.channels[0].Specimen = plant.NewSpecimen(
		newElement(t, "spring", kind.Values{"stiffness": kind.Num(1e6)}),
		newElement(t, "viscous", kind.Values{"force": kind.Num(1e5), "speed": kind.Num(0.1), "exponent": kind.Num(0.5)}))
	var channel *ChannelError
	var element *plant.ElementError
	if _, err := l.Linear(); !errors.As(err, &channel) || !errors.As(err, &element) || channel.Name != "damper" || element.Index != 1 ||
		!strings.Contains(err.Error(), "no tangent") {
		t.Errorf("a damper of exponent ½: %v", err)
	}
}

// driven is a loop whose target is driven.
func (s standard) driven(t *testing.T) *Loop {
	t.Helper()
	cfg := s.loop(t, 100).cfg
	cfg.Structure, cfg.Channels = nil, []Channel{perfectChannel(t, standardTick)}
	l, err := NewLoop(cfg)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// What was learned goes over to another loop, and learns no more there.
func TestTakeLearned(t *testing.T) {
	a, b := standardLoop(t, "adaptive-time-series", 1<<14), standardLoop(t, "adaptive-time-series", 1<<14)
	a.Start(Drive{})
	for _, ug := range shaking(8000, standardTick) {
		a.Tick(Drive{X: 3 * ug})
	}
	b.TakeLearned(a)
	was, is := a.Coefficients(0, nil), b.Coefficients(0, nil)
	start := standardLoop(t, "adaptive-time-series", 100).Coefficients(0, nil)
	if !slices.Equal(was, is) || slices.Equal(was, start) {
		t.Errorf("learned %v, taken over %v, at the start %v", was, is, start)
	}
	c := standardLoop(t, "polynomial", 100)
	before := c.Part(0).Compensator
	if c.TakeLearned(a); c.Part(0).Compensator != before {
		t.Error("another kind was replaced")
	}
}
