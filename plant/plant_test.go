package plant

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

// num makes the values of plain numbers.
func num(pairs map[string]float64) kind.Values {
	v := make(kind.Values, len(pairs))
	for name, x := range pairs {
		v[name] = kind.Num(x)
	}
	return v
}

type set = map[string]float64

func makeActuator(name string, t Timing, given set) (Actuator, error) {
	e, err := Actuators.Find(name)
	if err != nil {
		return nil, err
	}
	v, err := e.Resolve(num(given))
	if err != nil {
		return nil, err
	}
	return e.New(t, v)
}

func actuator(t testing.TB, name string, timing Timing, given set) Actuator {
	t.Helper()
	a, err := makeActuator(name, timing, given)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func makeElement(name string, given set) (Element, error) {
	e, err := Elements.Find(name)
	if err != nil {
		return nil, err
	}
	v, err := e.Resolve(num(given))
	if err != nil {
		return nil, err
	}
	return e.New(v)
}

func element(t testing.TB, name string, given set) Element {
	t.Helper()
	e, err := makeElement(name, given)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// load reads vectors; what made them stands beside them.
func load(t *testing.T, file string, into any) {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, into); err != nil {
		t.Fatalf("%s: %v", file, err)
	}
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: got %.17g, want %.17g within %.3g (off by %.3g)", what, got, want, tolerance, got-want)
	}
}

// same holds two numbers to be the same bits.
func same(got, want float64) bool { return math.Float64bits(got) == math.Float64bits(want) }

// sampled is the frequency response, at the ticks, of a system G behind a ramp
// that joins the samples of a sine of angular frequency w. The ramp is the
// sampled sine convolved with a triangle two ticks wide, so it holds the sine
// and all its aliases w + mΩ, Ω = 2π/h, each with the factor
// sinc²((w + mΩ)·h/2); at the ticks all of them look like w.
func sampled(w, h float64, most int, g func(s complex128) complex128) complex128 {
	sum := complex(0, 0)
	for m := -most; m <= most; m++ {
		wm := w + 2*math.Pi*float64(m)/h
		sinc := math.Sin(wm*h/2) / (wm * h / 2)
		sum += complex(sinc*sinc, 0) * g(complex(0, wm))
	}
	return sum
}

// measure returns the frequency response that step shows at its outputs, once
// a tick: q periods of a sine in count ticks, after settle ticks of it.
func measure(q, count, settle int, step func(u float64) float64) complex128 {
	turn := 2 * math.Pi * float64(q) / float64(count)
	var in, out complex128
	for k := 1; k <= settle+count; k++ {
		phase := turn * float64(k%count)
		u := math.Sin(phase)
		y := step(u)
		if k > settle {
			back := cmplx.Rect(1, -phase)
			in += complex(u, 0) * back
			out += complex(y, 0) * back
		}
	}
	return out / in
}

func TestEveryKindIsDescribed(t *testing.T) {
	kinds := append(Actuators.Kinds(), Elements.Kinds()...)
	for _, k := range append(kinds, &SensorSettings) {
		if k.Name == "" || k.Doc == "" || k.Equation == "" || k.Source == "" || strings.Contains(k.Doc, "\n") {
			t.Errorf("%q: name, one line of doc, equation and source must be there: %+v", k.Name, k)
		}
		seen := map[string]bool{}
		for _, s := range k.Settings {
			if s.Doc == "" || seen[s.Name] {
				t.Errorf("%s.%s: no doc, or named twice", k.Name, s.Name)
			}
			seen[s.Name] = true
			if s.HasDefault() && s.Check(s.Fallback) != nil {
				t.Errorf("%s.%s: its default is bad: %v", k.Name, s.Name, s.Check(s.Fallback))
			}
			if math.IsInf(s.Min, 0) || math.IsInf(s.Max, 0) {
				t.Errorf("%s.%s: no sensible range", k.Name, s.Name)
			}
		}
	}
}

// middle is a value well inside the range of a setting.
func middle(s kind.Setting) float64 {
	if s.Min > 0 {
		return math.Sqrt(s.Min * s.Max)
	}
	return s.Max / 2
}

