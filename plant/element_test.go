package plant

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// every is one element of every kind and branch that balances work by the
// trapezoid rule on ticks. The others, cubic, gap and mass, have theirs.
func every(t *testing.T) map[string]Element {
	e := map[string]Element{
		"spring": element(t, "spring", set{"stiffness": 6e6}),
		"linear": element(t, "viscous", set{"damping": 2e5}),
	}
	for _, alpha := range []float64{0.2, 0.5, 1.7, 2} {
		e[fmt.Sprintf("viscous %v", alpha)] = element(t, "viscous", set{"force": 2e5, "speed": 0.4, "exponent": alpha})
	}
	for _, n := range []float64{1, 2, 3.5} {
		for _, beta := range []float64{0.5, 0.3, 0.9} {
			e[fmt.Sprintf("bouc-wen %v %v", n, beta)] = element(t, "bouc-wen",
				set{"stiffness": 2e7, "yield_displacement": 0.01, "hardening": 0.05, "n": n, "beta": beta})
		}
	}
	for _, alpha := range []float64{0.2, 0.5, 1, 1.4, 2} {
		e[fmt.Sprintf("maxwell %v", alpha)] = element(t, "maxwell", set{"stiffness": 1e8, "force": 2e5, "speed": 0.4, "exponent": alpha})
	}
	for _, h := range []float64{0, 0.05} {
		e[fmt.Sprintf("bilinear %v", h)] = element(t, "bilinear", set{"stiffness": 2e7, "yield_displacement": 0.01, "hardening": h})
	}
	for _, fast := range []float64{0.1, 0.02} {
		e[fmt.Sprintf("friction %v", fast)] = element(t, "friction",
			set{"stiffness": 1e8, "normal_force": 2e6, "slow": 0.05, "fast": fast, "speed": 0.1})
	}
	return e
}

// Stored and dissipated together are the work ∫ f dy by the trapezoid rule.
func TestEnergyIsWork(t *testing.T) {
	for name, e := range every(t) {
		r := rand.New(rand.NewPCG(7, 8))
		for _, at := range []float64{0, 0.02, -0.004} {
			e.Start(at)
			f, y := e.Advance(at, 0, 0), at
			stored0, gone0 := e.Energy()
			if gone0 != 0 {
				t.Errorf("%s: has dissipated %v J at the start", name, gone0)
			}
			work, moved := new(big.Float).SetPrec(200), 0.0
			v := 0.0
			for range 3000 {
				v = 0.98*v + 0.05*r.NormFloat64()
				next := y + v*5e-4
				g := e.Advance(next, v, 5e-4)
				step := 0.5 * (f + g) * (next - y)
				work.Add(work, new(big.Float).SetFloat64(step))
				moved += math.Abs(step)
				f, y = g, next
			}
			want, _ := work.Float64()
			stored, gone := e.Energy()
			// ½ky² telescopes exactly but for the rounding of each step.
			near(t, name, stored-stored0+gone, want, 1e-15*moved+1e-14*(stored+stored0))
			if name != "spring" && !(gone > 0) {
				t.Errorf("%s: dissipated %v J", name, gone)
			}
		}
	}
}

func TestStartIsAtRestAndAStandstillChangesNothing(t *testing.T) {
	const y = -0.023
	for name, e := range every(t) {
		e.Start(0.5) // something to forget
		e.Advance(0.7, 3, 1e-3)
		e.Start(y)
		stored, gone := e.Energy()
		first := e.Advance(y, 0, 0)
		for range 5 {
			if f := e.Advance(y, 0, 5e-4); !same(f, first) {
				t.Errorf("%s: force went from %v to %v", name, first, f)
			}
		}
		if s, g := e.Energy(); s != stored || g != gone || gone != 0 {
			t.Errorf("%s: energies went from %v, %v to %v, %v", name, stored, gone, s, g)
		}
	}
	for _, c := range []struct {
		name                     string
		e                        Element
		force, stored, stiffness float64
	}{
		{"spring", element(t, "spring", set{"stiffness": 6e6}), 6e6 * y, 0.5 * 6e6 * y * y, 6e6},
		{"viscous", element(t, "viscous", set{"damping": 6e6}), 0, 0, 0},
		{"bouc-wen", NewBoucWen(2e7, 0.01, 0.1, 1, 0.5),
			2e7 * (0.1*y + 0.9*0.01*math.Expm1(y/0.01)),
			0.5*2e7*0.1*y*y + 0.5*2e7*0.9*1e-4*math.Pow(math.Expm1(y/0.01), 2), 2e7},
	} {
		s := NewSpecimen(c.e)
		s.Start(y)
		stored, _ := s.Energy()
		near(t, c.name+": force", s.Force(), c.force, 1e-14*math.Abs(c.force))
		near(t, c.name+": stored", stored, c.stored, 1e-14*c.stored)
		near(t, c.name+": stiffness", s.Stiffness(), c.stiffness, 0)
	}
}

