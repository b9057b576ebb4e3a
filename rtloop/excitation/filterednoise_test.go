package excitation

import (
	"math"
	"runtime"
	"slices"
	"testing"

	"antelag/scenarios/kind"
)

func largest(x []float64) float64 {
	return math.Max(slices.Max(x), -slices.Min(x))
}

func TestFilteredNoisePeakIsThatOfTheSettings(t *testing.T) {
	for _, tt := range []struct {
		label    string
		duration float64
		grid     float64 // Hz
		given    kind.Values
	}{
		{"defaults", 30, 200, kind.Values{"peak": kind.Num(2.94)}},
		{"the run ends within the rise", 1.5, 200, kind.Values{"peak": kind.Num(0.02)}},
		{"the run ends between grid instants", 0.0125, 200, kind.Values{"peak": kind.Num(5)}},
		{"turned over", 30, 200, kind.Values{"peak": kind.Num(-2.94)}},
		{"stiff ground", 3, 800, kind.Values{"peak": kind.Num(1), "ground_frequency": kind.Num(20), "rise": kind.Num(1), "strong": kind.Num(1), "decay": kind.Num(0.5)}},
		{"high-pass above the ground", 3, 400, kind.Values{"peak": kind.Num(1), "highpass_frequency": kind.Num(10)}},
		{"no rise", 3, 200, kind.Values{"peak": kind.Num(1), "rise": kind.Num(0), "strong": kind.Num(1), "decay": kind.Num(0)}},
		{"rise and fall only", 3, 200, kind.Values{"peak": kind.Num(1), "strong": kind.Num(0), "decay": kind.Num(0)}},
		{"softest and stiffest", 0.5, 8000, kind.Values{"peak": kind.Num(1), "ground_frequency": kind.Num(0.001), "highpass_frequency": kind.Num(200), "ground_damping": kind.Num(0.01)}},
		{"stiffest and softest", 0.5, 8000, kind.Values{"peak": kind.Num(1), "ground_frequency": kind.Num(200), "highpass_frequency": kind.Num(0.001), "highpass_damping": kind.Num(2)}},
	} {
		for _, d := range []Drives{Ground, Force, Target} {
			// Eight samples to a grid interval, so that every grid instant is
			// met but for rounding, and the end of the run.
			step := 1 / (8 * tt.grid)
			s := build(t, "filtered-noise", context(step, tt.duration, d), tt.given)
			x := filled(s, int(math.Round(tt.duration/step))+1)
			want := math.Abs(tt.given["peak"].Num)
			if got := largest(x); math.Abs(got/want-1) > 1e-12 {
				t.Errorf("%s, %s: peak %v, want %v", tt.label, Words[d], got, want)
			}
		}
	}
}

func TestFilteredNoiseFollowsSeedAndSettingsOnly(t *testing.T) {
	motion := func(seed uint64, d Drives, peak float64) []float64 {
		c := context(1./512, 20, d)
		c.Seed = seed
		return filled(build(t, "filtered-noise", c, kind.Values{"peak": kind.Num(peak)}), 20*512)
	}
	a := motion(1, Ground, 1)
	if !slices.Equal(a, motion(1, Force, 1)) {
		t.Error("the same seed gives another motion")
	}
	turned := motion(1, Ground, -2)
	for k := range a {
		if turned[k] != -2*a[k] {
			t.Fatalf("sample %d: %v is not −2 times %v", k, turned[k], a[k])
		}
	}
	// Motions of other seeds are unrelated: over 10 s of strong motion with
	// a handful of independent values a second the correlation is below 0.5.
	b := motion(2, Ground, 1)
	ab, aa, bb := 0.0, 0.0, 0.0
	for k := range a {
		ab, aa, bb = ab+a[k]*b[k], aa+a[k]*a[k], bb+b[k]*b[k]
	}
	if r := ab / math.Sqrt(aa*bb); math.Abs(r) > 0.5 {
		t.Errorf("seeds 1 and 2 are correlated by %g", r)
	}
}

