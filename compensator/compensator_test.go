package compensator

import (
	"encoding/csv"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

// given writes settings as name, value, name, value.
func given(t testing.TB, name string, nameValue ...any) kind.Values {
	t.Helper()
	e, err := Kinds.Find(name)
	if err != nil {
		t.Fatal(err)
	}
	v := kind.Values{}
	for i := 0; i < len(nameValue); i += 2 {
		n := nameValue[i+1]
		if whole, ok := n.(int); ok {
			n = float64(whole)
		}
		v[nameValue[i].(string)] = kind.Num(n.(float64))
	}
	v, err = e.Resolve(v)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// build makes a compensator of that kind with the given settings.
func build(t testing.TB, tick float64, name string, nameValue ...any) Compensator {
	t.Helper()
	e, err := Kinds.Find(name)
	if err != nil {
		t.Fatal(err)
	}
	c, err := e.New(tick, given(t, name, nameValue...))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// value finds a coefficient by name.
func value(t testing.TB, c Compensator, name string) float64 {
	t.Helper()
	for _, q := range c.Coefficients(nil) {
		if q.Name == name {
			return q.Value
		}
	}
	t.Fatalf("%T has no coefficient %q", c, name)
	return 0
}

// columns reads a CSV of numbers with a header into one slice per column.
func columns(t testing.TB, file string) map[string][]float64 {
	t.Helper()
	f, err := os.Open("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]float64{}
	for _, r := range rows[1:] {
		for i, text := range r {
			x, err := strconv.ParseFloat(text, 64)
			if err != nil {
				t.Fatal(err)
			}
			out[rows[0][i]] = append(out[rows[0][i]], x)
		}
	}
	return out
}

// motion is a smooth target with its derivatives: sines of 0.7, 1.9 and
// 3.1 Hz, zero at t = 0, up to about 40 mm.
func motion(t float64) (x, v, a float64) {
	for _, s := range []struct{ amplitude, f, phase float64 }{{0.02, 0.7, 0.4}, {0.01, 1.9, 1}, {0.006, 3.1, 2}} {
		w := 2 * math.Pi * s.f
		sin, cos := math.Sincos(w*t + s.phase)
		x += s.amplitude * (sin - math.Sin(s.phase))
		v += s.amplitude * w * cos
		a -= s.amplitude * w * w * sin
	}
	return x, v, a
}

// inputs makes the inputs of a run in which the actuator follows the target
// late by so many seconds, with a little noise.
func inputs(n int, tick, late float64) []Input {
	rng := rand.New(rand.NewPCG(3, 4))
	in := make([]Input, n)
	for k := range in {
		t := float64(k) * tick
		in[k].X, in[k].V, in[k].A = motion(t + tick)
		in[k].Y, _, _ = motion(max(0, t-late))
		in[k].Y += 1e-5 * rng.NormFloat64()
	}
	return in
}

func TestEverySettingBuildsOrNamesItselfAtBothEndsOfItsRange(t *testing.T) {
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		for _, rate := range []float64{128, 2048, 10000} {
			in := inputs(200, 1/rate, 0.02)
			for _, s := range e.Settings {
				if s.Type != kind.NumberType && s.Type != kind.IntegerType {
					continue
				}
				if math.IsInf(s.Min, 0) || math.IsInf(s.Max, 0) || !s.HasDefault() {
					t.Errorf("%s.%s has no range or no default", e.Name, s.Name)
					continue
				}
				for _, x := range []float64{s.Min, s.Max} {
					what := fmt.Sprintf("%s at %v Hz with %s = %v", e.Name, rate, s.Name, x)
					v, err := e.Resolve(kind.Values{s.Name: kind.Num(x)})
					if err != nil {
						t.Fatalf("%s: %v", what, err)
					}
					c, err := e.New(1/rate, v)
					if err != nil {
						if !strings.Contains(err.Error(), s.Name) {
							t.Errorf("%s: the error does not name the setting: %v", what, err)
						}
						continue
					}
					for k := range in {
						if u := c.Command(in[k]); math.IsNaN(u) || math.IsInf(u, 0) {
							t.Fatalf("%s: command %v in tick %d", what, u, k)
						}
					}
				}
			}
		}
	}
}

func TestDefaultsBuildAtUsualRates(t *testing.T) {
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		for _, rate := range []float64{128, 256, 1000, 1024, 2048, 4096, 20000} {
			v, err := e.Resolve(nil)
			if err != nil {
				t.Fatal(err)
			}
			if _, err := e.New(1/rate, v); err != nil {
				t.Errorf("%s at %v Hz: %v", e.Name, rate, err)
			}
		}
		if e.Doc == "" || e.Equation == "" || e.Source == "" {
			t.Errorf("%s lacks doc, equation or source", e.Name)
		}
	}
}

func TestBadSettingsAreRefusedByNameAndChangeNothing(t *testing.T) {
	const tick = 1.0 / 1024
	for _, test := range []struct {
		kind    string
		setting string
		value   float64
		want    string
	}{
		{"polynomial", "order", 5, "order: 5 is above 4"},
		{"polynomial", "order", 1.5, "order: 1.5 is not a whole number"},
		{"polynomial", "delay", -0.001, "delay: -1 ms is below 0"},
		{"polynomial", "delay", math.NaN(), "delay: NaN is no finite number"},
		{"inverse", "delay", 0.6, "delay: 600 ms is above 500 ms"},
		{"adaptive-inverse", "kp", -1, "kp: "},
		{"adaptive-inverse", "delay_min", 0.06, "delay_min: 60 ms is above delay_max, 50 ms"},
		{"adaptive-inverse", "delay", 0.06, "delay: 60 ms is above delay_max, 50 ms"},
		{"adaptive-inverse", "delay_min", 0.02, "delay: 10 ms is below delay_min, 20 ms"},
		{"adaptive-time-series", "gain", 2, "gain: 2 makes a₀ = 1/gain smaller than amplitude_min, 0.7"},
		{"adaptive-time-series", "gain", 0.5, "gain: 0.5 makes a₀ = 1/gain larger than amplitude_max, 1.4"},
		{"adaptive-time-series", "amplitude_min", 2, "amplitude_min: 2 is above amplitude_max, 1.4"},
		{"adaptive-time-series", "window", 0, "window: 0 s is below 50 ms"},
		{"adaptive-time-series", "cutoff", 600, "cutoff: 600 Hz is above 500 Hz"},
		{"adaptive-time-series", "delay", 0.07, "delay: 70 ms is above delay_max, 60 ms"},
	} {
		e, err := Kinds.Find(test.kind)
		if err != nil {
			t.Fatal(err)
		}
		good, bad := given(t, test.kind), given(t, test.kind)
		bad[test.setting] = kind.Num(test.value)
		if _, err := e.New(tick, bad); err == nil || !strings.HasPrefix(err.Error(), test.want) {
			t.Errorf("%s with %s = %v: error %v, want %q", test.kind, test.setting, test.value, err, test.want)
		}
		a, _ := e.New(tick, good)
		b, _ := e.New(tick, good)
		for k, in := range inputs(600, tick, 0.02) {
			if k == 300 && b.Retune(bad) == nil {
				t.Errorf("%s: Retune takes %s = %v", test.kind, test.setting, test.value)
			}
			if ua, ub := a.Command(in), b.Command(in); ua != ub {
				t.Fatalf("%s: a refused Retune changed the command in tick %d", test.kind, k)
			}
		}
	}
	for _, tick := range []float64{0, -1, 1e-9, math.NaN(), math.Inf(1)} {
		for i := range Kinds.Entries {
			e := &Kinds.Entries[i]
			if _, err := e.New(tick, given(t, e.Name)); err == nil || !strings.HasPrefix(err.Error(), "tick: ") {
				t.Errorf("%s with a tick of %v s: error %v", e.Name, tick, err)
			}
		}
	}
	if _, err := newPolynomial(tick, kind.Values{}); err == nil || !strings.HasPrefix(err.Error(), "order: no value") {
		t.Errorf("unresolved settings: error %v", err)
	}
	slow := given(t, "adaptive-time-series", "window", 0.05)
	if _, err := newAdaptiveTimeSeries(0.01, slow); err == nil || !strings.HasPrefix(err.Error(), "window: ") {
		t.Errorf("a window of 5 ticks: error %v", err)
	}
	if _, err := newAdaptiveTimeSeries(0.025, given(t, "adaptive-time-series")); err == nil || !strings.HasPrefix(err.Error(), "cutoff: ") {
		t.Errorf("a cutoff of half the rate: error %v", err)
	}
}

func TestAtRestTheCommandIsTheTarget(t *testing.T) {
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		c := build(t, 1.0/2048, e.Name)
		for _, in := range inputs(3000, 1.0/2048, 0.02) {
			c.Command(in) // a past to be forgotten
		}
		for _, x := range []float64{0, 0.0173, -2.5} {
			c.Start(x)
			for k := range 5000 {
				// Every method has unit gain at rest with default settings.
				// 1e-13: weights as large as 40 (here 1+τ/dt) round at 1e-16.
				if u := c.Command(Input{X: x, Y: x}); math.Abs(u-x) > 1e-13*math.Abs(x) {
					t.Fatalf("%s at rest at %v: command %v in tick %d", e.Name, x, u, k)
				}
			}
		}
	}
	c := build(t, 1.0/2048, "adaptive-time-series", "gain", 0.8)
	c.Start(0.02)
	for range 5000 {
		if u := c.Command(Input{X: 0.02, Y: 0.02}); math.Abs(u-0.025) > 1e-15 {
			t.Fatalf("gain 0.8 at rest at 20 mm: command %v, want 25 mm", u)
		}
	}
}

func TestStartForgetsThePast(t *testing.T) {
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		used, fresh := build(t, 1.0/1024, e.Name), build(t, 1.0/1024, e.Name)
		for _, in := range inputs(4000, 1.0/1024, 0.02) {
			used.Command(in)
		}
		used.Start(0)
		for k, in := range inputs(4000, 1.0/1024, 0.02) {
			if a, b := used.Command(in), fresh.Command(in); a != b {
				t.Fatalf("%s: tick %d after Start gives %v, a new one %v", e.Name, k, a, b)
			}
		}
	}
}

