package stability

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// linearized is the loop of an embedded scenario, ready for both ways.
func linearized(tb testing.TB, name string) *rtloop.Loop {
	tb.Helper()
	s, err := scenarios.Load(name)
	if err != nil {
		tb.Fatal(err)
	}
	loop, err := s.BuildLoop(scenarios.Configured)
	if err != nil {
		tb.Fatal(err)
	}
	linear, err := loop.Linear()
	if err != nil {
		tb.Fatal(err)
	}
	return linear
}

func spectrum(tb testing.TB, linear *rtloop.Loop) *Spectrum {
	tb.Helper()
	system, err := Linearize(linear)
	if err != nil {
		tb.Fatal(err)
	}
	s, err := system.Spectrum()
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

// The embedded scenarios, servo-hydraulic actuators, isolators and all: poles and
// shapes by the characteristic function are those of the state matrix.
func TestBothWaysOnWhatShips(t *testing.T) {
	looked := 0
	for _, name := range scenarios.Names() {
		s, err := scenarios.Load(name)
		if err != nil {
			t.Fatal(err)
		}
		if s.Substructure == nil {
			continue
		}
		looked++
		linear := linearized(t, name)
		want := spectrum(t, linear)
		m, err := NewModel(linear)
		if err != nil {
			t.Fatal(err)
		}
		poles, err := m.Poles()
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if math.Abs(cmplx.Abs(poles[0])-want.Radius) > 1e-11 {
			t.Errorf("%s: radius %.13f, by eigenvalues %.13f", name, cmplx.Abs(poles[0]), want.Radius)
		}
		for _, mode := range m.Modes(poles) {
			closest := want.Modes[0]
			for _, o := range want.Modes {
				if cmplx.Abs(o.Pole-mode.Pole) < cmplx.Abs(closest.Pole-mode.Pole) {
					closest = o
				}
			}
			if cmplx.Abs(closest.Pole-mode.Pole) > 1e-10 {
				t.Errorf("%s: no eigenvalue at %v", name, mode.Pole)
			}
			for i := range mode.Shape {
				// Which of two equal levels is the largest is a matter of rounding.
				if d := mode.Shape[i]/mode.Shape[0] - closest.Shape[i]/closest.Shape[0]; cmplx.Abs(d) > 1e-6*cmplx.Abs(mode.Shape[i]/mode.Shape[0]) {
					t.Errorf("%s, %.2f Hz: shape %v, by eigenvectors %v", name, mode.Frequency, mode.Shape, closest.Shape)
					break
				}
			}
		}
	}
	if looked < 5 {
		t.Errorf("%d scenarios looked at", looked)
	}
}

// perfect is one storey, half of it specimen behind an actuator without any delay.
func perfect(tb testing.TB, integrator string, settings kind.Values, omega, damping, rate float64) *rtloop.Loop {
	tb.Helper()
	const m = 1e-3 // so that a specimen may be stiff for it
	k := m * omega * omega
	structure, err := substructure.FromStoreys([]substructure.Storey{{Mass: m, Stiffness: k / 2, Damping: 2 * damping * omega * m}},
		substructure.Damping{}, []substructure.Attachment{{From: 0, To: 1, Stiffness: k / 2}})
	if err != nil {
		tb.Fatal(err)
	}
	part := func(e *kind.Kind, given kind.Values) kind.Values {
		v, err := e.Resolve(given)
		if err != nil {
			tb.Fatal(err)
		}
		return v
	}
	spring, _ := plant.Elements.Find("spring")
	element, err := spring.New(part(&spring.Kind, kind.Values{"stiffness": kind.Num(k / 2)}))
	if err != nil {
		tb.Fatal(err)
	}
	lag, _ := plant.Actuators.Find("lag-delay")
	actuator, err := lag.New(plant.Timing{Tick: 1 / rate}, part(&lag.Kind, nil))
	if err != nil {
		tb.Fatal(err)
	}
	loop, err := rtloop.NewLoop(rtloop.Config{
		Tick: 1 / rate, Slowdown: 1, Drives: excitation.Ground, Structure: structure, Integrator: integrator, Method: settings,
		Channels: []rtloop.Channel{{Name: "c", Compensator: &compensator.None{}, Actuator: actuator, Specimen: plant.NewSpecimen(element),
			Displacement: plant.NewPerfectSensor(), Force: plant.NewPerfectSensor(), Limits: rtloop.NoLimits}},
		Window: 1, Ticks: 1000,
	})
	if err != nil {
		tb.Fatal(err)
	}
	linear, err := loop.Linear()
	if err != nil {
		tb.Fatal(err)
	}
	return linear
}

// Explicit Newmark is stable to dt = T/π and not beyond; CR at any step; of KR-alpha
// the radius tends to ρ∞ (Kolay & Ricles 2014). Both ways say so, and with the period
// that goes with the method: ω̄·dt = 2·asin(ω·dt/2) and 2·atan(ω·dt/2).
func TestIntegrators(t *testing.T) {
	const rate = 100.0
	for _, c := range []struct {
		integrator string
		settings   kind.Values
		step       float64 // ω·dt
		radius     float64 // NaN: above 1
		angle      float64 // NaN: not asked
	}{
		{"newmark-explicit", nil, 0.5, 1, 2 * math.Asin(0.25)},
		{"newmark-explicit", nil, 1.999, 1, 2 * math.Asin(0.9995)},
		{"newmark-explicit", nil, 2.001, math.NaN(), math.NaN()},
		{"CR", nil, 0.5, 1, 2 * math.Atan(0.25)},
		{"CR", nil, 50, 1, 2 * math.Atan(25)},
		{"KR-alpha", kind.Values{"rho_infinity": kind.Num(0.6)}, 1e5, 0.6, math.NaN()},
		{"KR-alpha", kind.Values{"rho_infinity": kind.Num(1)}, 0.5, 1, 2 * math.Atan(0.25)},
		{"alpha-OS", kind.Values{"alpha": kind.Num(-0.2)}, 1e5, 0.8 / 1.2, math.NaN()},
		{"alpha-OS", kind.Values{"alpha": kind.Num(0)}, 0.5, 1, 2 * math.Atan(0.25)},
	} {
		linear := perfect(t, c.integrator, c.settings, c.step*rate, 0, rate)
		want := spectrum(t, linear)
		m, err := NewModel(linear)
		if err != nil {
			t.Fatal(err)
		}
		poles, err := m.Poles()
		if err != nil {
			t.Errorf("%s at %g: %v", c.integrator, c.step, err)
			continue
		}
		got := cmplx.Abs(poles[0])
		// Far out the limit is reached with a power of 1/(ω·dt) below 1, and as the
		// poles become one they keep a third of the digits.
		tolerance, digits := 1e-9, 1e-9
		if c.step > 10 {
			tolerance, digits = 1e-3, 1e-5
		}
		grows := math.IsNaN(c.radius)
		if grows != (got > 1.01) || !grows && math.Abs(got-c.radius) > tolerance || math.Abs(got-want.Radius) > digits {
			t.Errorf("%s at ω·dt = %g: radius %.10f, by eigenvalues %.10f, want %v", c.integrator, c.step, got, want.Radius, c.radius)
		}
		if a := cmplx.Phase(poles[0]); math.Abs(a-c.angle) > 1e-6 {
			t.Errorf("%s at ω·dt = %g: turns by %v a tick, want %v", c.integrator, c.step, a, c.angle)
		}
	}
}

// Damping and frequency of a damped oscillator whose ticks resolve it are its own.
func TestMode(t *testing.T) {
	const omega, zeta = 9.0, 0.04
	m, err := NewModel(perfect(t, "CR", nil, omega, zeta, 4096))
	if err != nil {
		t.Fatal(err)
	}
	poles, err := m.Poles()
	if err != nil {
		t.Fatal(err)
	}
	mode := m.Modes(poles)[0]
	if math.Abs(mode.Frequency*2*math.Pi/omega-1) > 1e-6 || math.Abs(mode.Damping/zeta-1) > 1e-5 || len(mode.Shape) != 1 || cmplx.Abs(mode.Shape[0]-1) > 1e-12 {
		t.Errorf("%+v", mode)
	}
	if got := m.LeastDamping(poles); got != mode.Damping {
		t.Errorf("least damping %v, %v", got, mode.Damping)
	}
}

// Each gain at which poles cross the unit circle changes the number outside by one
// pair, or one if it is real; there is none between.
func TestGainsCountWithThePoles(t *testing.T) {
	for _, name := range []string{"archive", "piperack", "tank"} {
		m, err := NewModel(linearized(t, name))
		if err != nil {
			t.Fatal(err)
		}
		for channel := All; channel < len(m.channels); channel++ {
			crossings, err := m.Gains(channel, 40)
			if err != nil {
				t.Fatal(err)
			}
			outside := func(g float64) int {
				n, err := m.Scaled(channel, g).Unstable(1)
				if err != nil {
					t.Fatal(name, channel, g, err)
				}
				return n
			}
			last := outside(1e-6)
			for i, c := range crossings {
				next := c.Value * 1.001
				if i+1 < len(crossings) {
					next = 0.5 * (c.Value + crossings[i+1].Value)
				}
				now := outside(next)
				pair := 2
				if c.Angle == 0 || c.Angle == math.Pi {
					pair = 1
				}
				if d := now - last; d != pair && d != -pair {
					t.Errorf("%s, channel %d: %d poles outside below the gain %v, %d above", name, channel, last, c.Value, now)
				}
				// There it is on the circle.
				z, ok := m.Scaled(channel, c.Value).Pole(cmplx.Rect(1, c.Angle))
				if !ok || math.Abs(cmplx.Abs(z)-1) > 1e-9 {
					t.Errorf("%s, channel %d, gain %v: pole %v", name, channel, c.Value, z)
				}
				last = now
			}
		}
	}
}

func TestTransfer(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, n := range []int{1, 2, 5, 12} {
		a, b, c := make([]float64, n*n), make([]float64, n), make([]float64, n)
		for i := range a {
			a[i] = rng.NormFloat64() * math.Pow(10, 3*rng.NormFloat64())
		}
		for i := range b {
			b[i], c[i] = rng.NormFloat64(), rng.NormFloat64()
		}
		tr, err := newTransfer(n, a)
		if err != nil {
			t.Fatal(err)
		}
		// A real z, for which gonum solves too.
		const z = 1.37
		m := mat.NewDense(n, n, nil)
		for i := range n {
			for j := range n {
				m.Set(i, j, -a[i*n+j])
			}
			m.Set(i, i, z-a[i*n+i])
		}
		var x mat.VecDense
		if err := x.SolveVec(m, mat.NewVecDense(n, b)); err != nil {
			t.Fatal(err)
		}
		want := mat.Dot(mat.NewVecDense(n, c), &x)
		side := complexes(tr.inward(b))
		det := tr.solve(z, side, make([]complex128, n*(n+1)))
		var got complex128
		for i, w := range tr.outward(c) {
			got += complex(w, 0) * side[i]
		}
		if math.Abs(real(got)-want) > 1e-8*math.Abs(want) || math.Abs(imag(got)) > 1e-8*math.Abs(want) {
			t.Errorf("%d states: answer %v, want %v", n, got, want)
		}
		if d := mat.Det(m); math.Abs(real(det.over(one))/d-1) > 1e-8 {
			t.Errorf("%d states: determinant %v, want %v", n, det.over(one), d)
		}
	}
}

// Products of thousands of factors neither over- nor underflow.
func TestScaled(t *testing.T) {
	p, q := one, one
	for range 5000 {
		p, q = p.times(1e-3i), q.times(2e-3i)
	}
	if got := p.log(); math.Abs(got-5000*math.Log(1e-3)) > 1e-6 {
		t.Errorf("logarithm %v", got)
	}
	r := q
	r.e -= 5000
	if got := r.over(p); cmplx.Abs(got-1) > 1e-11 {
		t.Errorf("quotient %v", got)
	}
}

func TestSmallEigenvalues(t *testing.T) {
	// Upper triangular: the diagonal, in whatever order.
	want := []complex128{2 + 1i, -0.5, 3i}
	a := []complex128{want[0], 4, -2i, 0, want[1], 7, 0, 0, want[2]}
	got := matched(eigenvalues(3, a), want)
	for i := range want {
		if cmplx.Abs(got[i]-want[i]) > 1e-12 {
			t.Errorf("%v, want %v", got, want)
		}
	}
	if e := eigenvalues(2, make([]complex128, 4)); e[0] != 0 || e[1] != 0 {
		t.Errorf("of nothing: %v", e)
	}
}

func BenchmarkPoles(b *testing.B) {
	linear := linearized(b, "archive")
	m, err := NewModel(linear)
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct {
		name string
		do   func() error
	}{
		{"model", func() error { _, err := NewModel(linear); return err }},
		{"poles", func() error { _, err := m.Poles(); return err }},
		{"eigenvalues", func() error {
			system, err := Linearize(linear)
			if err == nil {
				_, err = system.Spectrum()
			}
			return err
		}},
	} {
		b.Run(c.name, func(b *testing.B) {
			for b.Loop() {
				if err := c.do(); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