func TestEveryKindBuildsFromItsRequiredSettings(t *testing.T) {
	required := func(k kind.Kind) set {
		given := set{}
		for _, s := range k.Settings {
			if s.IsRequired() {
				given[s.Name] = middle(s)
			}
		}
		return given
	}
	for _, e := range Actuators.Entries {
		actuator(t, e.Name, Timing{Tick: 1.0 / 2048}, required(e.Kind))
	}
	for _, e := range Elements.Entries {
		given := required(e.Kind)
		if e.Name == "viscous" || e.Name == "maxwell" { // need one of two sets of settings, so none is required
			given["damping"] = 1e5
		}
		element(t, e.Name, given)
	}
	v, err := SensorSettings.Resolve(num(required(SensorSettings)))
	if err != nil {
		t.Fatal(err)
	}
	for _, prefix := range []string{"displacement", "force"} {
		if _, err := NewSensor(1.0/2048, v, prefix, 1); err != nil {
			t.Error(err)
		}
	}
}

func TestBadSettingsAreRefusedByName(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		kind  string
		given set
		says  string
	}{
		{"lag-delay", set{"delay": -1e-3}, "delay: "},
		{"lag-delay", set{"delay": 1.5}, "delay: "},
		{"lag-delay", set{"lag": nan}, "lag: "},
		{"lag-delay", set{"lag": 2}, "lag: "},
		{"lag-delay", set{"gain": 0}, "gain: "},
		{"lag-delay", set{"gain": inf}, "gain: "},
		{"lag-delay", set{"dealy": 0}, `did you mean "delay"`},
		{"spring", set{}, "stiffness: is missing"},
		{"spring", set{"stiffness": -1}, "stiffness: "},
		{"spring", set{"stiffness": inf}, "stiffness: "},
		{"viscous", set{}, "damping: is missing"},
		{"viscous", set{"damping": -1}, "damping: "},
		{"viscous", set{"damping": 1, "force": 1, "speed": 1}, "damping: is given beside force"},
		{"viscous", set{"damping": 1, "speed": 1}, "damping: is given beside speed"},
		{"viscous", set{"damping": 1, "exponent": 0.5}, "exponent: "},
		{"viscous", set{"force": 1, "speed": 1, "exponent": 3}, "exponent: "},
		{"viscous", set{"force": 1}, "speed: is missing"},
		{"viscous", set{"speed": 1}, "force: is missing"},
		{"viscous", set{"force": 1, "speed": 0}, "speed: "},
		{"maxwell", set{"damping": 1}, "stiffness: is missing"},
		{"maxwell", set{"stiffness": 1}, "damping: is missing; maxwell needs"},
		{"maxwell", set{"stiffness": 1, "damping": 1, "speed": 1}, "damping: is given beside speed"},
		{"bilinear", set{"stiffness": 1}, "yield_displacement: is missing"},
		{"bilinear", set{"stiffness": 1, "yield_displacement": 0}, "yield_displacement: "},
		{"bilinear", set{"stiffness": 1, "yield_displacement": 1, "hardening": 2}, "hardening: "},
		{"friction", set{"stiffness": 1, "normal_force": 1, "slow": 0.1}, "fast: is missing"},
		{"friction", set{"stiffness": 1, "normal_force": 1, "slow": 0.1, "fast": 3}, "fast: "},
		{"friction", set{"stiffness": 1, "normal_force": 1, "slow": 0.1, "fast": 0.1, "speed": 0}, "speed: "},
		{"cubic", set{"stiffness": 1}, "cubic: is missing"},
		{"gap", set{"stiffness": 1, "gap": -1}, "gap: "},
		{"mass", set{"mass": -1}, "mass: "},
		{"second-order", set{"frequency": 0}, "frequency: "},
		{"second-order", set{"damping_ratio": -1}, "damping_ratio: "},
		{"second-order", set{"delay": nan}, "delay: "},
		{"servo-hydraulic", set{"supply_pressure": 0}, "supply_pressure: "},
		{"servo-hydraulic", set{"piston_mass": -1}, "piston_mass: "},
		{"servo-hydraulic", set{"leakage": -1}, "leakage: "},
		{"servo-hydraulic", set{"kdp": inf}, "kdp: "},
		{"servo-hydraulic", set{"delay": 2}, "delay: "},
		{"bouc-wen", set{"stiffness": 1}, "yield_displacement: is missing"},
		{"bouc-wen", set{"yield_displacement": 1}, "stiffness: is missing"},
		{"bouc-wen", set{"stiffness": 1, "yield_displacement": 0}, "yield_displacement: "},
		{"bouc-wen", set{"stiffness": 1, "yield_displacement": 1, "n": 0.5}, "n: "},
		{"bouc-wen", set{"stiffness": 1, "yield_displacement": 1, "beta": 0}, "beta: "},
		{"bouc-wen", set{"stiffness": 1, "yield_displacement": 1, "hardening": 1.1}, "hardening: "},
	} {
		var err error
		if slices.Contains(Actuators.Names(), c.kind) {
			_, err = makeActuator(c.kind, Timing{Tick: 1e-3}, c.given)
		} else {
			_, err = makeElement(c.kind, c.given)
		}
		if err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s %v: error %v, want one that says %q", c.kind, c.given, err, c.says)
		}
	}
}

