package identify

import (
	"math"
	"math/cmplx"
	"testing"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// hydraulic is the transfer function of a servo-hydraulic actuator for small
// motions about rest, on a spring of stiffness k, from the equations in package
// plant (Merritt 1967). There √((p_s − sgn x·p_L)/p_R) is √(p_s/p_R), and with
//
//	W = ω_v²/(s² + 2ζ_vω_v·s + ω_v²),  C = k_p + k_i/s,  K = Q_R√(p_s/p_R),
//	p_L = D·y,  D = (m·s² + c·s + k)/A,
//
// continuity K·W·(C·(w − y) − k_d·s·y − k_dp·D·y) = (A·s + (C_l + V·s/4β)·D)·y
// gives
//
//	y/u = e^(−sτ)·K·W·C / (A·s + (C_l + V·s/4β)·D + K·W·(C + k_d·s + k_dp·D)).
//
// c stands for the friction of the seals, F·ẏ/max(|ẏ|, v₀) with v₀ = 1 mm/s, by
// statistical linearization (Booton 1954): for a Gaussian velocity of rms σ the
// mean slope is c = F/v₀·erf(v₀/(√2·σ)); at rest it is F/v₀.
type hydraulic struct {
	v    kind.Values
	k, c float64
}

func newHydraulic(t testing.TB, set kind.Values, stiffness, speed float64) hydraulic {
	t.Helper()
	entry, err := plant.Actuators.Find("servo-hydraulic")
	if err != nil {
		t.Fatal(err)
	}
	v, err := entry.Resolve(set)
	if err != nil {
		t.Fatal(err)
	}
	const creep = 1e-3
	return hydraulic{v, stiffness, v.Num("friction") / creep * math.Erf(creep/(math.Sqrt2*speed))}
}

func (h hydraulic) at(hz float64) complex128 {
	n := func(name string) complex128 { return complex(h.v.Num(name), 0) }
	s := complex(0, 2*math.Pi*hz)
	wv := 2 * math.Pi * n("valve_frequency")
	w := wv * wv / (s*s + 2*n("valve_damping")*wv*s + wv*wv)
	c := n("kp") + n("ki")/s
	area := n("piston_area")
	d := (n("piston_mass")*s*s + complex(h.c, 0)*s + complex(h.k, 0)) / area
	kw := n("rated_flow") * cmplx.Sqrt(n("supply_pressure")/7e6) * w
	oil := n("leakage") + n("chamber_volume")*s/(4*n("bulk_modulus"))
	return cmplx.Exp(-s*n("delay")) * kw * c / (area*s + oil*d + kw*(c+n("kd")*s+n("kdp")*d))
}

func (h hydraulic) delay(hz float64) float64 { return -cmplx.Phase(h.at(hz)) / (2 * math.Pi * hz) }

// inBand is the phase delay weighted with the power of the velocity that was
// commanded, over the band.
func (h hydraulic) inBand(u []float64, r *Result) float64 {
	s, err := Welch(u, u, r.Tick, segmentFor(len(u), r.Tick))
	if err != nil {
		return math.NaN()
	}
	sum, weight := 0.0, 0.0
	for i, f := range s.Hz {
		if f >= r.Band[0] && f <= r.Band[1] {
			w := s.XX[i] * f * f
			sum += w * h.delay(f)
			weight += w
		}
	}
	return sum / weight
}

// rmsSpeed of a displacement, m/s.
func rmsSpeed(y []float64, tick float64) float64 {
	sum := 0.0
	for k := 1; k < len(y); k++ {
		d := (y[k] - y[k-1]) / tick
		sum += d * d
	}
	return math.Sqrt(sum / float64(len(y)-1))
}
