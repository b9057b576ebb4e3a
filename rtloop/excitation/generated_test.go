package excitation

import (
	"math"
	"testing"

	"antelag/scenarios/kind"
)

func TestSineEqualsItsClosedForm(t *testing.T) {
	c := context(1./1024, 100, Force)
	x := filled(build(t, "sine", c, kind.Values{"amplitude": kind.Num(-3), "frequency": kind.Num(2.5)}), 4096)
	for k, got := range x {
		// 2.5/1024·k is exact in float64, so k mod the period of 2048 samples
		// (five cycles) is too; what is left is the rounding of one sine.
		want := -3 * math.Sin(2*math.Pi*2.5*float64(k%2048)/1024)
		if math.Abs(got-want) > 3e-14 {
			t.Fatalf("sample %d: %v, want %v", k, got, want)
		}
	}
}

func TestSineKeepsItsPhaseOverADay(t *testing.T) {
	// 12.5 cycles a second, one sample a quarter second: 3.125 cycles apart,
	// so the samples repeat the eighths of a circle for the whole day.
	c := context(0.25, 86400, Target)
	s := build(t, "sine", c, kind.Values{"amplitude": kind.Num(1), "frequency": kind.Num(12.5)})
	for k, got := range filled(s, 4*86400) {
		if want := math.Sin(2 * math.Pi * float64(k%8) / 8); math.Abs(got-want) > 1e-15 {
			t.Fatalf("sample %d: %v, want %v", k, got, want)
		}
	}
}

// frequencies measures the frequency of a motion between its upward zero
// crossings, each found by a straight line between samples: the middle of
// each cycle, s, and 1/period, Hz.
func frequencies(x []float64, step float64) (at, hz []float64) {
	before := math.NaN()
	for k := 1; k < len(x); k++ {
		if x[k-1] < 0 && x[k] >= 0 {
			now := (float64(k-1) + x[k-1]/(x[k-1]-x[k])) * step
			if !math.IsNaN(before) {
				at, hz = append(at, (now+before)/2), append(hz, 1/(now-before))
			}
			before = now
		}
	}
	return at, hz
}

func TestSweepRunsThroughItsFrequencies(t *testing.T) {
	const duration = 40.0
	for _, tt := range []struct {
		law      string
		from, to float64
		want     func(t float64) float64
	}{
		{"linear", 1, 12, func(t float64) float64 { return 1 + 11*t/duration }},
		{"linear", 12, 1, func(t float64) float64 { return 12 - 11*t/duration }},
		{"log", 1, 16, func(t float64) float64 { return math.Pow(16, t/duration) }},
		{"log", 16, 1, func(t float64) float64 { return 16 * math.Pow(16, -t/duration) }},
		{"log", 3, 3, func(float64) float64 { return 3 }},
		{"log", 3, 3 * (1 + 1e-12), func(float64) float64 { return 3 }},
	} {
		const step = 1. / 8192
		s := build(t, "sweep", context(step, duration, Target), kind.Values{"amplitude": kind.Num(0.02),
			"from": kind.Num(tt.from), "to": kind.Num(tt.to), "law": kind.Text(tt.law)})
		at, hz := frequencies(filled(s, int(duration/step)+1), step)
		if len(at) < 50 {
			t.Fatalf("%s %g to %g: only %d cycles", tt.law, tt.from, tt.to, len(at))
		}
		for i := range at {
			// The crossings are good to 1e-8 of a period. Over a cycle p a linear
			// sweep's mean frequency is that of the middle; a log sweep's is
			// larger by (λp)²/24, λ = ln(f1/f0)/D, plus higher powers.
			want := tt.want(at[i])
			excess := 0.0
			if tt.law == "log" {
				lambda := math.Log(tt.to/tt.from) / duration
				excess = math.Pow(lambda/want, 2) / 24
			}
			if math.Abs(hz[i]/want-1-excess) > 1e-6 {
				t.Errorf("%s %g to %g: %g Hz at %g s, want %g", tt.law, tt.from, tt.to, hz[i], at[i], want)
			}
		}
	}
}

