package substructure

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// amplification is the matrix that takes (x, dt·v, dt²·a/scale) of a free
// structure over one step, found by setting unit states and ticking. The
// specimen at attachment 0 is a spring.
func amplification(s *Structure, in Integrator, spring, dt, scale float64) *mat.Dense {
	n := s.N()
	units := []float64{1, 1 / dt, scale / (dt * dt)}
	out := mat.NewDense(3*n, 3*n, nil)
	l := newLoaded(s, in, spring)
	for j := range 3 * n {
		var state [3][]float64
		for q := range state {
			state[q] = make([]float64, n)
		}
		state[j/n][j%n] = units[j/n]
		in.SetState(state[0], state[1], state[2])
		l.step(0)
		for q, after := range [][]float64{in.X(), in.V(), in.A()} {
			for i, value := range after {
				out.Set(q*n+i, j, value/units[q])
			}
		}
	}
	return out
}

func eigenvalues(t *testing.T, m mat.Matrix) []complex128 {
	t.Helper()
	var eigen mat.Eigen
	if !eigen.Factorize(m, mat.EigenNone) {
		t.Fatal("no eigenvalues found")
	}
	return eigen.Values(nil)
}

func radius(values []complex128) float64 {
	r := 0.0
	for _, z := range values {
		r = math.Max(r, cmplx.Abs(z))
	}
	return r
}

// parameters are α_m and α_f of the generalized-α method (Chung & Hulbert 1993)
// that has the poles of a method.
func (m method) parameters() (am, af float64) {
	if m.name == "KR-alpha" {
		return (2*m.setting - 1) / (m.setting + 1), m.setting / (m.setting + 1)
	}
	return 0, -m.setting
}

// characteristic is the characteristic polynomial of generalized-α,
//
//	((1−α_m)z + α_m)(z−1)² + ((1−α_f)z + α_f)·(2ζΩ(z−1)(1 + γ(z−1)) + Ω²(1 + (½+γ)(z−1) + β(z−1)²)),
//
// coefficients from z³ down, divided by the first.
func characteristic(m method, omega, zeta float64) [4]float64 {
	am, af := m.parameters()
	g := 0.5 - am + af
	beta := (0.5 + g) * (0.5 + g) / 4
	d, k := 2*zeta*omega, omega*omega
	// in powers of (z−1): the quadratic that multiplies the weighted force
	q0, q1, q2 := k, d+k*(0.5+g), d*g+k*beta
	force := [3]float64{q2, q1 - 2*q2, q0 - q1 + q2}
	inertia := [3]float64{1, -2, 1}
	var p [4]float64
	for i := range 3 {
		p[i] += (1-am)*inertia[i] + (1-af)*force[i]
		p[i+1] += am*inertia[i] + af*force[i]
	}
	lead := p[0]
	for i := range p {
		p[i] /= lead
	}
	return p
}

// oneMode is a storey of frequency 1 rad/s whose stiffness is by a third that
// of a specimen.
func oneMode(t *testing.T, zeta float64) (s *Structure, spring float64) {
	return mustStoreys(t, []Storey{{Mass: 3, Stiffness: 2, Damping: 6 * zeta}}, Damping{}, Attachment{0, 1, 1}), 1
}

