package substructure

import (
	"math"
	"testing"
)

// Explicit Newmark conserves ½vᵀM v + ½xᵀK x − dt²/8·aᵀM a of a free undamped
// structure exactly: with w = v − dt/2·a the velocity half a step before, it is
// ½wᵀM w + ½xᵀK x₋, and a = (w₊ − w)/dt makes that the same at the next step.
func TestNewmarkExplicitConserves(t *testing.T) {
	s := mustStoreys(t, []Storey{
		{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6},
	}, Damping{})
	const dt = 0.02
	in := mustNew(t, "newmark-explicit", s, dt)
	p := make([]float64, 3)
	in.Start([]float64{0.01, -0.02, 0.03}, p)
	energy := func() float64 { return s.VMV(in.V())/2 + in.Strain() - dt*dt/8*s.AMA(in.A()) }
	first := energy()
	for k := range 10000 {
		in.Predict()
		in.Correct(p)
		if e := energy(); math.Abs(e-first) > 1e-11*first { // rounding of 10000 steps
			t.Fatalf("step %d: %.15g J, at first %.15g J", k+1, e, first)
		}
	}
}

// CR conserves exactly what a linear structure holds between two ticks: with
// x̄ = (x_k + x_{k+1})/2 and v̄_k the centred velocity,
//
//	½v_{k+1}ᵀM v_{k+1} + ½x̄ᵀK x̄ = the same one step before + dt·v̄_kᵀ(p_k − C v̄_k)
//
// which follows from its recurrence M(x₊−2x+x₋)/dt² + C(x₊−x₋)/2dt + K(x₊+2x+x₋)/4 = p
// times (x₊ − x₋)/2. It fails unless Centred is what damping acts on.
func TestCRConservesBetweenTicks(t *testing.T) {
	for _, n := range []int{1, 3} {
		storeys := make([]Storey, n)
		for i := range storeys {
			storeys[i] = Storey{Mass: 60e3, Stiffness: 18e6}
		}
		s := mustStoreys(t, storeys, Damping{Ratios: []float64{0.03}})
		const dt = 0.02
		in := mustNew(t, "CR", s, dt)
		l := newLoaded(s, in, 0)
		l.start(1)
		before, mean := make([]float64, n), make([]float64, n)
		flow, held, largest := 0.0, 0.0, 0.0
		for k := range 2000 {
			flow -= dt * s.VCV(in.Centred())
			for i, v := range in.Centred() {
				flow += dt * l.p[i] * v
			}
			copy(before, in.X())
			l.step(math.Cos(0.11 * float64(k+1)))
			for i, x := range in.X() {
				mean[i] = (before[i] + x) / 2
			}
			held = s.VMV(in.V())/2 + s.stiffnessBlocks.quadratic(mean)/2
			largest = math.Max(largest, held)
			near(t, "held between ticks", held, flow, 1e-11*largest) // rounding of 2000 steps
			if t.Failed() {
				t.Fatalf("%d levels, step %d", n, k+1)
			}
		}
	}
}

// balance runs the motion and returns the residual of
//
//	input + initial = kinetic + strain + damped + hysteresis + specimen
//
// over the input, work by the trapezoid rule on ticks: positive where energy is
// lost.
func balance(t *testing.T, m method, s *Structure, spring float64, x0 []float64, knots []float64, several int) (residual, hysteresis float64) {
	dt := knot / float64(several)
	ground := interpolated(knots, several)
	l := newLoaded(s, m.build(t, s, dt), spring)
	in := l.in
	l.start(ground[0])
	if x0 != nil {
		in.Start(x0, l.p)
	}
	held := s.VMV(in.Centred())/2 + in.Strain()
	scale := held
	input, damped, external := 0.0, 0.0, make([]float64, s.N())
	power := func(ug float64) (in1, out float64) {
		s.GroundLoad(external, ug)
		for i, v := range in.Centred() {
			in1 += external[i] * v
		}
		return in1, s.VCV(in.Centred())
	}
	lastIn, lastOut := power(ground[0])
	for _, ug := range ground[1:] {
		l.step(ug)
		nowIn, nowOut := power(ug)
		input += dt / 2 * (lastIn + nowIn)
		damped += dt / 2 * (lastOut + nowOut)
		lastIn, lastOut = nowIn, nowOut
		scale = math.Max(scale, math.Abs(input))
	}
	specimen := 0.0
	if spring != 0 {
		specimen = spring / 2 * math.Pow(s.Project(in.X(), 0), 2)
	}
	out := s.VMV(in.Centred())/2 + in.Strain() + damped + in.Hysteresis() + specimen
	return (input + held - out) / scale, in.Hysteresis() / scale
}

