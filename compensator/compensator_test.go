package compensator

import (
	"encoding/csv"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"slices"
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
		name := nameValue[i].(string)
		switch x := nameValue[i+1].(type) {
		case int:
			v[name] = kind.Num(float64(x))
		case float64:
			v[name] = kind.Num(x)
		case string:
			v[name] = kind.Text(x)
		}
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

// variant is a kind with settings under which it is another method.
type variant struct {
	kind string
	set  []any
}

func (v variant) String() string {
	if len(v.set) == 0 {
		return v.kind
	}
	return fmt.Sprintf("%s %v", v.kind, v.set)
}

func (v variant) build(t testing.TB, tick float64, nameValue ...any) Compensator {
	t.Helper()
	return build(t, tick, v.kind, v.with(nameValue...)...)
}

func (v variant) with(nameValue ...any) []any { return append(slices.Clone(v.set), nameValue...) }

// adaptive is every method that adapts.
var adaptive = []variant{
	{"least-squares-polynomial", []any{"adapt", "delay"}},
	{"least-squares-polynomial", []any{"adapt", "delay-and-amplitude"}},
	{"delay-seeking", nil},
	{"adaptive-inverse", nil},
	{"adaptive-time-series", nil},
}

// variants is every kind with its defaults, and what other settings make of it.
func variants() []variant {
	all := []variant{{"model-inverse", []any{"order", 3}}}
	for _, name := range Kinds.Names() {
		all = append(all, variant{name, nil})
	}
	for _, v := range adaptive {
		if v.set != nil {
			all = append(all, v)
		}
	}
	return all
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

func TestKindsStandInTheirOrder(t *testing.T) {
	want := []string{"none", "polynomial", "linear-acceleration", "taylor", "model-inverse", "inverse",
		"least-squares-polynomial", "delay-seeking", "adaptive-inverse", "adaptive-time-series"}
	if got := Kinds.Names(); !slices.Equal(got, want) {
		t.Errorf("kinds %v, want %v", got, want)
	}
}

func TestEverySettingBuildsOrNamesItselfAtBothEndsOfItsRange(t *testing.T) {
	for _, variant := range variants() {
		e, err := Kinds.Find(variant.kind)
		if err != nil {
			t.Fatal(err)
		}
		for _, rate := range []float64{128, 2048, 10000} {
			in := inputs(200, 1/rate, 0.02)
			for _, s := range e.Settings {
				var values []kind.Value
				switch {
				case s.Type == kind.WordType:
					for _, word := range s.Words {
						values = append(values, kind.Text(word))
					}
				case math.IsInf(s.Min, 0) || math.IsInf(s.Max, 0) || !s.HasDefault():
					t.Errorf("%s.%s has no range or no default", e.Name, s.Name)
				default:
					values = append(values, kind.Num(s.Min), kind.Num(s.Max))
				}
				for _, x := range values {
					what := fmt.Sprintf("%v at %v Hz with %s = %s", variant, rate, s.Name, s.FormatValue(x))
					v := given(t, variant.kind, variant.set...)
					v[s.Name] = x
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
		{"linear-acceleration", "delay", 0.6, "delay: 600 ms is above 500 ms"},
		{"taylor", "delay", math.Inf(1), "delay: +Inf is no finite number"},
		{"model-inverse", "order", 4, "order: 4 is above 3"},
		{"model-inverse", "order", 0, "order: 0 is below 1"},
		{"model-inverse", "gain", 0, "gain: 0 is below 0.5"},
		{"model-inverse", "lag", -0.001, "lag: -1 ms is below 0"},
		{"least-squares-polynomial", "order", 6, "order: 6 is above 5"},
		{"least-squares-polynomial", "points", 2, "points: 2 is not above order, 2"},
		{"least-squares-polynomial", "points", 201, "points: 201 is above 200"},
		{"least-squares-polynomial", "amplitude_min", 1.1, "amplitude_min: 1.1 is above 1"},
		{"delay-seeking", "order", 5, "order: 5 is above 4"},
		{"delay-seeking", "rate", 21, "rate: 21 Hz is above 20 Hz"},
		{"delay-seeking", "speed_floor", 0, "speed_floor: 0 "},
		{"delay-seeking", "delay_min", 0.02, "delay: 10 ms is below delay_min, 20 ms"},
		{"delay-seeking", "delay", 0.06, "delay: 60 ms is above delay_max, 50 ms"},
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
	// A delay out of the bounds matters only where it adapts.
	wild := []any{"delay", 0.1, "adapt", "off"}
	build(t, tick, "least-squares-polynomial", wild...)
	wild[3] = "delay"
	if _, err := newLeastSquaresPolynomial(tick, given(t, "least-squares-polynomial", wild...)); err == nil ||
		!strings.HasPrefix(err.Error(), "delay: 100 ms is above delay_max, 50 ms") {
		t.Errorf("a delay above its bound: error %v", err)
	}
	word := given(t, "least-squares-polynomial")
	word["adapt"] = kind.Text("dely")
	if _, err := newLeastSquaresPolynomial(tick, word); err == nil ||
		!strings.HasPrefix(err.Error(), `adapt: unknown word "dely"; did you mean "delay"?`) {
		t.Errorf("an unknown word: error %v", err)
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
	for _, v := range variants() {
		c := v.build(t, 1.0/2048)
		for _, in := range inputs(3000, 1.0/2048, 0.02) {
			c.Command(in) // a past to be forgotten
		}
		for _, x := range []float64{0, 0.0173, -2.5} {
			c.Start(x, x)
			for k := range 5000 {
				// Every method has unit gain at rest with default settings.
				// 1e-13: weights as large as 40 (here 1+τ/dt) round at 1e-16.
				if u := c.Command(Input{X: x, Y: x}); math.Abs(u-x) > 1e-13*math.Abs(x) {
					t.Fatalf("%s at rest at %v: command %v in tick %d", v, x, u, k)
				}
			}
		}
	}
	c := build(t, 1.0/2048, "adaptive-time-series", "gain", 0.8)
	c.Start(0.02, 0.02)
	for range 5000 {
		if u := c.Command(Input{X: 0.02, Y: 0.02}); math.Abs(u-0.025) > 1e-15 {
			t.Fatalf("gain 0.8 at rest at 20 mm: command %v, want 25 mm", u)
		}
	}
}

func TestStartForgetsThePast(t *testing.T) {
	for _, v := range variants() {
		used, fresh := v.build(t, 1.0/1024), v.build(t, 1.0/1024)
		for _, in := range inputs(4000, 1.0/1024, 0.02) {
			used.Command(in)
		}
		used.Start(0, 0)
		for k, in := range inputs(4000, 1.0/1024, 0.02) {
			if a, b := used.Command(in), fresh.Command(in); a != b {
				t.Fatalf("%s: tick %d after Start gives %v, a new one %v", v, k, a, b)
			}
		}
	}
}

func TestRetuneWithTheSameSettingsChangesNoBit(t *testing.T) {
	for _, v := range variants() {
		a, b := v.build(t, 1.0/1024), v.build(t, 1.0/1024)
		for k, in := range inputs(5000, 1.0/1024, 0.025) {
			if k%77 == 0 {
				if err := b.Retune(given(t, v.kind, v.set...)); err != nil {
					t.Fatal(err)
				}
			}
			if ua, ub := a.Command(in), b.Command(in); ua != ub {
				t.Fatalf("%s: command %v in tick %d, retuned %v", v, ua, k, ub)
			}
		}
	}
}

func TestTheTickAllocatesNothing(t *testing.T) {
	in := inputs(4096, 1.0/1024, 0.02)
	for _, v := range variants() {
		c := v.build(t, 1.0/1024)
		dst := make([]Coefficient, 0, 32)
		k := 0
		allocs := testing.AllocsPerRun(4000, func() {
			c.Command(in[k&4095])
			dst = c.Coefficients(dst[:0])
			k++
		})
		if allocs != 0 {
			t.Errorf("%s allocates %v times a tick", v, allocs)
		}
	}
}

var sink float64

func BenchmarkCommand(b *testing.B) {
	in := inputs(256, 1.0/2048, 0.014)
	for _, v := range variants() {
		c := v.build(b, 1.0/2048)
		name := v.kind
		if len(v.set) > 0 {
			name += fmt.Sprintf("-%v", v.set[1])
		}
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			sum := 0.0
			for k := range b.N {
				sum += c.Command(in[k&255])
			}
			sink = sum
		})
	}
}
