package gauge

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// burst is the base motion of testdata/spectrum.py, m.
func burst(t float64) float64 {
	if t >= 8 {
		return 0
	}
	e := math.Sin(math.Pi * t / 8)
	return e * e * (0.010*math.Sin(2*math.Pi*1.3*t) + 0.002*math.Sin(2*math.Pi*4.1*t))
}

func spectrumOf(tick float64, measured func(t float64) float64) *Spectrum {
	s := NewSpectrum(tick)
	s.Start(0, 0)
	for k := 1; float64(k)*tick < 8; k++ {
		t := float64(k) * tick
		s.Add(burst(t), measured(t))
	}
	return s
}

// Spectra against SciPy's integration of the same oscillators under the exact
// acceleration.
func TestSpectrumAgainstSciPy(t *testing.T) {
	text, err := os.ReadFile("testdata/spectrum.json")
	if err != nil {
		t.Fatal(err)
	}
	var want struct{ Period, Sa []float64 }
	if err := json.Unmarshal(text, &want); err != nil {
		t.Fatal(err)
	}
	worst := map[float64]float64{}
	for _, rate := range []float64{512, 2048} {
		period, sa, _ := spectrumOf(1/rate, burst).Points()
		if len(period) != len(want.Period) {
			t.Fatalf("%d periods, want %d", len(period), len(want.Period))
		}
		for i, p := range period {
			if math.Abs(p-want.Period[i]) > 1e-12 {
				t.Errorf("period %g, want %g", p, want.Period[i])
			}
			// With ω the fastest of motion and oscillator: a displacement that
			// goes straight between ticks has lost sinc²(ω·dt/2), (ω·dt)²/12, of
			// its acceleration, and a peak is seen half a tick off at worst,
			// (ω·dt/2)²/2.
			omega := 2 * math.Pi * max(1/p, 4.1)
			bound := omega * omega / (rate * rate) * (1.0/12 + 1.0/8)
			e := math.Abs(sa[i]/want.Sa[i] - 1)
			worst[rate] = max(worst[rate], e)
			if e > bound {
				t.Errorf("%g Hz, period %g s: Sa %g, want %g, off by %.2g, bound %.2g", rate, p, sa[i], want.Sa[i], e, bound)
			}
		}
	}
	if worst[512] < 4*worst[2048] {
		t.Errorf("no second order: %v", worst)
	}
}

func TestSpectrumError(t *testing.T) {
	const tick = 1.0 / 2048
	if e := spectrumOf(tick, burst).Error(); e != 0 {
		t.Errorf("the same motion differs by %g", e)
	}
	// A gain scales every ordinate alike; a delay alone changes none but by
	// where the ticks fall.
	if e := spectrumOf(tick, func(t float64) float64 { return 0.9 * burst(t) }).Error(); math.Abs(e-0.1) > 1e-12 {
		t.Errorf("gain 0.9: error %g", e)
	}
	late := func(t float64) float64 { return burst(max(0, t-20*tick)) }
	if e := spectrumOf(tick, late).Error(); e > 1e-3 {
		t.Errorf("a late motion differs by %g", e)
	}
	// A table that loses high frequencies shows as an error.
	y := 0.0
	lag := func(t float64) float64 {
		y += (burst(t) - y) * tick / 0.05
		return y
	}
	if e := spectrumOf(tick, lag).Error(); e < 0.1 {
		t.Errorf("a lag of 50 ms differs by %g only", e)
	}
	rest := NewSpectrum(tick)
	rest.Start(0, 0)
	rest.Add(0, 0)
	if e := rest.Error(); !math.IsNaN(e) {
		t.Errorf("at rest: %g", e)
	}
	// At a rate that resolves no period there is nothing to compare.
	if e := spectrumOf(0.5, burst).Error(); !math.IsNaN(e) {
		t.Errorf("at 2 Hz: %g", e)
	}
}

func TestSpectrumAllocatesNothing(t *testing.T) {
	s := NewSpectrum(1.0 / 2048)
	s.Start(0, 0)
	k := 0.0
	if n := testing.AllocsPerRun(1000, func() { k++; s.Add(k, k) }); n != 0 {
		t.Errorf("%g allocations", n)
	}
}

func BenchmarkSpectrum(b *testing.B) {
	s := NewSpectrum(1.0 / 2048)
	s.Start(0, 0)
	for i := range b.N {
		s.Add(float64(i&1023), float64(i&511))
	}
}
