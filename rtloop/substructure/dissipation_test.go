package substructure

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"
)

// At small Ω = ω·dt an undamped mode loses 4πζ̄ of its energy a cycle, with
//
//	KR-alpha: ζ̄ = ½q³Ω³, q = (1−ρ∞)/(1+ρ∞);  T̄/T − 1 = (1/12 + ⅜q²)Ω²
//	alpha-OS: ζ̄ = −α(1+α)²/8·Ω³;             T̄/T − 1 = (1/12 − α(2+3α)/8)Ω²
//
// and by just that the balance of energy does not close.
func TestNumericalDampingAtSmallSteps(t *testing.T) {
	const omega, cycles = 0.05, 40
	s, spring := oneMode(t, 0)
	for _, m := range []method{
		{"KR-alpha", 0}, {"KR-alpha", 0.25}, {"KR-alpha", 0.5}, {"KR-alpha", 0.75}, {"KR-alpha", 1},
		{"alpha-OS", 0}, {"alpha-OS", -0.05}, {"alpha-OS", -0.1}, {"alpha-OS", -1.0 / 3},
	} {
		zeta := -m.setting * (1 + m.setting) * (1 + m.setting) / 8
		longer := 1.0/12 - m.setting*(2+3*m.setting)/8
		if m.name == "KR-alpha" {
			q := (1 - m.setting) / (1 + m.setting)
			zeta, longer = q*q*q/2, 1.0/12+3*q*q/8
		}
		in := m.build(t, s, omega)
		turn := 0.0
		for _, z := range eigenvalues(t, amplification(s, in, spring, omega, 1)) {
			if imag(z) > 0 {
				turn = cmplx.Phase(z)
			}
		}
		// The next order of the period is Ω⁴ times at most 2.
		near(t, fmt.Sprintf("%s: period longer by", m), omega/turn-1, longer*omega*omega, 2*omega*omega*omega*omega)
		l := newLoaded(s, in, spring)
		s.AddForce(l.p, 0, spring)
		in.Start([]float64{1}, l.p)
		energy := func() float64 { // what stands in the specimen is at x here
			return s.VMV(in.Centred())/2 + in.Strain() + spring/2*in.X()[0]*in.X()[0]
		}
		// Energy at ticks swings by Ω² within a cycle; means over whole cycles
		// a number of cycles apart have that in common.
		perCycle := 2 * math.Pi / turn
		mean := func() float64 {
			e, n := 0.0, int(math.Round(10*perCycle))
			for range n {
				l.step(0)
				e += energy()
			}
			return e / float64(n)
		}
		first := mean()
		for range int(math.Round((cycles - 10) * perCycle)) {
			l.step(0)
		}
		lost := math.Log(first/mean()) / cycles // of the energy, a cycle
		t.Logf("%s: loses %.4g of its energy a cycle, period longer by %.4g", m, lost, omega/turn-1)
		want := 4 * math.Pi * zeta * omega * omega * omega
		// The next order is Ω² ten times as strong at most, ρ∞ = 0; ten
		// cycles end between two ticks, which leaves a few 1e-8 of the swing.
		near(t, fmt.Sprintf("%s: energy lost a cycle", m), lost, want, 0.03*want+2e-7)
	}
}

// Shaken buildings with numerical damping: what the balance lacks is of second
// order, as without, and a part of third order that the method damps. Over the
// square of the step it therefore nears a constant with the first power.
func TestBalanceWithNumericalDamping(t *testing.T) {
	linear, spring := threeStoreys(t)
	yielding := twoYielding(t)
	for _, m := range []method{{"KR-alpha", 0.75}, {"KR-alpha", 0.25}, {"alpha-OS", -0.05}, {"alpha-OS", -1.0 / 3}} {
		for what, c := range map[string]struct {
			s      *Structure
			spring float64
			knots  []float64
		}{
			"linear":   {linear, spring, columns(t, "testdata/three_storeys.csv")["ground_m_s2"]},
			"yielding": {yielding, 0, columns(t, "testdata/yielding.csv")["ground_m_s2"]},
		} {
			var over [3]float64
			for i, several := range []int{32, 64, 128} {
				r, _ := balance(t, m, c.s, c.spring, nil, c.knots, several)
				over[i] = r * float64(several*several)
			}
			t.Logf("%s, %s: lost %.3g of the energy at 32 steps to a knot", what, m, over[0]/1024)
			if fall := (over[0] - over[1]) / (over[1] - over[2]); math.Abs(fall-2) > 0.1 {
				t.Errorf("%s, %s: lost over the square of the step: %v; want differences that halve", what, m, over)
			}
			if over[0]/1024 > 3e-5 {
				t.Errorf("%s, %s: lost %.3g of the energy", what, m, over[0]/1024)
			}
		}
	}
}

