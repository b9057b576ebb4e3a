package handoff

import (
	"bytes"
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

// variant is a kind with settings under which it is another method.
type variant struct {
	kind string
	set  map[string]any
}

func (v variant) String() string { return fmt.Sprintf("%s %v", v.kind, v.set) }

// variants is every kind with its defaults, and what other settings make of it.
func variants() []variant {
	var all []variant
	for _, name := range compensator.Kinds.Names() {
		all = append(all, variant{name, nil})
	}
	for n := range 5 {
		all = append(all, variant{"polynomial", map[string]any{"order": n, "delay": 0.0137}})
	}
	return append(all,
		variant{"polynomial", map[string]any{"delay": 0.5, "order": 4}},
		variant{"polynomial", map[string]any{"delay": 0.0}},
		variant{"polynomial", map[string]any{"delay": 1e-4}}, // a fifth of a tick: taps that merge
		variant{"model-inverse", map[string]any{"order": 1, "gain": 0.9}},
		variant{"model-inverse", map[string]any{"order": 3, "lag": 0.004, "gain": 1.1}},
		variant{"least-squares-polynomial", map[string]any{"adapt": "delay"}},
		variant{"least-squares-polynomial", map[string]any{"adapt": "delay-and-amplitude", "order": 3}},
		variant{"adaptive-inverse", map[string]any{"kp": 0.0, "ki": 1e5}},
		variant{"adaptive-time-series", map[string]any{"window": 0.05}})
}

func (v variant) values(t testing.TB) kind.Values {
	t.Helper()
	e, err := compensator.Kinds.Find(v.kind)
	if err != nil {
		t.Fatal(err)
	}
	given := kind.Values{}
	for name, x := range v.set {
		switch x := x.(type) {
		case int:
			given[name] = kind.Num(float64(x))
		case float64:
			given[name] = kind.Num(x)
		case string:
			given[name] = kind.Text(x)
		}
	}
	values, err := e.Resolve(given)
	if err != nil {
		t.Fatal(err)
	}
	return values
}

var noLimits = Limits{math.Inf(1), math.Inf(1), math.Inf(1), math.Inf(1)}

var usual = Limits{Stroke: 0.15, Velocity: 1, Force: 3e5, Error: 0.025}

// of is a test with one channel.
func of(t testing.TB, v variant, rate float64, l Limits) *Test {
	t.Helper()
	return &Test{
		Title: "invented", Scenario: "mine.toml", Text: []byte("title = \"invented\"\n"), Lane: "configured", Version: "v0",
		Rate: rate, Slowdown: 1, Hold: "ramp", Seed: 1,
		Channels: []Channel{{Name: "damper", Kind: v.kind, Values: v.values(t), Limits: l}},
	}
}

// written makes a handoff and returns its files by name.
func written(t testing.TB, test *Test) (map[string]string, *Report) {
	t.Helper()
	files, r, err := Make(test)
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]string{}
	for _, f := range files {
		out[f.Name] = string(f.Data)
	}
	return out, r
}

func TestEveryKindHasC(t *testing.T) {
	var have []string
	for _, m := range methods {
		have = append(have, m.kind)
	}
	if want := compensator.Kinds.Names(); !slices.Equal(have, want) {
		t.Errorf("C for %v; the kinds are %v", have, want)
	}
}

// bare is a C text without its comments.
var bare = regexp.MustCompile(`(?s)/\*.*?\*/`)

