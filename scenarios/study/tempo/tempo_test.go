package tempo

import (
	"bytes"
	"context"
	"encoding/json"
	"math"
	"math/cmplx"
	"slices"
	"strings"
	"testing"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// frame is a storey on a specimen under a sine, with a late actuator that is
// not fully compensated.
const frame = `title = "one storey"
[loop]
rate = "512 Hz"
duration = "10 s"
[substructure]
[[substructure.storey]]
mass = "100 t"
stiffness = "4 kN/mm"
damping = "100 kN*s/m"
[excitation]
kind = "sine"
amplitude = "1 m/s^2"
frequency = "1 Hz"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "4 ms"
[[channel.specimen]]
SPECIMEN
[channel.compensator]
kind = "inverse"
delay = "9 ms"
[accept]
nrmse = 0.02
response_error = 0.05
`

const (
	viscous = "kind = \"viscous\"\ndamping = \"200 kN*s/m\""
	spring  = "kind = \"spring\"\nstiffness = \"2 kN/mm\""
	// An isolator whose friction falls as it is moved more slowly.
	friction = "kind = \"friction\"\nstiffness = \"20 kN/mm\"\nnormal_force = \"1 MN\"\nslow = 0.03\nfast = 0.09\nspeed = \"40 mm/s\""
)

func with(t testing.TB, specimen string, changes ...string) *scenarios.Scenario {
	t.Helper()
	var list []scenarios.Change
	for _, c := range changes {
		change, err := scenarios.ParseChange(c)
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, change)
	}
	s, err := scenarios.Parse("frame.toml", []byte(strings.Replace(frame, "SPECIMEN", specimen, 1)), ".", list...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func ran(t testing.TB, s *scenarios.Scenario, slowdowns ...float64) *Report {
	t.Helper()
	r, err := Run(context.Background(), s, slowdowns, Options{})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// On a viscous damper and on a sliding isolator whose friction depends on the
// speed, synchronization error falls and rate error grows with slowdown, from
// nothing at real speed, and with their correlation the two add up to the
// response error that a run of that slowdown reports.
func TestSynchronizationAgainstRate(t *testing.T) {
	t.Parallel()
	for name, specimen := range map[string]string{"viscous damper": viscous, "friction isolator": friction} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			s := with(t, specimen)
			r := ran(t, s, 1, 2, 5, 12)
			for i := range r.Points {
				p := &r.Points[i]
				sp := p.Split
				t.Logf("slowdown %g: total %.4g, synchronization %.4g, rate %.4g, correlation %.3f", p.Slowdown, sp.Total, sp.Sync, sp.Rate, sp.Correlation)
				sum := sp.Sync*sp.Sync + sp.Rate*sp.Rate
				if !math.IsNaN(sp.Correlation) {
					sum += 2 * sp.Correlation * sp.Sync * sp.Rate
				}
				// The parts add up sample by sample to a rounding; so do the squares.
				if math.Abs(sum/(sp.Total*sp.Total)-1) > 1e-9 {
					t.Errorf("slowdown %g: the parts come to %g, the total is %g", p.Slowdown, math.Sqrt(sum), sp.Total)
				}
				at, err := s.With(scenarios.Change{Path: "loop.slowdown", Value: quoteless(p.Slowdown)})
				if err != nil {
					t.Fatal(err)
				}
				v, err := accept.Run(context.Background(), at, accept.Options{})
				if err != nil {
					t.Fatal(err)
				}
				if got := float64(v.Lanes[0].ResponseError); math.Abs(got/sp.Total-1) > 1e-12 {
					t.Errorf("slowdown %g: a run has a response error of %g, the split %g", p.Slowdown, got, sp.Total)
				}
				if v.Pass() != p.Lane.Pass || v.Lanes[0].Energy != p.Lane.Energy || v.Lanes[0].Channels[0].NRMSE != p.Lane.Channels[0].NRMSE {
					t.Errorf("slowdown %g: not the figures of a run", p.Slowdown)
				}
				if i == 0 {
					if sp.Rate > 1e-12 { // perfect at real speed is the reference, to rounding
						t.Errorf("at real speed rate effects are %g", sp.Rate)
					}
					continue
				}
				if was := r.Points[i-1].Split; sp.Sync >= was.Sync || sp.Rate <= was.Rate {
					t.Errorf("slowdown %g: synchronization %g after %g, rate %g after %g", p.Slowdown, sp.Sync, was.Sync, sp.Rate, was.Rate)
				}
			}
		})
	}
}

func quoteless(v float64) string {
	return strings.TrimSuffix(strings.TrimSuffix(jsonNumber(v), "\n"), ".0")
}

func jsonNumber(v float64) string {
	text, err := json.Marshal(v)
	if err != nil {
		panic(err)
	}
	return string(text)
}