// A linear damper driven by a sine: πcωA² a cycle, and in N ticks by the
// trapezoid rule exactly sin θ/θ of it, θ = 2π/N.
func TestLinearDamperEnergyPerCycle(t *testing.T) {
	const c, amplitude, hz = 3e5, 0.04, 1.7
	w := 2 * math.Pi * hz
	for _, count := range []int{16, 100, 4096} {
		e := element(t, "viscous", set{"damping": c})
		e.Start(0)
		theta := 2 * math.Pi / float64(count)
		for k := range count + 1 {
			phase := theta * float64(k)
			e.Advance(amplitude*math.Sin(phase), w*amplitude*math.Cos(phase), theta/w)
		}
		_, got := e.Energy()
		want := math.Pi * c * w * amplitude * amplitude * math.Sin(theta) / theta
		near(t, fmt.Sprintf("%d ticks", count), got, want, 1e-13*want)
	}
}

// A damper f = c·|v|^α driven by a sine dissipates λ·c·ω^α·A^(1+α) a cycle,
// λ = 2^(2+α)·Γ²(1+α/2)/Γ(2+α) (Constantinou & Symans 1993; FEMA 356, 2000,
// whose table of λ is given here from memory).
func TestPowerLawDamperEnergyPerCycle(t *testing.T) {
	const force, speed, amplitude, hz, count = 2e5, 0.5, 0.03, 2.3, 20000
	w := 2 * math.Pi * hz
	for _, row := range []struct{ alpha, table float64 }{
		{0.25, 3.7}, {0.5, 3.5}, {0.75, 3.3}, {1, 3.1}, {1.25, 3.0}, {1.5, 2.9}, {1.75, 2.8}, {2, 2.7},
	} {
		alpha := row.alpha
		e := element(t, "viscous", set{"force": force, "speed": speed, "exponent": alpha})
		e.Start(0)
		e.Advance(0, w*amplitude, 0)
		for k := 1; k <= count; k++ {
			phase := 2 * math.Pi * float64(k) / count
			e.Advance(amplitude*math.Sin(phase), w*amplitude*math.Cos(phase), 1/(hz*count))
		}
		_, got := e.Energy()
		unit := force / math.Pow(speed, alpha) * math.Pow(w, alpha) * math.Pow(amplitude, 1+alpha)
		lambda := math.Pow(2, 2+alpha) * math.Pow(math.Gamma(1+alpha/2), 2) / math.Gamma(2+alpha)
		// The trapezoid rule is of second order: θ² is 1e-7.
		near(t, fmt.Sprintf("λ at α = %v", alpha), got/unit, lambda, math.Pow(2*math.Pi/count, 2))
		near(t, fmt.Sprintf("tabulated λ at α = %v", alpha), got/unit, row.table, 0.05)
	}
}

func TestDamperForce(t *testing.T) {
	for _, alpha := range []float64{0.1, 0.35, 0.5, 1, 1.3, 2} {
		e := element(t, "viscous", set{"force": 2e5, "speed": 0.5, "exponent": alpha})
		e.Start(0)
		for _, c := range []struct{ v, f float64 }{
			{0.5, 2e5}, {-0.5, -2e5}, {0, 0},
			{0.125, 2e5 * math.Pow(0.25, alpha)}, {-2, -2e5 * math.Pow(4, alpha)},
		} {
			// Two powers, each good to an ulp.
			near(t, fmt.Sprintf("α = %v at %v m/s", alpha, c.v), e.Advance(0, c.v, 0), c.f, 1e-15*math.Abs(c.f))
		}
	}
}

// Work of a great many equal cycles is that many times the work of one.
func TestWorkDoesNotDrift(t *testing.T) {
	const count, cycles = 32, 60000
	b := NewBoucWen(2e7, 0.01, 0.1, 1, 0.5)
	cycle(b, 0.03, count, 40) // settles
	stored, _ := b.Energy()
	b.work.start(b.work.f, b.work.y)
	b.atStart = stored
	around := func() {
		for k := 1; k <= count; k++ {
			b.Advance(0.03*math.Sin(2*math.Pi*float64(k)/count), 0, 0)
		}
	}
	around()
	_, one := b.Energy()
	for range cycles - 1 {
		around()
	}
	_, all := b.Energy()
	// A plain sum of the same products is off by some 4e-12.
	near(t, "mean of a cycle", all/cycles, one, 1e-15*one)
}

func TestSpecimenSumsItsElements(t *testing.T) {
	s := NewSpecimen(element(t, "spring", set{"stiffness": 4}), element(t, "viscous", set{"damping": 3}))
	s.Start(0)
	near(t, "force", s.Advance(2, 5, 0.1), 4*2+3*5, 0)
	near(t, "kept force", s.Force(), 23, 0)
	near(t, "stiffness", s.Stiffness(), 4, 0)
	stored, gone := s.Energy()
	near(t, "stored", stored, 8, 0)
	near(t, "dissipated", gone, 15, 0) // ½(0 + 15)·2
	if f := NewSpecimen().Advance(1, 1, 1); f != 0 {
		t.Errorf("nothing resists with %v N", f)
	}
}