func TestRetuneWithTheSameSettingsChangesNoBit(t *testing.T) {
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		a, b := build(t, 1.0/1024, e.Name), build(t, 1.0/1024, e.Name)
		for k, in := range inputs(5000, 1.0/1024, 0.025) {
			if k%77 == 0 {
				if err := b.Retune(given(t, e.Name)); err != nil {
					t.Fatal(err)
				}
			}
			if ua, ub := a.Command(in), b.Command(in); ua != ub {
				t.Fatalf("%s: command %v in tick %d, retuned %v", e.Name, ua, k, ub)
			}
		}
	}
}

func TestTheTickAllocatesNothing(t *testing.T) {
	in := inputs(4096, 1.0/1024, 0.02)
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		c := build(t, 1.0/1024, e.Name)
		dst := make([]Coefficient, 0, 32)
		k := 0
		allocs := testing.AllocsPerRun(4000, func() {
			c.Command(in[k&4095])
			dst = c.Coefficients(dst[:0])
			k++
		})
		if allocs != 0 {
			t.Errorf("%s allocates %v times a tick", e.Name, allocs)
		}
	}
}

var sink float64

func BenchmarkCommand(b *testing.B) {
	in := inputs(256, 1.0/2048, 0.014)
	for i := range Kinds.Entries {
		e := &Kinds.Entries[i]
		c := build(b, 1.0/2048, e.Name)
		b.Run(e.Name, func(b *testing.B) {
			b.ReportAllocs()
			sum := 0.0
			for k := range b.N {
				sum += c.Command(in[k&255])
			}
			sink = sum
		})
	}
}