// What every handoff must have, whatever the method.
func TestFilesSayWhatTheyAre(t *testing.T) {
	for _, v := range variants() {
		t.Run(v.String(), func(t *testing.T) {
			test := of(t, v, 512, usual)
			test.Slowdown = 4
			files, r := written(t, test)
			if want := []string{"antelag_damper.h", "antelag_damper.c", "vectors.csv", "selftest.c", "Makefile", "scenario.toml"}; !slices.Equal(r.Files, want) {
				t.Errorf("files %v, want %v", r.Files, want)
			}
			header, source := files["antelag_damper.h"], files["antelag_damper.c"]
			e, _ := compensator.Kinds.Find(v.kind)
			says := []string{
				"Method " + v.kind + ": ", "source: " + ascii(e.Source), "at 512 ticks a second", "4 times slower",
				"this code is no interlock", "emergency stop", "licensed engineer", r.Digest, `lane "configured"`, `"mine.toml"`,
				"stroke: 150 mm (0.15 m)", "velocity: 1 m/s,", "force: 300 kN (300000 N)", "error: 25 mm (0.025 m)",
			}
			for _, s := range e.Settings {
				says = append(says, s.Name+" = ")
			}
			flat := strings.Join(strings.Fields(strings.ReplaceAll(header, "\n *", " ")), " ")
			for _, s := range says {
				if !strings.Contains(flat, s) {
					t.Errorf("the header does not say %q:\n%s", s, header)
				}
			}
			// Every symbol of its equation and of its settings has letters.
			if e := regexp.MustCompile(`\\[ux].*`).FindString(header); e != "" {
				t.Errorf("%q has no letters of its own", e)
			}
			for name, text := range files {
				if name == "vectors.csv" {
					continue
				}
				if i := strings.IndexFunc(text, func(r rune) bool { return r != '\n' && r != '\t' && (r < ' ' || r > '~') }); i >= 0 && name != "scenario.toml" {
					t.Errorf("%s has %q", name, text[i:i+10])
				}
			}
			code := bare.ReplaceAllString(header+source, "")
			for _, word := range []string{"@", "$", "alloc", "free(", "<math.h>", "<stdlib.h>", "goto", "while"} {
				if strings.Contains(code, word) {
					t.Errorf("the C has %q", word)
				}
			}
			// Loops are bounded by constants, and everything is static but what
			// is offered.
			for _, loop := range regexp.MustCompile(`for \(([^)]*)\)`).FindAllStringSubmatch(code, -1) {
				if !regexp.MustCompile(`^(i = 0|i = 1|j = 0)?; i? ?j? ?\+? ?8? ?<=? (SIZE|2 \* SIZE|ORDER|POINTS|n); [ij]( \+= 8|\+\+)$`).MatchString(loop[1]) {
					t.Errorf("a loop that is not bounded: %s", loop[1])
				}
			}
			for _, f := range regexp.MustCompile(`(?m)^([a-z].*)\n?\{`).FindAllStringSubmatch(bare.ReplaceAllString(source, ""), -1) {
				if !strings.HasPrefix(f[1], "static ") && !regexp.MustCompile(`antelag_damper_(init|reset|prime|step)\(`).MatchString(f[1]) {
					t.Errorf("not static: %s", f[1])
				}
			}
		})
	}
}

func TestSameInputSameBytes(t *testing.T) {
	for _, name := range compensator.Kinds.Names() {
		v := variant{name, nil}
		a, _, err := Make(of(t, v, 500, usual))
		if err != nil {
			t.Fatal(err)
		}
		b, _, err := Make(of(t, v, 500, usual))
		if err != nil {
			t.Fatal(err)
		}
		for i := range a {
			if !bytes.Equal(a[i].Data, b[i].Data) {
				t.Errorf("%v: %s", v, a[i].Name)
			}
		}
		other := of(t, v, 500, usual)
		other.Seed = 2
		c, _, err := Make(other)
		if err != nil {
			t.Fatal(err)
		}
		for i := range a {
			// The self-test says what the vectors' peaks allow.
			if same := bytes.Equal(a[i].Data, c[i].Data); same != (a[i].Name != "vectors.csv" && a[i].Name != "selftest.c") {
				t.Errorf("%v: with another seed %s is the same: %v", v, a[i].Name, same)
			}
		}
	}
}

// constants reads the macros of a source that are numbers.
func constants(t testing.TB, source string) map[string]float64 {
	t.Helper()
	out := map[string]float64{}
	for _, m := range regexp.MustCompile(`(?m)^#define ([A-Z0-9_]+) (?:R\()?\(?(-?[0-9][0-9.e+-]*)(?:ul)?\)*(?: |$)`).FindAllStringSubmatch(source, -1) {
		v, err := strconv.ParseFloat(m[2], 64)
		if err != nil {
			t.Fatal(err)
		}
		out[m[1]] = v
	}
	return out
}

