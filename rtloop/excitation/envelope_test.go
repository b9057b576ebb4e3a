package excitation

import (
	"math"
	"testing"

	"antelag/scenarios/kind"
)

func TestSaragoniHartIsItsPublishedForm(t *testing.T) {
	for _, p := range []struct{ epsilon, eta, tn float64 }{
		{0.2, 0.05, 20}, {0.05, 0.001, 3}, {0.7, 0.5, 100}, {0.4, 0.1, 1}, {0.05, 0.5, 8},
	} {
		e := newSaragoniHart(p.epsilon, p.eta, p.tn)
		b := -p.epsilon * math.Log(p.eta) / (1 + p.epsilon*(math.Log(p.epsilon)-1))
		c := b / p.epsilon
		a := math.Pow(math.E/p.epsilon, b)
		for _, s := range []float64{0, 0.01, 0.1, 0.3, 0.8, 1, 1.5} {
			want := a * math.Pow(s, b) * math.Exp(-c*s)
			if want <= saragoniRest {
				want = 0
			}
			// Exponents up to some ten, and powers of rounded numbers.
			if got := e.at(s * p.tn); math.Abs(got-want) > 1e-13 {
				t.Errorf("%v at %g tn: %v, want %v", p, s, got, want)
			}
		}
		if got := e.at(p.epsilon * p.tn); math.Abs(got-1) > 1e-15 {
			t.Errorf("%v: %v at ε·tn, want 1", p, got)
		}
		if got := e.at(p.tn); math.Abs(got-p.eta) > 1e-14 {
			t.Errorf("%v: %v at tn, want η", p, got)
		}
		for _, near := range []float64{0.99, 1.01} {
			if got := e.at(near * p.epsilon * p.tn); got >= 1 {
				t.Errorf("%v: %v beside the peak", p, got)
			}
		}
		end := e.length()
		if before := e.at(end * (1 - 1e-9)); e.at(end) != 0 || math.Abs(before/saragoniRest-1) > 1e-6 || end <= p.tn {
			t.Errorf("%v: %v before the end at %g s", p, before, end)
		}
	}
	// The constants for ε = 0.2, η = 0.05, worked out by hand:
	// b = 0.2·2.995732/(1 − 0.2·2.609438) = 0.599146/0.478112.
	if b := newSaragoniHart(0.2, 0.05, 1).b; math.Abs(b-1.253149) > 1e-5 {
		t.Errorf("b = %v", b)
	}
}

func TestFilteredNoiseStandsUnderSaragoniHart(t *testing.T) {
	const seeds = 400
	settings := kind.Values{"peak": kind.Num(1), "rise": kind.Num(1), "strong": kind.Num(0.5), "decay": kind.Num(2.5),
		"envelope": kind.Text("saragoni-hart"), "epsilon": kind.Num(0.25), "eta": kind.Num(0.1)}
	at := []float64{0, 0.25, 0.5, 1, 1.5, 2, 3, 4, 5, 6}
	sums := make([]float64, len(at))
	for seed := range uint64(seeds) {
		c := context(0.25, 6, Ground)
		c.Seed = seed
		s := build(t, "filtered-noise", c, settings)
		x := filled(s, 25)
		for i, t := range at {
			v := x[int(t*4)] / s.(*filteredNoise).scale
			sums[i] += v * v
		}
	}
	full := processVariance()
	b := 0.25 * math.Ln10 / (1 + 0.25*(math.Log(0.25)-1))
	for i, s := range at {
		e := math.Pow(math.E/0.25, b) * math.Pow(s/4, b) * math.Exp(-b/0.25*s/4)
		// A mean of 400 squares of normals scatters by 7 %; four times that.
		if got, want := sums[i]/seeds, e*e*full; math.Abs(got-want) > 4*math.Sqrt(2./seeds)*want {
			t.Errorf("at %g s: mean square %v, want %v", s, got, want)
		}
	}
}

func TestSaragoniHartMotionHasItsPeak(t *testing.T) {
	for _, peak := range []float64{3, -0.4} {
		s := build(t, "filtered-noise", context(1./1600, 40, Target), kind.Values{"peak": kind.Num(peak), "envelope": kind.Text("saragoni-hart")})
		x := filled(s, 40*1600+1)
		if got := largest(x); math.Abs(got/math.Abs(peak)-1) > 1e-12 || x[0] != 0 {
			t.Errorf("peak %v, want %v", got, peak)
		}
		end := int(math.Ceil(s.(*filteredNoise).env.length()*gridRate)) * 1600 / gridRate
		if after := filled(s, 200*1600); largest(after[:end-len(x)]) == 0 || largest(after[end-len(x):]) != 0 {
			t.Error("the motion does not end with its envelope")
		}
	}
}

func TestTrapezoidMotionsStayWhatTheyWere(t *testing.T) {
	// Bits of the motion of seed 7 that versions without a choice of envelope
	// gave: a project's recorded baselines hang on them.
	x := filled(build(t, "filtered-noise", context(1./512, 20, Ground), kind.Values{"peak": kind.Num(3)}), 20*512)
	hash := uint64(14695981039346656037) // FNV-1a, 64 bits, little endian
	for _, v := range x {
		bits := math.Float64bits(v)
		for i := range 8 {
			hash = (hash ^ bits>>(8*i)&0xff) * 1099511628211
		}
	}
	if hash != 0xd24620862117468 {
		t.Errorf("hash %#x", hash)
	}
	for k, bits := range map[int]uint64{100: 0x3f76b8c4370021a1, 1000: 0x3ff6421d5081a954, 9000: 0xbfc028373f0fee08} {
		if x[k] != math.Float64frombits(bits) {
			t.Errorf("sample %d: %v, was %v", k, x[k], math.Float64frombits(bits))
		}
	}
}