func TestFilteredNoiseStandsUnderItsEnvelope(t *testing.T) {
	// The mean square over many seeds at chosen instants, against e(t)²·σ²
	// with σ² the mean at full strength. All scaled back by the common peak
	// of each seed, so that only the envelope is left.
	const seeds = 400
	settings := kind.Values{"peak": kind.Num(1), "rise": kind.Num(1), "strong": kind.Num(0.5), "decay": kind.Num(2)}
	at := []float64{0, 0.25, 0.5, 0.75, 1, 1.25, 1.5, 2, 2.5, 3, 3.25, 3.5, 3.75}
	want := []float64{0, 0.25, 0.5, 0.75, 1, 1, 1, 0.75, 0.5, 0.25, 0.125, 0, 0}
	sums := make([]float64, len(at))
	for seed := range uint64(seeds) {
		c := context(0.25, 4, Ground)
		c.Seed = seed
		s := build(t, "filtered-noise", c, settings)
		x := filled(s, 16)
		for i, t := range at {
			v := x[int(t*4)] / s.(*filteredNoise).scale
			sums[i] += v * v
		}
	}
	full := processVariance()
	for i := range at {
		got := sums[i] / seeds
		// A mean of 400 squares of normals scatters by √(2/400) = 7 %; four
		// times that.
		if e := want[i] * want[i] * full; math.Abs(got-e) > 4*math.Sqrt(2./seeds)*e {
			t.Errorf("at %g s: mean square %v, want %v", at[i], got, e)
		}
	}
}

// processVariance is the variance of the process at default settings by integrating its
// closed-form density, in the units of groundProcess.
func processVariance() float64 {
	sum := 0.0
	const h = 0.001
	for w := h / 2; w < 400; w += h {
		sum += 2 * cloughPenzien(w, 1, 0.6, 0.1, 0.6) / (2 * math.Pi) * h
	}
	return sum + 2*1.2*1.2/400/(2*math.Pi) // the density's tail falls as (1.2/ω)²
}

func TestFilteredNoiseIsLinearBetweenItsGridInstants(t *testing.T) {
	s := build(t, "filtered-noise", context(1./3200, 5, Ground), kind.Values{"peak": kind.Num(1)})
	x := filled(s, 5*3200)
	bends := 0
	for k := 1; k < len(x)-1; k++ {
		bend := math.Abs(x[k-1] - 2*x[k] + x[k+1])
		if k%16 == 0 && bend > 1e-9 {
			bends++
		} else if k%16 != 0 && bend > 1e-13 {
			t.Fatalf("the motion bends by %g between grid instants, at sample %d", bend, k)
		}
	}
	if bends < 900 {
		t.Errorf("only %d of 999 grid instants show a bend", bends)
	}
}

func TestFilteredNoiseStreamsInConstantMemory(t *testing.T) {
	// A run 12 times as long, all of it strong motion, allocates no more.
	allocated := func(duration float64, fills int) uint64 {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		s := build(t, "filtered-noise", context(0.1, duration, Ground), kind.Values{"peak": kind.Num(3), "strong": kind.Num(duration - 10)})
		buf := make([]float64, 1000)
		for range fills {
			s.Fill(buf)
		}
		runtime.ReadMemStats(&after)
		return after.TotalAlloc - before.TotalAlloc
	}
	short, long := allocated(100, 1), allocated(1200, 12)
	if long > short+10000 {
		t.Errorf("100 s take %d bytes, 1200 s %d", short, long)
	}
}

func TestFilteredNoiseEndsWithItsEnvelope(t *testing.T) {
	s := build(t, "filtered-noise", context(0.01, 86400, Ground), kind.Values{"peak": kind.Num(3)})
	x := filled(s, 4000)
	if largest(x[1990:2000]) == 0 || largest(x[2000:]) != 0 {
		t.Error("the motion does not end at 20 s")
	}
}

func TestTrapezoid(t *testing.T) {
	for _, tt := range []struct {
		e       trapezoid
		t, want float64
	}{
		{trapezoid{2, 10, 8}, 0, 0}, {trapezoid{2, 10, 8}, 0.5, 0.25}, {trapezoid{2, 10, 8}, 2, 1},
		{trapezoid{2, 10, 8}, 12, 1}, {trapezoid{2, 10, 8}, 18, 0.25}, {trapezoid{2, 10, 8}, 20, 0}, {trapezoid{2, 10, 8}, 21, 0},
		{trapezoid{0, 1, 0}, 0, 1}, {trapezoid{0, 1, 0}, 1, 1}, {trapezoid{0, 1, 0}, 1.001, 0},
		{trapezoid{0, 0, 4}, 0, 1}, {trapezoid{0, 0, 4}, 1, 0.75}, {trapezoid{1, 0, 0}, 0.5, 0.5}, {trapezoid{1, 0, 0}, 2, 0},
	} {
		if got := tt.e.at(tt.t); got != tt.want {
			t.Errorf("%v at %g: %v, want %v", tt.e, tt.t, got, tt.want)
		}
	}
}