// Both methods have the poles of the implicit generalized-α method, for any
// setting, damping and step: the characteristic polynomial of what the ticks
// do is that of the closed form, and the eigenvalues are those that SciPy finds
// for the implicit method's own matrix.
func TestSpectrumIsGeneralizedAlpha(t *testing.T) {
	c := columns(t, "testdata/spectra.csv")
	for i, omega := range c["omega_dt"] {
		m := method{"KR-alpha", c["setting"][i]}
		if c["split"][i] == 1 {
			m.name = "alpha-OS"
		}
		zeta := c["damping_ratio"][i]
		what := fmt.Sprintf("%s, Ω = %g, ζ = %g", m, omega, zeta)
		s, spring := oneMode(t, zeta)
		// dt is Ω at 1 rad/s. The scale keeps the elements of order 1, so that
		// rounding is some 1e-15 of the coefficients.
		a := amplification(s, m.build(t, s, omega), spring, omega, 1+omega*omega)
		want := characteristic(m, omega, zeta)
		got := [4]float64{1, -mat.Trace(a), 0, -mat.Det(a)}
		for j := range 3 {
			for k := range j {
				got[2] += a.At(j, j)*a.At(k, k) - a.At(j, k)*a.At(k, j)
			}
		}
		for j := range got {
			near(t, fmt.Sprintf("%s: coefficient of z^%d", what, 3-j), got[j], want[j], 2e-13)
		}

		// A root moves by the error of the coefficients over the slope there,
		// or, where three come together, by the cube root.
		slack := func(z complex128) float64 {
			slope := cmplx.Abs((complex(3, 0)*z+complex(2*want[1], 0))*z + complex(want[2], 0))
			return math.Min(1e-13/slope, 1e-4)
		}
		values := eigenvalues(t, a)
		largest, mode := values[0], complex128(0)
		for _, z := range values {
			if cmplx.Abs(z) > cmplx.Abs(largest) {
				largest = z
			}
			if imag(z) > 1e-3 {
				mode = z
			}
		}
		near(t, what+": radius", cmplx.Abs(largest), c["radius"][i], slack(largest))
		if mode == 0 || c["turn_rad"][i] == 0 {
			if mode != 0 || c["turn_rad"][i] != 0 {
				t.Errorf("%s: oscillates, %v, where SciPy has %v rad a step", what, mode, c["turn_rad"][i])
			}
			continue
		}
		log := cmplx.Log(mode)
		tol := slack(mode) / cmplx.Abs(mode)
		near(t, what+": frequency", imag(log), c["turn_rad"][i], tol)
		near(t, what+": damping ratio", -real(log)/cmplx.Abs(log), c["numerical_damping_ratio"][i], 2*tol/cmplx.Abs(log))
	}
}

// Far above the step the radius is ρ∞; for the method of Hilber, Hughes &
// Taylor it is (1+α)/(1−α) (Chung & Hulbert 1993): ½ at α = −⅓, 0.9048 at
// −0.05. For KR-alpha the polynomial divided by its leading terms is there
//
//	(z + ρ∞)³ + ((1−α_m)z + α_m)(z−1)²/((1−α_f)βΩ²) = 0
//
// the second term of which is −(1−ρ∞)(1+ρ∞)⁵/Ω² at z = −ρ∞: so the roots are
// within 1.63·Ω^(−⅔) of −ρ∞, and those of alpha-OS, of which two come together
// only, or three at α = −⅓, likewise.
func TestRadiusFarAboveTheStep(t *testing.T) {
	s, spring := oneMode(t, 0)
	for m, want := range map[method]float64{
		{"KR-alpha", 0}: 0, {"KR-alpha", 0.25}: 0.25, {"KR-alpha", 0.5}: 0.5, {"KR-alpha", 0.75}: 0.75, {"KR-alpha", 1}: 1,
		{"alpha-OS", 0}: 1, {"alpha-OS", -0.05}: 0.95 / 1.05, {"alpha-OS", -0.1}: 0.9 / 1.1, {"alpha-OS", -1.0 / 3}: 0.5,
	} {
		for _, omega := range []float64{1e3, 1e4, 1e5} {
			// Three rounded roots that are one are some 1e-5 off.
			got := radius(eigenvalues(t, amplification(s, m.build(t, s, omega), spring, omega, 1+omega*omega)))
			near(t, fmt.Sprintf("%s at Ω = %g", m, omega), got, want, 1.63*math.Pow(omega, -2.0/3)+5e-5)
		}
	}
}

// No numerical damping: all roots of an undamped mode on the unit circle, and
// its frequency that of CR and of average acceleration.
func TestUndissipativeModesKeepTheirEnergy(t *testing.T) {
	s, spring := oneMode(t, 0)
	for _, m := range []method{{"KR-alpha", 1}, {"alpha-OS", 0}} {
		for _, omega := range []float64{0.01, 0.1, 1, 10, 100} {
			values := eigenvalues(t, amplification(s, m.build(t, s, omega), spring, omega, 1+omega*omega))
			// Two roots of distance θ at z = 1, or π − θ at −1, are off by
			// rounding over that.
			theta := 2 * math.Atan(omega/2)
			tol := 1e-13 / math.Min(theta, math.Pi-theta)
			near(t, fmt.Sprintf("%s at Ω = %g: radius", m, omega), radius(values), 1, tol)
			turn := 0.0
			for _, z := range values {
				if imag(z) > 1e-6 {
					turn = cmplx.Phase(z)
				}
			}
			near(t, fmt.Sprintf("%s at Ω = %g: turn", m, omega), turn, theta, tol)
		}
	}
}