func TestSweepPhaseIsTheIntegralOfItsFrequency(t *testing.T) {
	// ∫f dt by Simpson's rule on 2·8192 intervals: error below 1e-12 cycles.
	const duration, n = 10.0, 8192
	for law, f := range map[string]func(t float64) float64{
		"linear": func(t float64) float64 { return 0.5 + 4.5*t/duration },
		"log":    func(t float64) float64 { return 0.5 * math.Exp(math.Log(10)*t/duration) },
	} {
		s := build(t, "sweep", context(duration/n, duration, Target), kind.Values{"amplitude": kind.Num(1),
			"from": kind.Num(0.5), "to": kind.Num(5), "law": kind.Text(law)})
		cycles := 0.0
		for k, got := range filled(s, n+1) {
			a := float64(k) * duration / n
			if want := math.Sin(2 * math.Pi * cycles); math.Abs(got-want) > 1e-10 {
				t.Fatalf("%s: sample %d is %v, want %v", law, k, got, want)
			}
			h := duration / n
			cycles += h / 6 * (f(a) + 4*f(a+h/2) + f(a+h))
		}
	}
}

func TestPulseIsHalfASine(t *testing.T) {
	x := filled(build(t, "pulse", context(1./64, 2, Ground), kind.Values{"amplitude": kind.Num(4), "width": kind.Num(0.5)}), 128)
	for k, got := range x {
		want := 0.0
		if k < 32 {
			want = 4 * math.Sin(math.Pi*float64(k)/32)
		}
		if math.Abs(got-want) > 1e-15 || k >= 32 && got != 0 {
			t.Errorf("sample %d: %v, want %v", k, got, want)
		}
	}
	if x[16] != 4 {
		t.Errorf("the middle is %v, want the amplitude 4", x[16])
	}
}

func TestReleaseHoldsALevelAndIsStill(t *testing.T) {
	for _, level := range []int{0, 1, 3} {
		s := build(t, "release", context(0.001, 2, Ground), kind.Values{"amplitude": kind.Num(-0.04), "level": kind.Num(float64(level))})
		r, ok := s.(Release)
		if !ok {
			t.Fatal("it is no Release")
		}
		if d, l := r.Initial(); d != -0.04 || l != level {
			t.Errorf("initial displacement %v at level %d, want -0.04 at %d", d, l, level)
		}
		x := []float64{1, 2, 3}
		s.Fill(x)
		if x[0] != 0 || x[1] != 0 || x[2] != 0 {
			t.Errorf("samples %v, want zeros", x)
		}
	}
	for d, want := range map[Drives]string{
		Force:  `drives: release holds a level and lets it go, with drives = "ground" only, not "force"`,
		Target: `drives: release holds a level and lets it go, with drives = "ground" only, not "target"`,
	} {
		_, err := try("release", context(0.001, 2, d), kind.Values{"amplitude": kind.Num(1)})
		if err == nil || err.Error() != want {
			t.Errorf("got %v, want %s", err, want)
		}
	}
}

func TestGeneratedKindsCheckTheirSettings(t *testing.T) {
	for _, tt := range []struct {
		kind  string
		given kind.Values
		want  string
	}{
		{"sine", kind.Values{"amplitude": kind.Num(1)}, "frequency: is missing; sine needs it: frequency f, a frequency (Hz), 0.001 Hz to 200 Hz"},
		{"sine", kind.Values{"frequency": kind.Num(1)}, "amplitude: is missing; sine needs it: amplitude A; a negative one starts downward, an amplitude of what is driven"},
		{"sine", kind.Values{"amplitude": kind.Num(1), "frequency": kind.Num(201)}, "frequency: 201 Hz is above 200 Hz; allowed is a frequency (Hz), 0.001 Hz to 200 Hz"},
		{"sweep", kind.Values{"amplitude": kind.Num(1), "from": kind.Num(0), "to": kind.Num(1)}, "from: 0 Hz is below 0.001 Hz; allowed is a frequency (Hz), 0.001 Hz to 200 Hz"},
		{"pulse", kind.Values{"amplitude": kind.Num(1), "width": kind.Num(0)}, "width: 0 s is below 0.1 ms; allowed is a time (s), 0.1 ms to 86400 s"},
		{"filtered-noise", kind.Values{}, "peak: is missing; filtered-noise needs it: largest absolute value of the whole history; a negative one turns it over, an amplitude of what is driven"},
		{"filtered-noise", kind.Values{"peak": kind.Num(1), "rise": kind.Num(0), "strong": kind.Num(0), "decay": kind.Num(0)},
			"strong: rise, strong and decay are all zero, so nothing would move"},
	} {
		if _, err := try(tt.kind, context(0.001, 2, Ground), tt.given); err == nil || err.Error() != tt.want {
			t.Errorf("%s: got  %v\nwant %s", tt.kind, err, tt.want)
		}
	}
}