// The numbers in the C of the fixed methods against their closed forms, written
// down from the settings alone. 1e-13 is some roundings.
func TestConstantsAgainstClosedForms(t *testing.T) {
	const rate, tau = 2000.0, 0.0137 // 27.4 ticks
	dt := 1 / rate
	for _, c := range []struct {
		v    variant
		want map[string]float64
	}{
		{variant{"taylor", map[string]any{"delay": tau}}, map[string]float64{"DELAY": tau, "HALF": tau * tau / 2}},
		{variant{"inverse", map[string]any{"delay": tau}}, map[string]float64{"ALPHA": 1 + tau*rate, "REST": tau * rate}},
		{variant{"linear-acceleration", map[string]any{"delay": tau}},
			map[string]float64{"DELAY": tau, "NOW": 2 * tau * tau / 3, "BEFORE": tau * tau / 6, "AGO": 27.4}},
		{variant{"model-inverse", map[string]any{"order": 3, "delay": tau, "lag": 0.004, "gain": 1.1}}, map[string]float64{
			"A0": 1 / 1.1, "A1": (0.004 + tau) / 1.1, "A2": (0.004*tau + tau*tau/2) / 1.1,
			"JERK": (0.004*tau*tau/2 + tau*tau*tau/6) / 1.1 / dt}},
		{variant{"model-inverse", map[string]any{"order": 1, "delay": tau}}, map[string]float64{"A0": 1, "A1": tau, "A2": 0, "JERK": 0}},
		// 3 −3 1 at 0, 27.4 and 54.8 ticks.
		{variant{"polynomial", map[string]any{"order": 2, "delay": tau}},
			map[string]float64{"NOW": 3, "W1": -3 * 0.6, "W2": -3 * 0.4, "W3": 0.2, "W4": 0.8}},
		{variant{"adaptive-inverse", map[string]any{"delay": tau, "delay_max": 0.04}},
			map[string]float64{"START": 28.4, "LOW": 1, "HIGH": 81, "KP": 4e5, "KI": 0, "TICK": dt}},
		{variant{"delay-seeking", map[string]any{"delay": tau, "rate": 3.0}},
			map[string]float64{"START": tau, "LOW": 0, "HIGH": 0.05, "STEP": 3 * dt, "FLOOR": 1e-4, "ORDER": 3, "RATE": rate}},
		{variant{"adaptive-time-series", map[string]any{"delay": tau, "gain": 1.25}}, map[string]float64{
			"WINDOW": 2000, "START_A0": 0.8, "START_A1": tau * 0.8, "START_A2": tau * tau / 2 * 0.8, "START_DELAY": tau,
			"LEAST": 2000 * 1e-6, "STEP_A0": 0.5 * dt, "STEP_DELAY": 0.1 * dt, "STEP_A2": 0.06 * 0.1 * dt, "A2_MAX": 0.0036,
			"PER_TWO_TICKS": 1000, "PER_TICK_SQUARED": 4e6, "A0_MIN": 0.7, "A0_MAX": 1.4, "DELAY_MIN": 0, "DELAY_MAX": 0.06}},
	} {
		files, _ := written(t, of(t, c.v, rate, usual))
		got := constants(t, files["antelag_damper.c"])
		for name, want := range c.want {
			if x, ok := got[name]; !ok || !(math.Abs(x-want) <= 1e-13*max(1, math.Abs(want))) {
				t.Errorf("%v: %s is %v, want %v", c.v, name, x, want)
			}
		}
		for name, want := range map[string]float64{"STROKE": 0.15, "SPEED": 1, "TRAVEL": 5e-4, "FORCE": 3e5, "LAG": 0.025} {
			if got[name] != want {
				t.Errorf("%v: limit %s is %v, want %v", c.v, name, got[name], want)
			}
		}
	}
}

// The low-pass in the C is a fourth-order Butterworth: 1 at rest, 1/√2 at the
// cutoff, and 1/√(1 + (tan(πf·dt)/tan(πf_c·dt))⁸) anywhere, by the bilinear
// transform.
func TestLowPass(t *testing.T) {
	const rate, cutoff = 1000.0, 20.0
	files, _ := written(t, of(t, variant{"adaptive-time-series", map[string]any{"cutoff": cutoff}}, rate, usual))
	c := constants(t, files["antelag_damper.c"])
	for _, f := range []float64{1e-3, 5, 20, 80, 300} {
		w := 2 * math.Pi * f / rate
		gain := 1.0
		for _, n := range []string{"F1", "F2"} {
			num := 2 * (1 + math.Cos(w)) // |1 + z⁻¹|²
			re := 1 + c[n+"_A1"]*math.Cos(w) + c[n+"_A2"]*math.Cos(2*w)
			im := c[n+"_A1"]*math.Sin(w) + c[n+"_A2"]*math.Sin(2*w)
			gain *= c[n+"_B"] * num / math.Hypot(re, im)
		}
		want := 1 / math.Sqrt(1+math.Pow(math.Tan(w/2)/math.Tan(math.Pi*cutoff/rate), 8))
		// The poles are 0.05 from 1, so that roundings count 400 times.
		if math.Abs(gain-want) > 1e-12 {
			t.Errorf("at %v Hz: gain %v, want %v", f, gain, want)
		}
	}
}

// The weights of a least-squares polynomial of order N predict 1, t … t^N.
func TestLeastSquaresWeights(t *testing.T) {
	const rate, tau, points = 1000.0, 0.0137, 40
	files, _ := written(t, of(t, variant{"least-squares-polynomial", map[string]any{"delay": tau, "order": 3}}, rate, usual))
	_, table, _ := strings.Cut(files["antelag_damper.c"], "weight[POINTS] = {")
	table, _, _ = strings.Cut(table, "};")
	var weights []float64
	for _, m := range regexp.MustCompile(`R\(\(?([^)]*)\)`).FindAllStringSubmatch(table, -1) {
		w, err := strconv.ParseFloat(m[1], 64)
		if err != nil {
			t.Fatal(err)
		}
		weights = append(weights, w)
	}
	if len(weights) != points {
		t.Fatalf("%d weights", len(weights))
	}
	for n := range 4 {
		sum := 0.0
		for i, w := range weights {
			sum += w * math.Pow(float64(i-points+1)/points, float64(n))
		}
		if want := math.Pow(tau*rate/points, float64(n)); math.Abs(sum-want) > 1e-12 {
			t.Errorf("t^%d is predicted as %v, want %v", n, sum, want)
		}
	}
}