// At ρ∞ = 1 it is the method of Chen & Ricles, tick by tick, under any load.
func TestKRAlphaAtOneIsCR(t *testing.T) {
	three, spring := threeStoreys(t)
	for _, s := range []*Structure{three, twoYielding(t)} {
		if len(s.attachments) == 0 {
			spring = 0
		}
		a := newLoaded(s, method{"KR-alpha", 1}.build(t, s, 0.01), spring)
		b := newLoaded(s, mustNew(t, "CR", s, 0.01), spring)
		a.start(1)
		b.start(1)
		for k := range 2000 {
			ug := 2 * math.Sin(0.07*float64(k)+float64(k*k)*1e-4)
			a.step(ug)
			b.step(ug)
			for i := range b.in.X() {
				// Rounding stays in the root −1: it neither dies nor grows.
				near(t, fmt.Sprintf("step %d x", k), a.in.X()[i], b.in.X()[i], 1e-13)
				near(t, fmt.Sprintf("step %d v", k), a.in.V()[i], b.in.V()[i], 1e-12)
				near(t, fmt.Sprintf("step %d a", k), a.in.A()[i], b.in.A()[i], 1e-10)
				near(t, fmt.Sprintf("step %d centred", k), a.in.Centred()[i], b.in.Centred()[i], 1e-12)
			}
			if t.Failed() {
				return
			}
		}
	}
}

// Buildings with damping are stable at any step, with a perfect specimen of
// the initial stiffness, and with one that is softer.
func TestWeightedMethodsHaveNoLimit(t *testing.T) {
	s := equalStoreys(t, 4)
	period := 2 * math.Pi / s.Frequencies()[0]
	for _, m := range []method{
		{"KR-alpha", 0}, {"KR-alpha", 0.5}, {"KR-alpha", 0.75}, {"KR-alpha", 1}, {"alpha-OS", 0}, {"alpha-OS", -0.05}, {"alpha-OS", -1.0 / 3},
	} {
		for _, ratio := range []float64{0.01, 0.1, 1, 10, 100} {
			dt := ratio * period
			w := s.Frequencies()[3] * dt
			in := m.build(t, s, dt)
			// Clusters of roots inside the circle may move out of their place
			// by some 1e-5, but only those at ρ∞ = 1 lie at its rim.
			if r := radius(eigenvalues(t, amplification(s, in, 6e6, dt, 1+w*w))); !(r < 1+1e-9) {
				t.Errorf("%s, dt = %g T: spectral radius %.12g", m, ratio, r)
			}
			// A specimen of half its stiffness is known to no amplification
			// matrix of x, v, a alone: let go and look. The start is at rest
			// from the first mode, and overshoots by Ω at most.
			l := newLoaded(s, in, 3e6)
			x0 := []float64{0.01, 0.02, 0.03, 0.035}
			s.AddForce(l.p, 0, 3e6*x0[0])
			in.Start(x0, l.p)
			largest := 0.0
			for range 5000 {
				l.step(0)
				largest = math.Max(largest, peak(in.X()))
			}
			if !(largest < 0.035*2*(1+w)) {
				t.Errorf("%s, dt = %g T: reaches %g m", m, ratio, largest)
			}
		}
	}
}

// Memory completes the state: with a load in it, x, v and a alone do not
// determine what comes.
func TestMemoryIsOfTheState(t *testing.T) {
	s, spring := threeStoreys(t)
	for _, name := range Names() {
		a := newLoaded(s, mustNew(t, name, s, 0.01), spring)
		a.start(1)
		a.step(2)
		b := newLoaded(s, mustNew(t, name, s, 0.01), spring)
		b.in.SetState(a.in.X(), a.in.V(), a.in.A())
		a.step(0)
		b.step(0)
		a.step(0)
		b.step(0)
		apart := math.Abs(a.in.X()[2] - b.in.X()[2])
		if weighted := len(a.in.Memory()) > 0; weighted != (apart > 1e-8) {
			t.Errorf("%s has %d elements of memory, and goes on %g m apart without", name, len(a.in.Memory()), apart)
		}
	}
}