func TestNothingAllocatesInATick(t *testing.T) {
	parts := map[string]Element{
		"spring":                element(t, "spring", set{"stiffness": 1e6}),
		"viscous, linear":       element(t, "viscous", set{"damping": 1e5}),
		"viscous, root":         element(t, "viscous", set{"force": 1e5, "speed": 1, "exponent": 0.5}),
		"viscous, square":       element(t, "viscous", set{"force": 1e5, "speed": 1, "exponent": 2}),
		"viscous, power":        element(t, "viscous", set{"force": 1e5, "speed": 1, "exponent": 0.3}),
		"bouc-wen, n = 1":       NewBoucWen(1e6, 0.01, 0.1, 1, 0.5),
		"bouc-wen, n = 2":       NewBoucWen(1e6, 0.01, 0.1, 2, 0.7),
		"bouc-wen, n = 3.5":     NewBoucWen(1e6, 0.01, 0.1, 3.5, 0.3),
		"bouc-wen, n = 1, soft": NewBoucWen(1e6, 0.01, 0.1, 1, 0.3),
		"maxwell, linear":       element(t, "maxwell", set{"stiffness": 1e7, "damping": 1e5}),
		"maxwell, power":        element(t, "maxwell", set{"stiffness": 1e7, "force": 1e5, "speed": 1, "exponent": 0.3}),
		"bilinear":              element(t, "bilinear", set{"stiffness": 1e7, "yield_displacement": 0.01}),
		"friction":              element(t, "friction", set{"stiffness": 1e8, "normal_force": 1e6, "slow": 0.05, "fast": 0.1}),
		"cubic":                 element(t, "cubic", set{"stiffness": 1e6, "cubic": 1e9}),
		"gap":                   element(t, "gap", set{"stiffness": 1e6, "gap": 0.01}),
		"mass":                  element(t, "mass", set{"mass": 100}),
	}
	all := make([]Element, 0, len(parts))
	k := 0.0
	for name, e := range parts {
		e.Start(0)
		if n := testing.AllocsPerRun(500, func() {
			k++
			e.Advance(0.03*math.Sin(0.1*k), 0.3*math.Cos(0.1*k), 5e-4)
			e.Energy()
		}); n != 0 {
			t.Errorf("%s: %v allocations in a tick", name, n)
		}
		all = append(all, e)
	}
	s := NewSpecimen(all...)
	for _, hold := range []Hold{Ramp, Step} {
		for _, c := range []struct {
			kind  string
			given set
		}{
			{"lag-delay", set{}}, {"lag-delay", set{"delay": 8e-3}}, {"lag-delay", set{"delay": 8.1e-3, "lag": 6e-3}},
			{"second-order", set{"delay": 8.1e-3}}, {"servo-hydraulic", set{}},
		} {
			a := actuator(t, c.kind, Timing{5e-4, hold}, c.given)
			a.Start(0, s)
			if n := testing.AllocsPerRun(500, func() {
				k++
				a.Advance(0.03*math.Sin(0.1*k), s)
				s.Energy()
			}); n != 0 {
				t.Errorf("%s %v: %v allocations in a tick", c.kind, c.given, n)
			}
		}
	}
}

func BenchmarkLagDelayAlone(b *testing.B) {
	for name, given := range map[string]set{"perfect": {}, "delay": {"delay": 8e-3}, "delay and lag": {"delay": 8e-3, "lag": 6e-3}} {
		b.Run(name, func(b *testing.B) {
			run(b, actuator(b, "lag-delay", Timing{Tick: 1.0 / 2048}, given), NewSpecimen())
		})
	}
}

