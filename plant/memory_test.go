package plant

import (
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// remembered reads what a part carries.
func remembered(memory func(func(*float64))) (values []float64) {
	memory(func(v *float64) { values = append(values, *v) })
	return values
}

// recall writes it.
func recall(memory func(func(*float64)), values []float64) {
	memory(func(v *float64) { *v, values = values[0], values[1:] })
}

// everyElement is every kind, cubic, gap and mass among them.
func everyElement(t *testing.T) map[string]Element {
	all := every(t)
	all["cubic"] = element(t, "cubic", set{"stiffness": 6e6, "cubic": 2e9})
	all["gap"] = element(t, "gap", set{"stiffness": 6e6, "gap": 0.01})
	all["closed gap"] = element(t, "gap", set{"stiffness": 6e6, "gap": 0})
	all["mass"] = element(t, "mass", set{"mass": 500})
	for _, e := range Elements.Entries {
		named := false
		for name := range all {
			named = named || strings.Contains(name, e.Name)
		}
		if !named && e.Name != "viscous" {
			t.Errorf("%s is not among the elements tested", e.Name)
		}
	}
	return all
}

// An element whose memory is set to that of another goes on as that one does, to the
// last bit.
func TestMemoryOfElements(t *testing.T) {
	twins := everyElement(t)
	for name, e := range everyElement(t) {
		path := roughly(400)
		e.Start(path[0])
		twin := twins[name]
		twin.Start(0)
		const h = 1.0 / 1024
		go1 := func(e Element, k int) float64 { return e.Advance(path[k], (path[k]-path[k-1])/h, h) }
		for k := 1; k < 200; k++ {
			go1(e, k)
		}
		recall(twin.Memory, remembered(e.Memory))
		for k := 200; k < len(path); k++ {
			if a, b := go1(e, k), go1(twin, k); !same(a, b) {
				t.Fatalf("%s: force %v N in tick %d, of the one that was set %v N", name, a, k, b)
			}
		}
	}
}

// The same of actuators, whatever their delay, with a specimen behind them. The
// servo-hydraulic one balances forces to a tolerance from where it was, so its digits
// differ by that.
func TestMemoryOfActuators(t *testing.T) {
	const h = 1.0 / 1024
	for _, entry := range Actuators.Entries {
		for _, delay := range []float64{0, 0.3 * h, h, 7 * h, 7.6 * h} {
			for name, hold := range holds {
				given := set{"delay": delay}
				if entry.Name == "lag-delay" && delay != 7*h {
					given["lag"] = 6e-3
				}
				build := func() (Actuator, *Specimen) {
					return actuator(t, entry.Name, Timing{h, hold}, given), NewSpecimen(
						element(t, "maxwell", set{"stiffness": 1e7, "damping": 1e5}), element(t, "bouc-wen", set{"stiffness": 2e6, "yield_displacement": 0.01}))
				}
				a, s := build()
				b, r := build()
				a.Start(0.01, s)
				b.Start(-0.02, r)
				u := func(k int) float64 { return 0.01 + 0.02*math.Sin(0.05*float64(k)) }
				for k := range 150 {
					a.Advance(u(k), s)
				}
				for range 3 { // rings need not stand alike
					b.Advance(0.01, r)
				}
				recall(b.Memory, remembered(a.Memory))
				recall(r.Memory, remembered(s.Memory))
				for k := 150; k < 300; k++ {
					y, v := a.Advance(u(k), s)
					z, w := b.Advance(u(k), r)
					exact := same(y, z) && same(v, w) && same(s.Force(), r.Force())
					if entry.Name == "servo-hydraulic" {
						exact = math.Abs(y-z) < 1e-9 && math.Abs(s.Force()-r.Force()) < 1e-2
					}
					if !exact {
						t.Fatalf("%s, delay %g ticks, %s, tick %d: %v m, %v m/s and %v m, %v m/s", entry.Name, delay/h, name, k, y, v, z, w)
					}
				}
			}
		}
	}
}

// The smallest motions of an element are those of its tangent.
func TestTangents(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for name, e := range everyElement(t) {
		tangent, err := e.Tangent()
		if name == "viscous 0.2" || name == "viscous 0.5" {
			if err == nil || !strings.Contains(err.Error(), "no tangent") {
				t.Errorf("%s: %v", name, err)
			}
			continue
		}
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if tangent.Stiffness() != e.Stiffness() {
			t.Errorf("%s: announced with %v N/m, its tangent with %v N/m", name, e.Stiffness(), tangent.Stiffness())
		}
		// Of exponents near 1 what is left over is the size of the motion to a small
		// power: 1e-250 to the power of 0.4 is nothing.
		const h, size = 1.0 / 1024, 1e-250
		e.Start(0)
		tangent.Start(0)
		y, largest, worst := 0.0, 0.0, 0.0
		for range 500 {
			dy := size * rng.NormFloat64()
			y += dy
			f, g := e.Advance(y, dy/h, h), tangent.Advance(y, dy/h, h)
			largest, worst = max(largest, math.Abs(g)), max(worst, math.Abs(f-g))
		}
		scale := max(largest, size*(e.Stiffness()+1e5))
		if worst > 1e-11*scale {
			t.Errorf("%s: forces differ by %g of the largest", name, worst/scale)
		}
	}
}

func TestNoTangent(t *testing.T) {
	oneSided := &gap{k: 1e6, plus: true}
	if _, err := oneSided.Tangent(); err == nil || !strings.HasPrefix(err.Error(), "gap: ") {
		t.Errorf("contact on one side: %v", err)
	}
	slippery := element(t, "friction", set{"stiffness": 1e6, "normal_force": 1e5, "slow": 0, "fast": 0.1, "speed": 0.1})
	if _, err := slippery.Tangent(); err == nil || !strings.HasPrefix(err.Error(), "friction: ") {
		t.Errorf("no friction at rest: %v", err)
	}
	s := NewSpecimen(&spring{k: 1}, slippery)
	_, err := s.Tangent()
	var of *ElementError
	if !errors.As(err, &of) || of.Index != 1 {
		t.Errorf("the element is not named: %v", err)
	}
}

// What an actuator makes of small motions is proportional to them. Of the
// servo-hydraulic one that is so for its finest motions only: its valve is a root.
func TestRefinedActuatorIsLinearNearRest(t *testing.T) {
	const h = 1.0 / 1024
	answer := func(size float64, refine bool) []float64 {
		a := actuator(t, "servo-hydraulic", Timing{Tick: h}, set{"delay": 1.3 * h})
		if refine {
			a.(Refiner).Refine()
		}
		s := NewSpecimen(element(t, "spring", set{"stiffness": 2e7}))
		a.Start(0, s)
		var out []float64
		for k := range 60 {
			y, _ := a.Advance(size*math.Sin(0.1*float64(k)), s)
			out = append(out, y/size)
		}
		return out
	}
	fine, finer := answer(0x1p-300, true), answer(0x1p-310, true)
	largest := slices.Max(fine)
	if largest < 0.3 {
		t.Fatalf("it moves by %g of the command only", largest)
	}
	for k := range fine {
		if math.Abs(fine[k]-finer[k]) > 1e-11*largest {
			t.Fatalf("tick %d: %v and %v of the command", k, fine[k], finer[k])
		}
	}
	// In motions of a micrometre it is the same actuator: slower than 1 mm/s, where the
	// friction is viscous, and open by 1e-6 m·175/m, to which the root is linear.
	for k, y := range answer(1e-6, false) {
		if math.Abs(y-fine[k]) > 1e-3*largest {
			t.Fatalf("tick %d: %v of the command, refined %v", k, y, fine[k])
		}
	}
}

func TestLinearSensor(t *testing.T) {
	v, err := SensorSettings.Resolve(num(set{"force_gain": 0.9, "force_bias": 50, "force_noise": 20, "force_resolution": 3, "force_range": 1e4, "force_cutoff": 40}))
	if err != nil {
		t.Fatal(err)
	}
	s, err := NewSensor(1.0/1024, v, "force", 1)
	if err != nil {
		t.Fatal(err)
	}
	l := s.Linear()
	l.Start(0)
	if n := len(remembered(l.Memory)); n != 2 {
		t.Errorf("a low-pass carries two values, this %d", n)
	}
	last := 0.0
	for range 1000 {
		last = l.Read(1e6)
	}
	if math.Abs(last-0.9e6) > 1e-6 {
		t.Errorf("settles at %v", last)
	}
	if p := NewPerfectSensor().Linear(); p.Read(1.25) != 1.25 || len(remembered(p.Memory)) != 0 {
		t.Error("a perfect sensor stays one")
	}
}
