package margin

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"antelag/scenarios"
	"antelag/scenarios/study"
)

// oneStorey is m = 100 t, 1.5 Hz, 3 %, of whose stiffness a share is specimen behind
// a pure delay.
func oneStorey(tb testing.TB, rate, damping, share, delay float64, more string, changes ...scenarios.Change) *scenarios.Scenario {
	tb.Helper()
	k := 100e3 * math.Pow(2*math.Pi*1.5, 2)
	text := fmt.Sprintf(`
[loop]
rate = "%v Hz"
duration = "10 s"
[substructure]
damping_ratio = %v
[[substructure.storey]]
mass = "100 t"
stiffness = "%.17g N/m"
[excitation]
kind = "release"
drives = "ground"
amplitude = "10 mm"
[[channel]]
name = "c"
between = [0, 1]
[channel.actuator]
kind = "lag-delay"
delay = "%.17g s"
[[channel.specimen]]
kind = "spring"
stiffness = "%.17g N/m"
[channel.compensator]
%s
`, rate, damping, (1-share)*k, delay, share*k, more)
	s, err := scenarios.Parse("test.toml", []byte(text), ".", changes...)
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

func judged(tb testing.TB, s *scenarios.Scenario) *Report {
	tb.Helper()
	r, err := Of(context.Background(), s, Options{})
	if err != nil {
		tb.Fatal(err)
	}
	return r
}

// The critical delays of a one-storey loop with an elastic specimen behind a pure
// delay, closed form of Mercan & Ricles 2007 (see rtloop), seen from below and from
// beyond. The tick at 4096 Hz is worth (ω·dt)²/12 = 4e-7.
func TestCriticalDelays(t *testing.T) {
	for share, want := range map[float64]float64{0.5: 12.763041e-3, 0.2: 32.324155e-3, 0.8: 7.965210e-3, 1: 6.370017e-3} {
		for _, delay := range []float64{0, 2e-3, 50e-3} {
			r := judged(t, oneStorey(t, 4096, 0.03, share, delay, `kind = "none"`))
			c := r.Channels[0]
			if math.Abs(float64(c.CriticalDelay)/want-1) > 1e-6 || r.Stable != (delay < want) {
				t.Errorf("share %g, delay %g s: critical delay %.9g s, want %.9g; stable %v", share, delay, float64(c.CriticalDelay), want, r.Stable)
			}
			if share == 0.5 && delay == 0 && math.Abs(float64(c.Delays[0].Frequency)*2*math.Pi-9.407798) > 1e-5 {
				t.Errorf("it swings with %v Hz there", c.Delays[0].Frequency)
			}
			if r.Together.DelayMargin != c.DelayMargin || r.Limiting != "c" {
				t.Errorf("one channel alone is not all together: %+v", r)
			}
		}
	}
}

// Slowed down λ times the actuator may be λ times as late, in physical seconds; modes
// stay in model time.
func TestSlowedDown(t *testing.T) {
	r := judged(t, oneStorey(t, 3*4096, 0.03, 0.5, 2e-3, `kind = "none"`, scenarios.Change{Path: "loop.slowdown", Value: "3"}))
	c := r.Channels[0]
	if math.Abs(float64(c.CriticalDelay)/(3*12.763041e-3)-1) > 1e-6 || math.Abs(float64(c.Delays[0].Frequency)*2*math.Pi-9.407798) > 1e-5 ||
		math.Abs(float64(r.Mode.Frequency)-1.5) > 0.01 {
		t.Errorf("%+v", r)
	}
}

// At the critical delay itself the spectral radius is 1 and there is no margin.
func TestOnTheEdge(t *testing.T) {
	r := judged(t, oneStorey(t, 4096, 0.03, 0.5, 12.763041e-3, `kind = "none"`))
	if math.Abs(float64(r.SpectralRadius)-1) > 1e-9 || math.Abs(float64(r.Channels[0].DelayMargin)) > 1e-8 || math.Abs(float64(r.Channels[0].GainMargin)-1) > 1e-6 {
		t.Errorf("%+v", r)
	}
}

// The force gain at which a delayed spring is critical: with g·k_e for k_e the closed
// form gives just this delay.
func TestGainMargin(t *testing.T) {
	const m, zeta, share, tau = 100e3, 0.03, 0.5, 2e-3
	w0 := 2 * math.Pi * 1.5
	k := m * w0 * w0
	kn, c := (1-share)*k, 2*zeta*w0*m
	// tan ωτ = cω/(mω² − k_n) gives ω, and cω = g·k_e·sin ωτ the gain.
	low, high := math.Sqrt(kn/m)*1.0001, 60.0
	for range 200 {
		mid := 0.5 * (low + high)
		if math.Atan2(c*mid, m*mid*mid-kn) > mid*tau {
			low = mid
		} else {
			high = mid
		}
	}
	want := c * low / (share * k * math.Sin(low*tau))
	r := judged(t, oneStorey(t, 4096, zeta, share, tau, `kind = "none"`))
	if got := float64(r.Channels[0].GainMargin); math.Abs(got/want-1) > 1e-5 {
		t.Errorf("gain margin %v, want %v", got, want)
	}
}

// Stability that comes back: in a long delay the phase goes round, and twice the
// delay is late by nothing again. (m = 100 t, 1.5 Hz, 20 % specimen.)
func TestStabilityRegained(t *testing.T) {
	c := judged(t, oneStorey(t, 256, 0.03, 0.2, 0, `kind = "none"`)).Channels[0]
	if len(c.Delays) < 3 || c.Delays[0].Stable || !c.Delays[1].Stable || c.Delays[2].Stable || c.Delays[0].At != c.DelayMargin {
		t.Fatalf("changes %+v", c.Delays)
	}
	for i, d := range c.Delays {
		for _, side := range []float64{0.999, 1.001} {
			s := oneStorey(t, 256, 0.03, 0.2, side*float64(d.At), `kind = "none"`)
			m, _, err := (&analyst{s: s}).model(s)
			if err != nil {
				t.Fatal(err)
			}
			n, err := m.Unstable(1 + Neutral)
			if err != nil {
				t.Fatal(err)
			}
			if stable := n == 0; stable != (d.Stable == (side > 1)) {
				t.Errorf("change %d at %v s: stable %v at %g of it", i, d.At, stable, side)
			}
		}
	}
}

// An undamped oscillator that is all specimen, behind a pure delay τ with the
// polynomial for it: stable up to ω₀τ = π/(3√2) of order 2 and π/(2√5) of order 3;
// growing at any τ of orders 0 and 1 (Horiuchi et al. 1999; the limits follow from
// C·G = 1 − (1 − e^(−jωτ))^(n+1)). τ of some 600 ticks is a straight line between
// ticks to 1e-6.
func TestPolynomialLimits(t *testing.T) {
	w0 := 2 * math.Pi * 1.5
	grows := func(order int, tau float64) bool {
		s := oneStorey(t, 8192, 0, 1, tau, fmt.Sprintf("kind = \"polynomial\"\norder = %d\ndelay = \"%.17g s\"", order, tau))
		m, _, err := (&analyst{s: s}).model(s)
		if err != nil {
			t.Fatal(err)
		}
		n, err := m.Unstable(1 + 1e-12)
		if err != nil {
			t.Fatal(err)
		}
		return n > 0
	}
	for order, limit := range map[int]float64{2: math.Pi / (3 * math.Sqrt2), 3: math.Pi / (2 * math.Sqrt(5))} {
		if grows(order, 0.9999*limit/w0) || !grows(order, 1.0001*limit/w0) {
			t.Errorf("order %d is not critical at ω₀τ = %g", order, limit)
		}
	}
	for order := range 2 {
		if !grows(order, 0.01/w0) {
			t.Errorf("order %d is stable", order)
		}
	}
}

// Two equal channels that have nothing to do with each other have the margins of one
// alone, each and together.
func TestUncoupledChannels(t *testing.T) {
	k := 100e3 * math.Pow(2*math.Pi*1.5, 2)
	const channel = `
[[channel]]
name = "c%d"
between = [0, %d]
[channel.actuator]
kind = "lag-delay"
delay = "2 ms"
[[channel.specimen]]
kind = "spring"
stiffness = "%.17g N/m"
[channel.compensator]
kind = "none"
`
	text := fmt.Sprintf(`
[loop]
rate = "4096 Hz"
duration = "10 s"
[substructure]
damping_ratio = 0.03
mass_matrix = [["100 t", 0], [0, "100 t"]]
stiffness_matrix = [["%[1]v N/m", 0], [0, "%[1]v N/m"]]
[excitation]
kind = "release"
drives = "ground"
amplitude = "10 mm"
`, k/2) + fmt.Sprintf(channel, 1, 1, k/2) + fmt.Sprintf(channel, 2, 2, k/2)
	s, err := scenarios.Parse("two.toml", []byte(text), ".")
	if err != nil {
		t.Fatal(err)
	}
	two, one := judged(t, s), judged(t, oneStorey(t, 4096, 0.03, 0.5, 2e-3, `kind = "none"`))
	want := one.Channels[0]
	if math.Abs(float64(two.SpectralRadius-one.SpectralRadius)) > 1e-11 {
		t.Errorf("spectral radius %v, alone %v", two.SpectralRadius, one.SpectralRadius)
	}
	for i, m := range []Margins{two.Channels[0].Margins, two.Channels[1].Margins, two.Together} {
		// Together two poles cross as one, and a double zero has half the digits.
		if math.Abs(float64(m.DelayMargin/want.DelayMargin)-1) > 1e-6 || math.Abs(float64(m.GainMargin/want.GainMargin)-1) > 1e-8 {
			t.Errorf("%d: %v s and %v, alone %v s and %v", i, m.DelayMargin, m.GainMargin, want.DelayMargin, want.GainMargin)
		}
	}
}

// A quick report is the same; a lane is judged by its own compensators; what is
// learned counts when asked for.
func TestOptions(t *testing.T) {
	s, err := scenarios.Load("comparison")
	if err != nil {
		t.Fatal(err)
	}
	full, err := Of(context.Background(), s, Options{})
	if err != nil {
		t.Fatal(err)
	}
	quick, err := Of(context.Background(), s, Options{Quick: true})
	if err != nil {
		t.Fatal(err)
	}
	if full.Eigenvalues == quick.Eigenvalues || math.Abs(float64(full.SpectralRadius-quick.SpectralRadius)) > 1e-11 || full.LeastDelay() != quick.LeastDelay() {
		t.Errorf("%+v, quick %+v", full, quick)
	}
	lane := s.Lanes[0].Name
	other, err := Of(context.Background(), s, Options{Lane: lane})
	if err != nil {
		t.Fatal(err)
	}
	alone, err := s.Alone(lane)
	if err != nil {
		t.Fatal(err)
	}
	if want := judged(t, alone); other.LeastDelay() != want.LeastDelay() || other.Lane != lane {
		t.Errorf("lane %s: %v s, alone %v s", lane, other.LeastDelay(), want.LeastDelay())
	}
	// An adaptive inverse that starts from nothing has learned the delay by the end.
	learning := oneStorey(t, 1024, 0.03, 0.2, 10e-3, "kind = \"adaptive-inverse\"\ndelay = \"0 s\"\nkp = \"5e5 m^-2\"")
	before, err := Of(context.Background(), learning, Options{})
	if err != nil {
		t.Fatal(err)
	}
	after, err := Of(context.Background(), learning, Options{AfterRun: true})
	if err != nil {
		t.Fatal(err)
	}
	if gained := after.LeastDelay() - before.LeastDelay(); !(gained > 3e-3 && gained < 12e-3) || !after.AfterRun {
		t.Errorf("delay margin %v s at the start, %v s after the run", before.LeastDelay(), after.LeastDelay())
	}
}

func TestCancelled(t *testing.T) {
	s, err := scenarios.Load("archive")
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Of(ctx, s, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
	x, y, err := ParseMap(s, "damper.actuator.delay=0:20 ms:5,loop.rate=500 Hz:2000 Hz:5")
	if err != nil {
		t.Fatal(err)
	}
	g, err := Map(ctx, s, x, y, Options{})
	if !errors.Is(err, context.Canceled) || g == nil || g.Whole != 0 {
		t.Errorf("%v, %+v", err, g)
	}
}

// A map is the same for any number of workers.
func TestMapForAnyWorkers(t *testing.T) {
	s, err := scenarios.Load("piperack")
	if err != nil {
		t.Fatal(err)
	}
	x, y, err := ParseMap(s, "brace-low.actuator.delay=0:40 ms:12,brace-high.sensor.force_gain=0.5:12:9")
	if err != nil {
		t.Fatal(err)
	}
	var first []byte
	for _, workers := range []int{1, 2, 5} {
		g, err := Map(context.Background(), s, x, y, Options{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = g.CSV()
		}
		if !bytes.Equal(first, g.CSV()) {
			t.Errorf("%d workers come to another map", workers)
		}
	}
}

func TestWrongMaps(t *testing.T) {
	s, err := scenarios.Load("archive")
	if err != nil {
		t.Fatal(err)
	}
	for text, want := range map[string]string{
		"damper.actuator.delay=0:20 ms:5":                                    "not two ranges",
		"damper.actuator.delay=0:20 ms:5,damper.actuator.lag=0:5 ms":         "a grid is given as",
		"damper.actuator.delay=0:20 ms:5,damper.actuator.delya=0:5 ms:4":     `did you mean "delay"`,
		"damper.actuator.delay=0:20 mm:5,damper.actuator.lag=0:5 ms:4":       "length",
		"damper.actuator.delay=0:20 s:5,damper.actuator.lag=0:5 ms:4":        "allowed is",
		"damper.actuator.delay=0:20:5,damper.actuator.lag=0:5 ms:4":          "no unit",
		"damper.actuator.delay=0:20 ms:1,damper.actuator.lag=0:5 ms:4":       "at least 2",
		"damper.actuator.delay=0:20 ms:9999,damper.actuator.lag=0:5 ms:4":    "2 to 2000",
		"damper.actuator.delay=20 ms:0 ms:5,damper.actuator.lag=0:5 ms:4":    "above",
		"damper.actuator.delay=0:20 ms:5,channel[0].actuator.delay=0:5 ms:4": "two settings",
		"substructure.integrator=0:1:5,damper.actuator.delay=0:5 ms:4":       "not a single number",
		"damper.compensator.order=1:4:3,damper.actuator.delay=0:5 ms:4":      "whole",
		"nobody.actuator.delay=0:20 ms:5,damper.actuator.lag=0:5 ms:4":       "nobody",
	} {
		if _, _, err := ParseMap(s, text); err == nil || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v, want %q", text, err, want)
		}
	}
}

// What has no margin says so, and where.
func TestNoMargin(t *testing.T) {
	driven, err := scenarios.Load("table")
	if err != nil {
		t.Fatal(err)
	}
	slack, err := scenarios.Parse("slack.toml", []byte(strings.Replace(archive(t),
		`damping = "450 kN*s/m"`, "force = \"100 kN\"\nspeed = \"0.3 m/s\"\nexponent = 0.4", 1)), ".")
	if err != nil {
		t.Fatal(err)
	}
	for want, s := range map[string]*scenarios.Scenario{
		"excitation.drives: the excitation drives the target": driven,
		"channel.specimen: viscous: with the exponent 0.4":    slack,
	} {
		var placed *scenarios.Error
		if _, err := Of(context.Background(), s, Options{}); !errors.As(err, &placed) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
		x := Range{Range: study.Range{Path: "loop.rate", Low: 500, High: 900}, N: 3}
		y := Range{Range: study.Range{Path: s.Channels[0].Name + ".actuator.delay", Low: 0, High: 0.01}, N: 3}
		if _, err := Map(context.Background(), s, x, y, Options{}); !errors.As(err, &placed) || !strings.Contains(err.Error(), want) {
			t.Errorf("map: %v, want %q", err, want)
		}
	}
}

func archive(t *testing.T) string {
	t.Helper()
	text, err := scenarios.Text("archive")
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func BenchmarkMap(b *testing.B) {
	s, err := scenarios.Load("archive")
	if err != nil {
		b.Fatal(err)
	}
	for _, text := range []string{"damper.actuator.delay=0:40 ms:60,damper.compensator.delay=0:40 ms:60",
		"damper.specimen[1].stiffness=0:40 kN/mm:60,substructure.storey[0].mass=20 t:90 t:60"} {
		x, y, err := ParseMap(s, text)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(text, func(b *testing.B) {
			for b.Loop() {
				if _, err := Map(context.Background(), s, x, y, Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func FuzzParseMap(f *testing.F) {
	s, err := scenarios.Load("archive")
	if err != nil {
		f.Fatal(err)
	}
	f.Add("damper.actuator.delay=0:20 ms:5,loop.rate=500 Hz:900 Hz:3")
	f.Add("a=1:2:3:log,=")
	f.Fuzz(func(t *testing.T, text string) {
		x, y, err := ParseMap(s, text)
		if err == nil && (x.N < 2 || y.N < 2 || !(x.Low < x.High) || !(y.Low < y.High)) {
			t.Errorf("%q is read as %v, %v", text, x, y)
		}
	})
}

// A slow structure at a high rate grows by little a tick beyond its critical delay; it
// is found all the same. (Closed form as above, m = 100 t at 0.05 Hz, 1 %.)
func TestSlowStructure(t *testing.T) {
	const m, zeta, share = 100e3, 0.01, 0.2
	w0 := 2 * math.Pi * 0.05
	k := m * w0 * w0
	c, kn, ke := 2*zeta*w0*m, (1-share)*k, share*k
	p, q := (c*c-2*m*kn)/(m*m), (kn*kn-ke*ke)/(m*m)
	w := math.Sqrt((-p + math.Sqrt(p*p-4*q)) / 2)
	want := math.Atan2(c*w, m*w*w-kn) / w
	s := oneStorey(t, 8192, 0.01, share, 0, `kind = "none"`,
		scenarios.Change{Path: "substructure.storey[0].stiffness", Value: fmt.Sprintf("%.17g N/m", kn)},
		scenarios.Change{Path: "c.specimen.stiffness", Value: fmt.Sprintf("%.17g N/m", ke)})
	r, err := Of(context.Background(), s, Options{Quick: true})
	if err != nil {
		t.Fatal(err)
	}
	if got := float64(r.Channels[0].CriticalDelay); math.Abs(got/want-1) > 1e-6 {
		t.Errorf("critical delay %v s, want %v", got, want)
	}
}