// The same storey in the steady state of a sine, by hand. With the impedance of
// the structure Z = k − mω² + icω and of the specimen H, the displacement is
// X = −m·ü_g/(Z + H): H = iωc_d/λ for a damper that is moved λ times more
// slowly; H = k_s·e^{−iωτ/λ} for a spring behind an actuator late by τ.
func TestSteadyStateByHand(t *testing.T) {
	t.Parallel()
	const m, k, c, cd, ks, tau = 100e3, 4e6, 100e3, 200e3, 2e6, 8e-3
	w := 2 * math.Pi
	z := complex(k-m*w*w, c*w)
	// Start-up decays with exp(−ct/2m), a time constant of 2 s, and counts for its
	// share of 240 s: a hundredth of the error. The ticks, (ω·dt)²/12, count for
	// far less.
	const tolerance = 0.015
	relative := func(h, h1 complex128) float64 { return cmplx.Abs((z+h1)/(z+h) - 1) }
	for _, slowdown := range []float64{2, 4, 10} {
		s := with(t, viscous, "loop.duration=240 s", "loop.rate=128 Hz", "damper.actuator.lag=0 s", "damper.actuator.delay=0 s", "damper.compensator.delay=0 s")
		got := ran(t, s, slowdown).Points[0].Split
		if want := relative(complex(0, w*cd/slowdown), complex(0, w*cd)); math.Abs(got.Rate/want-1) > tolerance || got.Sync > 1e-9 {
			t.Errorf("slowdown %g: rate effects %g, by hand %g; synchronization %g", slowdown, got.Rate, want, got.Sync)
		}
		s = with(t, spring, "loop.duration=240 s", "loop.rate=128 Hz", "damper.actuator.lag=0 s", "damper.compensator.kind=none")
		got = ran(t, s, slowdown).Points[0].Split
		if want := relative(ks*cmplx.Exp(complex(0, -w*tau/slowdown)), ks); math.Abs(got.Sync/want-1) > tolerance || got.Rate > 1e-9 {
			t.Errorf("slowdown %g: synchronization %g, by hand %g; rate effects %g", slowdown, got.Sync, want, got.Rate)
		}
	}
}

// The delay margin of a linear loop that is slow enough for its tick grows with
// the slowdown as its own time does: a spring and a pure delay.
func TestDelayMarginGrowsWithSlowdown(t *testing.T) {
	t.Parallel()
	s := with(t, spring, "damper.actuator.lag=0 s", "damper.actuator.delay=0 s", "damper.compensator.kind=none", "loop.rate=4096 Hz", "loop.duration=1 s")
	r := ran(t, s, 1, 2, 4)
	for i := range r.Points {
		p := &r.Points[i]
		// m²ω⁴ + (c² − 2mk_n)ω² + k_n² − k_e² = 0, τ = atan2(cω, mω² − k_n)/ω
		// (Mercan & Ricles 2007), in model time.
		const m, c, kn, ke = 100e3, 100e3, 4e6, 2e6
		b := c*c - 2*m*kn
		w := math.Sqrt((-b + math.Sqrt(b*b-4*m*m*(kn*kn-ke*ke))) / (2 * m * m))
		want := math.Atan2(c*w, m*w*w-kn) / w * p.Slowdown
		if !p.Stable || math.Abs(p.DelayMargin/want-1) > 1e-3 { // of the tick
			t.Errorf("slowdown %g: %g, by hand %g", p.Slowdown, p.DelayMargin, want)
		}
	}
}

// The conclusion names the fastest that passes, what is too fast, what is too
// slow, or that nothing passes.
func TestConclusion(t *testing.T) {
	t.Parallel()
	for _, c := range []struct {
		name      string
		s         *scenarios.Scenario
		slowdowns []float64
		fastest   int
		want      string
	}{
		{"between", with(t, viscous, "damper.compensator.kind=none", "accept.response_error=1.2"), []float64{1, 6, 20}, 1, "The fastest slowdown that passes is 6. 1 fails: nrmse. Too slow: 20 fails: response_error."},
		{"at once", with(t, spring, "damper.compensator.delay=11 ms"), []float64{1, 2}, 0, "The fastest slowdown that passes is 1."},
		{"none", with(t, viscous, "accept.nrmse=0.000001"), []float64{1, 20}, -1, "None of these slowdowns passes: at 1 it is nrmse, at 20 nrmse, response_error."},
		{"one", with(t, viscous), []float64{20}, -1, "A slowdown of 20 does not pass: response_error."},
	} {
		r := ran(t, c.s, c.slowdowns...)
		if got := r.Conclusion(); r.Fastest() != c.fastest || got != c.want {
			t.Errorf("%s: %d, %s", c.name, r.Fastest(), got)
		}
	}
	s, err := scenarios.Parse("x.toml", []byte(strings.Split(strings.Replace(frame, "SPECIMEN", spring, 1), "[accept]")[0]), ".")
	if err != nil {
		t.Fatal(err)
	}
	if r := ran(t, s, 1); r.Fastest() != -1 || !strings.Contains(r.Conclusion(), "no acceptance limits") {
		t.Errorf("without limits: %s", r.Conclusion())
	}
}