func BenchmarkLagDelayBoucWen(b *testing.B) {
	a := actuator(b, "lag-delay", Timing{Tick: 1.0 / 2048}, set{"delay": 8e-3, "lag": 6e-3})
	run(b, a, NewSpecimen(NewBoucWen(2e7, 0.01, 0.1, 1, 0.5)))
}

func BenchmarkSecondOrder(b *testing.B) {
	run(b, actuator(b, "second-order", Timing{Tick: 1.0 / 2048}, set{"delay": 8e-3}), NewSpecimen())
}

func BenchmarkServoHydraulic(b *testing.B) {
	for _, c := range []struct {
		name     string
		elements []Element
	}{
		{"alone", nil},
		{"spring", []Element{element(b, "spring", set{"stiffness": 1e7})}},
		{"bouc-wen", []Element{NewBoucWen(2e7, 0.01, 0.1, 1, 0.5)}},
		{"viscous 0.3", []Element{element(b, "viscous", set{"force": 1e5, "speed": 1, "exponent": 0.3})}},
	} {
		b.Run(c.name, func(b *testing.B) {
			run(b, actuator(b, "servo-hydraulic", Timing{Tick: 1.0 / 2048}, nil), NewSpecimen(c.elements...))
		})
	}
}

// run drives an actuator by 1.5 Hz sines of 30 mm, made beforehand.
func run(b *testing.B, a Actuator, s *Specimen) {
	u := make([]float64, 4096)
	for k := range u {
		u[k] = 0.03 * math.Sin(2*math.Pi*3*float64(k)/float64(len(u)))
	}
	a.Start(0, s)
	b.ReportAllocs()
	for k := 0; b.Loop(); k++ {
		a.Advance(u[k&(len(u)-1)], s)
	}
}

func BenchmarkElement(b *testing.B) {
	for _, c := range []struct {
		name string
		e    Element
	}{
		{"spring", element(b, "spring", set{"stiffness": 1e6})},
		{"viscous/1", element(b, "viscous", set{"damping": 1e6})},
		{"viscous/0.5", element(b, "viscous", set{"force": 1e5, "speed": 1, "exponent": 0.5})},
		{"viscous/0.3", element(b, "viscous", set{"force": 1e5, "speed": 1, "exponent": 0.3})},
		{"bouc-wen/1", NewBoucWen(2e7, 0.01, 0.1, 1, 0.5)},
		{"bouc-wen/1/soft", NewBoucWen(2e7, 0.01, 0.1, 1, 0.4)},
		{"bouc-wen/2", NewBoucWen(2e7, 0.01, 0.1, 2, 0.5)},
		{"bouc-wen/3.5", NewBoucWen(2e7, 0.01, 0.1, 3.5, 0.5)},
		{"maxwell/1", element(b, "maxwell", set{"stiffness": 1e8, "damping": 1e6})},
		{"maxwell/0.5", element(b, "maxwell", set{"stiffness": 1e8, "force": 1e5, "speed": 1, "exponent": 0.5})},
		{"maxwell/0.3", element(b, "maxwell", set{"stiffness": 1e8, "force": 1e5, "speed": 1, "exponent": 0.3})},
		{"bilinear", element(b, "bilinear", set{"stiffness": 2e7, "yield_displacement": 0.01, "hardening": 0.1})},
		{"friction", element(b, "friction", set{"stiffness": 1e8, "normal_force": 1e6, "slow": 0.05, "fast": 0.1})},
		{"cubic", element(b, "cubic", set{"stiffness": 1e6, "cubic": 1e9})},
		{"gap", element(b, "gap", set{"stiffness": 1e7, "gap": 0.01})},
		{"mass", element(b, "mass", set{"mass": 100})},
	} {
		b.Run(c.name, func(b *testing.B) {
			y, v := make([]float64, 4096), make([]float64, 4096)
			for k := range y {
				phase := 2 * math.Pi * 3 * float64(k) / float64(len(y))
				y[k], v[k] = 0.03*math.Sin(phase), 0.28*math.Cos(phase)
			}
			c.e.Start(0)
			b.ReportAllocs()
			for k := 0; b.Loop(); k++ {
				c.e.Advance(y[k&4095], v[k&4095], 1.0/2048)
			}
		})
	}
}