// Average acceleration conserves ½vᵀM v + ½xᵀK x of a free linear structure;
// with K the whole stiffness at the corrected displacement, hysteretic storeys
// (here elastic) included. A balance with the specimen's energy at the target,
// ½k x̃², is off by ½k(x² − x̃²) at the moment, and that does not add up.
func TestAlphaOSConserves(t *testing.T) {
	const dt, k = 0.02, 6e6
	s := mustStoreys(t, []Storey{
		{Mass: 60e3, Stiffness: 18e6, YieldDisplacement: 0.001, Hardening: 1}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6},
	}, Damping{}, Attachment{From: 1, To: 2, Stiffness: k})
	in := method{"alpha-OS", 0}.build(t, s, dt)
	l := newLoaded(s, in, k)
	x0 := []float64{0.01, -0.02, 0.03}
	s.AddForce(l.p, 0, k*s.Project(x0, 0))
	in.Start(x0, l.p)
	own := func() float64 { return s.VMV(in.Centred())/2 + in.Strain() }
	held := func(e float64) float64 { return k / 2 * e * e }
	first := own() + held(s.Project(x0, 0))
	off := 0.0
	for n := range 10000 {
		in.Predict()
		x, target := in.X(), s.Project(in.X(), 0)
		atTarget := (18e6*x[0]*x[0] + 15e6*math.Pow(x[1]-x[0], 2) + 12e6*math.Pow(x[2]-x[1], 2)) / 2
		near(t, fmt.Sprintf("step %d: strain at the target", n+1), in.Strain(), atTarget, 1e-11*first)
		in.Correct(l.load(0))
		// Rounding of 10000 steps.
		near(t, fmt.Sprintf("step %d: energy", n+1), own()+held(s.Project(in.X(), 0)), first, 1e-11*first)
		off = math.Max(off, math.Abs(own()+held(target)-first)/first)
		if t.Failed() {
			return
		}
	}
	// 2βΩ² of the energy in the specimen, β = ¼, Ω = 0.66 of the third mode.
	if bound := s.Frequencies()[2] * dt * s.Frequencies()[2] * dt / 2; off > bound || off < 1e-3*bound {
		t.Errorf("with the specimen at its target the energy is off by %g, bound %g", off, bound)
	}
}

// Released at rest, a mode too fast for the step overshoots under KR-alpha. As
// Ω → ∞ the recurrence has the root −ρ∞ three times and begins with 1,
// 1 − (½+γ)/β = −(1+2ρ∞): x_k = (−ρ∞)^k (1 + k(1+ρ∞)/ρ∞).
func TestKRAlphaOvershoot(t *testing.T) {
	const omega = 1e6
	s, spring := oneMode(t, 0)
	for rho, largest := range map[float64]float64{0.25: 1.5, 0.5: 2, 0.75: 3.375, 0.9: 7.748} {
		m := method{"KR-alpha", rho}
		in := m.build(t, s, omega)
		l := newLoaded(s, in, spring)
		s.AddForce(l.p, 0, spring)
		in.Start([]float64{1}, l.p)
		most := 0.0
		for k := range 60 {
			want := math.Pow(-rho, float64(k)) * (1 + float64(k)*(1+rho)/rho)
			// What is left of the limit is of the order Ω⁻² = 1e-12, times
			// k³, as the root is threefold.
			near(t, fmt.Sprintf("%s, step %d", m, k), in.X()[0], want, 1e-7)
			if t.Failed() {
				return
			}
			most = math.Max(most, math.Abs(in.X()[0]))
			l.step(0)
		}
		near(t, fmt.Sprintf("%s: largest", m), most, largest, 1e-3)
	}
}

// alpha-OS does not overshoot in x, but its target is 1 + βΩ² times x. The
// velocity beside the target is v + dt·a.
func TestAlphaOSOvershootsInItsTarget(t *testing.T) {
	s, spring := oneMode(t, 0)
	for _, alpha := range []float64{0, -0.05, -1.0 / 3} {
		for _, omega := range []float64{0.1, 1, 10} {
			in := method{"alpha-OS", alpha}.build(t, s, omega)
			l := newLoaded(s, in, spring)
			s.AddForce(l.p, 0, spring)
			in.Start([]float64{1}, l.p)
			beta := (1 - alpha) * (1 - alpha) / 4
			for k := range 200 {
				v, a := in.V()[0], in.A()[0]
				in.Predict()
				target := in.X()[0]
				near(t, "velocity ahead", in.V()[0], v+omega*a, 1e-15)
				in.Correct(l.load(0))
				x := in.X()[0]
				near(t, fmt.Sprintf("α = %g, Ω = %g, step %d: target", alpha, omega, k), target, x-beta*omega*omega*in.A()[0], 1e-12*(1+beta*omega*omega))
				if math.Abs(x) > 1+1e-12 || math.Abs(target) > (1+beta*omega*omega)*(1+1e-12) {
					t.Errorf("α = %g, Ω = %g, step %d: x %.4g, target %.4g", alpha, omega, k, x, target)
				}
				if k == 0 { // from rest: x̃ = x₀(1 − (½−β)Ω²)
					near(t, "first target", target, 1-(0.5-beta)*omega*omega, 1e-12*omega*omega)
				}
			}
		}
	}
}
