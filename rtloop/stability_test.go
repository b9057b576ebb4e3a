package rtloop

import (
	"fmt"
	"math"
	"testing"

	"antelag/scenarios/kind"
)

// The critical delay of a one-storey loop with an elastic specimen (Mercan and
// Ricles 2007): ω is the positive root of m²ω⁴ + (c² − 2mk_n)ω² + k_n² − k_e² = 0
// at which the loop neither grows nor decays, τ = atan2(cω, mω² − k_n)/ω.
func criticalDelay(damping, share float64) (omega, tau float64) {
	m := oscillatorMass
	k := m * oscillatorOmega * oscillatorOmega
	c := 2 * damping * oscillatorOmega * m
	ke, kn := share*k, (1-share)*k
	b := (c*c - 2*m*kn) / (m * m)
	q := (kn*kn - ke*ke) / (m * m)
	omega = math.Sqrt((-b + math.Sqrt(b*b-4*q)) / 2)
	return omega, math.Atan2(c*omega, m*omega*omega-kn) / omega
}

func TestCriticalDelayClosedForm(t *testing.T) {
	// m = 100 t, 1.5 Hz, ζ = 3 %: computed once with fifty digits.
	for share, want := range map[float64]float64{0.5: 12.763041e-3, 0.2: 32.324155e-3, 0.8: 7.965210e-3, 1: 6.370017e-3} {
		if _, tau := criticalDelay(0.03, share); math.Abs(tau-want) > 1e-9 {
			t.Errorf("share %g: critical delay %.9g s, want %.9g", share, tau, want)
		}
	}
	if omega, _ := criticalDelay(0.03, 0.5); math.Abs(omega-9.407798) > 1e-6 {
		t.Errorf("frequency %.7g rad/s", omega)
	}
}

// At the critical delay the energy margin is zero and nothing grows; a little
// earlier the loop decays and the margin is positive, a little later it grows
// and the margin is negative.
func TestEnergyMarginAtCriticalDelay(t *testing.T) {
	for _, share := range []float64{0.2, 0.5, 0.8, 1} {
		for _, integrator := range []string{"CR", "newmark-explicit"} {
			omega, tau := criticalDelay(0.03, share)
			for _, factor := range []float64{0.8, 1, 1.2} {
				name := fmt.Sprintf("%s/specimen %g/delay %g critical", integrator, share, factor)
				t.Run(name, func(t *testing.T) {
					l := oscillator{rate: 4096, damping: 0.03, share: share, delay: factor * tau, integrator: integrator}.loop(t)
					growth := ringDown(l, 10, 30)
					margin := l.Margin()
					// Off the critical delay the margin is near that of the
					// steady oscillation, 1 − k_e·sin ωτ/(cω).
					switch {
					case factor == 1 && (math.Abs(margin) > 0.01 || math.Abs(growth-1) > 0.01):
						t.Errorf("margin %.5f, growth %.5f", margin, growth)
					case factor < 1 && !(margin > 0.15 && growth < 0.9):
						t.Errorf("margin %.5f, growth %.5f", margin, growth)
					case factor > 1 && !(margin < -0.15 && growth > 1.1):
						t.Errorf("margin %.5f, growth %.5f", margin, growth)
					}
					k := oscillatorMass * oscillatorOmega * oscillatorOmega
					if factor == 1 {
						steady := 1 - share*k*math.Sin(omega*tau)/(2*0.03*oscillatorOmega*oscillatorMass*omega)
						if math.Abs(steady) > 1e-9 {
							t.Errorf("the closed forms disagree by %g", steady)
						}
					}
					if e := float64(l.Result().Energy.BalanceError); !(e < 0.01) {
						t.Errorf("the energy balance closes within %g only", e)
					}
				})
			}
		}
	}
}

// Delay acts as damping c_eq ≈ −k_e·τ (Horiuchi et al. 1999): with a short
// delay the added damping ratio is −k_e·sin(ωτ)/(2mω²).
func TestDelayAsNegativeDamping(t *testing.T) {
	const share, tau = 0.3, 0.004
	l := oscillator{rate: 4096, damping: 0.05, share: share, delay: tau}.loop(t)
	ringDown(l, 1, 4)
	want := -share * math.Sin(oscillatorOmega*tau) / 2
	got := l.energy.AddedDamping()
	// The oscillation decays, e^(−ζωτ) over the delay, and is at the damped
	// frequency: second order in ζ and first in ζωτ ≈ 0.002.
	if math.Abs(got-want) > 0.01*math.Abs(want) {
		t.Errorf("added damping %g, want %g", got, want)
	}
}

// An undamped oscillator that is all specimen, with a pure delay and the
// polynomial for it, is stable for ω₀τ below π/(3√2) (order 2) and π/(2√5)
// (order 3): with θ = ωτ, C·G = 1 − (1 − e^(−jθ))^(n+1) has positive added
// damping up to θ = π/3 and π/2, where Re C·G is 2 and 5.
func TestPolynomialStabilityLimit(t *testing.T) {
	for order, limit := range map[int]float64{2: math.Pi / (3 * math.Sqrt2), 3: math.Pi / (2 * math.Sqrt(5))} {
		// The limit is a matter of the loop's phase at every frequency, so the
		// sampling must not add to it: 8192 Hz makes τ more than 600 ticks.
		for _, side := range []float64{0.97, 1.03} {
			tau := side * limit / oscillatorOmega
			l := oscillator{rate: 8192, share: 1, delay: tau, method: "polynomial",
				settings: kind.Values{"order": kind.Num(float64(order)), "delay": kind.Num(tau)}}.loop(t)
			growth := ringDown(l, 5, 25)
			if grows := growth > 1; grows != (side > 1) {
				t.Errorf("order %d at %.2f of the limit: growth %g", order, side, growth)
			}
		}
	}
}