// Without numerical damping the balance closes with the square of the step:
// for a linear building in an earthquake, and for a building that yields, shaken and let go from
// beyond yield.
func TestEnergyBalanceCloses(t *testing.T) {
	linear, spring := threeStoreys(t)
	yielding := twoYielding(t)
	rest := make([]float64, 129)
	shaken := columns(t, "testdata/yielding.csv")["ground_m_s2"]
	for _, c := range []struct {
		what   string
		s      *Structure
		spring float64
		x0     []float64
		knots  []float64
	}{
		{"linear, shaken", linear, spring, nil, columns(t, "testdata/three_storeys.csv")["ground_m_s2"]},
		{"yielding, shaken", yielding, 0, nil, shaken},
		{"yielding, let go", yielding, 0, []float64{0.02, 0.022}, rest},
	} {
		for _, name := range undissipative {
			coarse, _ := balance(t, name, c.s, c.spring, c.x0, c.knots, 8)
			fine, hysteresis := balance(t, name, c.s, c.spring, c.x0, c.knots, 32)
			t.Logf("%s, %s: residual %.3g, at a quarter of the step %.3g; hysteresis %.3g", c.what, name, coarse, fine, hysteresis)
			// The residual is the trapezoid rule's; 1e-5 of the energy at
			// 1/2048 s is some (ω·dt)²/12 of the third mode.
			if math.Abs(fine) > 1e-5 || math.Abs(coarse/fine-16) > 0.5 {
				t.Errorf("%s, %s: residual %.3g of the energy put in, at a quarter of the step %.3g; want a sixteenth and below 1e-5",
					c.what, name, coarse, fine)
			}
			if c.s == yielding && hysteresis < 0.2 {
				t.Errorf("%s, %s: hysteresis is %.3g of the energy; the storey should have yielded", c.what, name, hysteresis)
			}
		}
	}
}

// What the yielding storey dissipated, against the same SciPy solution that
// the displacements are compared with.
func TestHysteresisAgainstSciPy(t *testing.T) {
	c := columns(t, "testdata/yielding.csv")
	want := c["dissipated_J"]
	for _, name := range Names() {
		last := 0.0
		for _, several := range []int{16, 64} {
			s := twoYielding(t)
			l := newLoaded(s, mustNew(t, name, s, knot/float64(several)), 0)
			worst := 0.0
			for k, ug := range interpolated(c["ground_m_s2"], several) {
				if k == 0 {
					l.start(ug)
				} else {
					l.step(ug)
				}
				if k%several == 0 {
					worst = math.Max(worst, math.Abs(l.in.Hysteresis()-want[k/several])/peak(want))
				}
			}
			t.Logf("%s, %d steps to a knot: dissipated energy off by %.3g of the whole", name, several, worst)
			// Second order: a quarter of the step, a sixteenth of the error,
			// blurred by kinks within steps.
			if last != 0 && last/worst < 10 {
				t.Errorf("%s: error %.3g after %.3g at four times the step", name, worst, last)
			}
			last = worst
		}
		if last > 1e-5 {
			t.Errorf("%s: dissipated energy off by %.3g of the whole", name, last)
		}
	}
}