// Without a structure there is tracking, and nothing else to be had.
func TestDrivenTarget(t *testing.T) {
	t.Parallel()
	s, err := scenarios.Load("tracking")
	if err != nil {
		t.Fatal(err)
	}
	r := ran(t, s, 1, 4)
	for i := range r.Points {
		p := &r.Points[i]
		if !math.IsNaN(p.Split.Total) || !math.IsNaN(p.Split.Rate) || !math.IsNaN(p.DelayMargin) || !p.Lane.Channels[0].NRMSE.Defined() {
			t.Errorf("%+v", p)
		}
	}
	if a, b := r.Points[0].Lane.Channels[0].NRMSE, r.Points[1].Lane.Channels[0].NRMSE; b >= a {
		t.Errorf("slower tracks no better: %g, %g", a, b)
	}
	var out bytes.Buffer
	if err := r.WriteText(&out, 80, false); err != nil || strings.Contains(out.String(), "synchro") || !strings.Contains(out.String(), "The target is driven") {
		t.Errorf("%v\n%s", err, out.String())
	}
	if _, err := r.Picture().SVG(); err != nil {
		t.Error(err)
	}
}

// A loop that grows, or trips, is split over what ran, or has no split.
func TestLoopThatEnds(t *testing.T) {
	t.Parallel()
	s := with(t, "kind = \"spring\"\nstiffness = \"40 kN/mm\"", "damper.actuator.delay=60 ms", "damper.compensator.kind=none", "damper.limits.stroke=1 m")
	r := ran(t, s, 1, 40)
	p := &r.Points[0]
	if p.Lane.Outcome != rtloop.Tripped || p.Stable || p.DelayMargin > 0 || !(p.Split.Total > 1) || p.Lane.Ran > 9 {
		t.Errorf("%+v", p)
	}
	if q := &r.Points[1]; q.Lane.Outcome != rtloop.Completed || !q.Stable {
		t.Errorf("%+v", q)
	}
	var out bytes.Buffer
	if err := r.WriteText(&out, 80, false); err != nil || !strings.Contains(out.String(), "grows") {
		t.Errorf("%v\n%s", err, out.String())
	}
}

// The report is one JSON object with null for what is undefined, the same for
// any number of workers.
func TestJSON(t *testing.T) {
	t.Parallel()
	s := with(t, viscous)
	var was []byte
	for _, workers := range []int{1, 3} {
		r, err := Run(context.Background(), s, []float64{1, 2, 3}, Options{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		text, err := json.Marshal(r)
		if err != nil || was != nil && !bytes.Equal(text, was) {
			t.Errorf("%v\n%s\n%s", err, was, text)
		}
		was = text
	}
	for _, want := range []string{`"correlation":null`, `"fastest_slowdown":`, `"rate_error":`, `"delay_margin_s":`} {
		if !strings.Contains(string(was), want) {
			t.Errorf("no %s in %s", want, was)
		}
	}
}

// Ranges are logarithmic and easily typed; wrong ones are refused in a line.
func TestSlowdowns(t *testing.T) {
	t.Parallel()
	s := with(t, spring)
	got, err := Slowdowns(s, "1:100:5")
	if err != nil || !slices.Equal(got, []float64{1, 3.16, 10, 31.6, 100}) {
		t.Errorf("%v, %v", got, err)
	}
	if got, err := Slowdowns(s, Default); err != nil || len(got) != 13 || got[0] != 1 || got[12] != 100 {
		t.Errorf("%v, %v", got, err)
	}
	if got, err := Slowdowns(s, "1:1.001:9"); err != nil || !slices.IsSorted(got) || len(got) > 3 {
		t.Errorf("%v, %v", got, err)
	}
	for text, want := range map[string]string{
		"1:10": "given as a:b:n", "": "given as a:b:n", "0.5:2:3": "below 1", "1:1e5:3": "above", "4:2:3": "smaller end", "1:2:0": "no number of values",
		"1:2:x": "no number of values", "1:2:501": "up to 500", "a:2:3": "loop.slowdown", "1 s:2 s:3": "loop.slowdown",
	} {
		if _, err := Slowdowns(s, text); err == nil || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%q: %v", text, err)
		}
	}
	for _, bad := range []func() error{
		func() error { _, err := Run(context.Background(), s, nil, Options{}); return err },
		func() error {
			_, err := Run(context.Background(), s, []float64{1}, Options{Lane: "nobody"})
			return err
		},
		func() error { _, err := Run(context.Background(), s, []float64{1, 1e6}, Options{}); return err },
	} {
		if bad() == nil {
			t.Error("not refused")
		}
	}
}

// An interruption keeps what was finished.
func TestInterruption(t *testing.T) {
	t.Parallel()
	ctx, stop := context.WithCancel(context.Background())
	s := with(t, viscous)
	r, err := Run(ctx, s, []float64{1, 2, 10}, Options{Workers: 1, Progress: func(done, of int64) {
		if done > of*10/13+100 { // the slowest, which is first, is through and judged
			stop()
		}
	}})
	if err == nil || r == nil || len(r.Points) != 1 || r.Points[0].Slowdown != 10 {
		t.Fatalf("%v, %+v", err, r)
	}
	var out bytes.Buffer
	if err := r.WriteText(&out, 80, false); err != nil || !strings.Contains(out.String(), "INTERRUPTED: 1 of 3 slowdowns") {
		t.Errorf("%v\n%s", err, out.String())
	}
}
