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

// The closed form is right: the plant itself follows it for small motions.
// At 8192 Hz a tick is 0.12 ms, of which the sub-steps lose little.
func TestHydraulicTransferFunction(t *testing.T) {
	const rate = 4096.0
	set := nums("friction", 0.0)
	h := newHydraulic(t, set, 5e6, 1)
	for _, hz := range []float64{1, 4, 10, 20} {
		u := sampled(rate, 6, func(t float64) float64 { return 1e-5 * math.Sin(2*math.Pi*hz*t) })
		y := carried(build(t, 1/rate, plant.Ramp, "servo-hydraulic", set), spring(t, 5e6), u)
		// Over whole periods after the start has died away.
		var g complex128
		from := int(2 * rate)
		for k := from; k < len(y); k++ {
			g += complex(y[k], 0) * cmplx.Exp(complex(0, -2*math.Pi*hz*float64(k)/rate))
		}
		g *= complex(0, 2/(1e-5*float64(len(y)-from)))
		want := h.at(hz)
		if off := cmplx.Abs(g-want) / cmplx.Abs(want); off > 2e-3 {
			t.Errorf("%v Hz: %v, want %v: off by %.2g", hz, g, want, off)
		}
	}
}

// The fitted lag-delay is as late, in the excited band, as the plant truly is: to
// 0.1 ms or three standard errors. Motions are small enough that the valve, whose
// flow depends on the load, is nearly linear, and large enough that friction is.
func TestHydraulicActuatorsAreAsLateAsTheyAre(t *testing.T) {
	const rate = 256.0
	for _, c := range []struct {
		name      string
		set       kind.Values
		stiffness float64
		scale     float64
	}{
		{"no friction", nums("friction", 0.0), 5e6, 0.1},
		{"the default", nums(), 5e6, 0.5},
		{"a stiff specimen", nums("friction", 0.0), 20e6, 0.1},
		{"no integral", nums("ki", 0.0), 1e6, 0.5},
		{"a slow valve", nums("valve_frequency", 40.0, "friction", 0.0), 5e6, 0.1},
	} {
		for _, m := range motions {
			u := m.make(rate, 20)
			for k := range u {
				u[k] *= c.scale
			}
			y := carried(build(t, 1/rate, plant.Ramp, "servo-hydraulic", c.set), spring(t, c.stiffness), u)
			h := newHydraulic(t, c.set, c.stiffness, rmsSpeed(y, 1/rate))
			r := identified(t, Record{Command: u, Measured: noisy(y, -40, 0, 3), Tick: 1 / rate})
			truth := h.inBand(u, r)
			if off, ok := found(r.LagDelay.Phase, truth, 1e-4); !ok {
				t.Errorf("%s, %s: late by %s ms, truly %.4f: off by %.4f", c.name, m.name, r.LagDelay.Phase.text(1e3), 1e3*truth, 1e3*off)
			}
		}
	}
}
