package replay

import (
	"bytes"
	"compress/gzip"
	"context"
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"antelag/rtloop/runlog"
	"antelag/scenarios"
)

// logged writes a log of one channel, of 1000 rows a second: target 10 mm at 2 Hz,
// measured with the gain and delay that it is told for each time, and the force of
// a spring of 2 kN/mm on the measured displacement.
func logged(t testing.TB, seconds int, of func(at float64) (gain, delay float64)) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "log.csv")
	var b strings.Builder
	b.WriteString("time_s,a.target_m,a.measured_m,a.force_N\n")
	f := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	for k := range 1000*seconds + 1 {
		at := float64(k) / 1000
		gain, delay := of(at)
		y := gain * 0.010 * math.Sin(omega*(at-delay))
		b.WriteString(f(at) + "," + f(0.010*math.Sin(omega*at)) + "," + f(y) + "," + f(2e6*y) + "\n")
	}
	if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

const omega = 2 * math.Pi * 2

// A gain and a delay that change halfway show in the windows where they are, the
// worst moments are behind the change, and the energy is the closed form
// πkA²·g·sin ωτ a cycle.
func TestWindowsShowWhereItChanged(t *testing.T) {
	path := logged(t, 40, func(at float64) (float64, float64) {
		if at < 20 {
			return 1, 0.004
		}
		return 0.9, 0.011
	})
	rep, err := Of(context.Background(), path, Options{Window: 2})
	if err != nil {
		t.Fatal(err)
	}
	c := rep.Channels[0]
	if len(c.Windows) != 39 || rep.Window != 2 || rep.Samples != 40001 || rep.Time != 40 {
		t.Fatalf("%d windows of %v s, %d samples, %v s", len(c.Windows), rep.Window, rep.Samples, rep.Time)
	}
	for i, w := range c.Windows {
		if w.Quiet || math.Abs(float64(w.Start)-float64(i)) > 1e-9 || math.Abs(float64(w.End)-float64(i)-2) > 1e-9 {
			t.Fatalf("window %d from %v s to %v s, quiet %v", i, w.Start, w.End, w.Quiet)
		}
		gain, delay := 1.0, 0.004
		switch {
		case i >= 18 && i <= 20: // over the change, or with its instant at an end
			continue
		case i > 19:
			gain, delay = 0.9, 0.011
		}
		// Whole periods of a sine: all gauges are exact but for the parabola through
		// three samples of the correlation, which errs by less than (ω·dt)²·dt, and for
		// samples at which both ends of the window count.
		near(t, fmt.Sprintf("window %d, delay", i), float64(w.Delay), delay, 1e-6)
		near(t, fmt.Sprintf("window %d, FEI delay", i), float64(w.FEI.Delay), delay, 1e-9)
		near(t, fmt.Sprintf("window %d, amplitude", i), float64(w.AmplitudeRatio), gain, 1e-4)
		near(t, fmt.Sprintf("window %d, subspace delay", i), float64(w.Subspace.Delay), delay, 1e-5)
		near(t, fmt.Sprintf("window %d, target amplitude", i), float64(w.Amplitude), 0.010, 1e-5)
		// ∫k·y·(dy − dx) over four cycles, the force by the trapezoid rule: the part with
		// dy comes back to zero.
		work := 4 * math.Pi * 2e6 * 1e-4 * gain * math.Sin(omega*delay)
		near(t, fmt.Sprintf("window %d, injected", i), float64(w.Injected), work, 1e-4*work)
	}
	for _, m := range c.Worst {
		if float64(m.End) < 20 {
			t.Errorf("%s was worst at %v s", m.Figure, m.Start)
		}
	}
	if len(c.Worst) != 5 {
		t.Errorf("%d worst moments: %v", len(c.Worst), c.Worst)
	}
}

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within) {
		t.Errorf("%s: %v, want %v within %g", what, got, want, within)
	}
}

// Where the target rests, delay and ratios say nothing and are undefined; peaks and
// energies stay.
func TestQuietWindowsSayNothing(t *testing.T) {
	path := filepath.Join(t.TempDir(), "log.csv")
	var b strings.Builder
	b.WriteString("time_s,a.target_m,a.measured_m\n")
	for k := range 10001 {
		x := 0.010 * math.Sin(omega*float64(k)/1000)
		if k > 6000 {
			x = 1e-6 * math.Sin(omega*float64(k)/1000)
		}
		fmt.Fprintf(&b, "%.3f,%.9g,%.9g\n", float64(k)/1000, x, x+1e-6)
	}
	if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	rep, err := Of(context.Background(), path, Options{Window: 2})
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range rep.Channels[0].Windows {
		quiet := w.Start >= 6
		if w.Quiet != quiet || w.Delay.Defined() == quiet || w.NRMSE.Defined() == quiet || !w.PeakError.Defined() || w.Injected.Defined() {
			t.Errorf("window from %v s: quiet %v, delay %v, injected %v", w.Start, w.Quiet, w.Delay, w.Injected)
		}
	}
	var text strings.Builder
	if err := rep.WriteText(&text, false); err != nil || !strings.Contains(text.String(), "the target hardly moved") || !strings.Contains(text.String(), "unknown without the force") {
		t.Errorf("%v\n%s", err, text.String())
	}
}

// In steps of any size a record comes to the same.
func TestSteppingIsTheSame(t *testing.T) {
	path := logged(t, 12, func(float64) (float64, float64) { return 1.02, 0.003 })
	whole, err := Of(context.Background(), path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, step := range []int{1, 102, 5000} {
		p, err := Open(path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		n := int64(0)
		for {
			s, ok := p.Advance(step)
			if !ok {
				break
			}
			if s.First != n || s.N > step || len(s.Channels[0][runlog.Target]) != s.N || s.Margin != nil {
				t.Fatalf("steps of %d: %d samples from %d, after %d", step, s.N, s.First, n)
			}
			n += int64(s.N)
		}
		if p.Err() != nil || n != 12001 || !(p.Subspace(0).Major > 0) {
			t.Fatalf("%d samples, %v", n, p.Err())
		}
		if got, want := fmt.Sprintf("%+v", p.Report()), fmt.Sprintf("%+v", whole); got != want {
			t.Errorf("steps of %d:\n%s\nwant\n%s", step, got, want)
		}
		if err := p.Close(); err != nil {
			t.Fatal(err)
		}
	}
}

// What was read before the interruption is judged, and it says so.
func TestInterrupted(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	path := logged(t, 30, func(float64) (float64, float64) { return 1, 0 })
	rep, err := Of(ctx, path, Options{Progress: func(done, of int64) {
		if done <= 0 || done > of {
			t.Errorf("%d of %d", done, of)
		}
		stop()
	}})
	if err != nil || !rep.Interrupted || rep.Samples == 0 || rep.Samples >= 30001 {
		t.Fatalf("%v: %+v", err, rep)
	}
}

func TestProvenanceThatDoesNotFit(t *testing.T) {
	path := logged(t, 10, func(float64) (float64, float64) { return 1, 0.002 })
	archive, err := scenarios.Text("archive")
	if err != nil {
		t.Fatal(err)
	}
	for text, note := range map[string]string{string(archive): "does not fit the log", "no = [toml": "it was not used"} {
		if err := os.WriteFile(path+".toml", []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		rep, err := Of(context.Background(), path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if len(rep.Notes) != 1 || !strings.Contains(rep.Notes[0], note) || rep.Slowdown != 1 {
			t.Errorf("notes %q, slowdown %v", rep.Notes, rep.Slowdown)
		}
	}
}

// A log that was compressed after the run still has its provenance.
func TestProvenanceOfACompressedLog(t *testing.T) {
	path := logged(t, 10, func(float64) (float64, float64) { return 1, 0.002 })
	tracking, err := scenarios.Text("tracking")
	if err != nil {
		t.Fatal(err)
	}
	text := strings.NewReplacer(`"actuator"`, `"a"`, "2048 Hz", "1000 Hz").Replace(string(tracking))
	if err := os.WriteFile(path+".toml", []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var packed bytes.Buffer
	z := gzip.NewWriter(&packed)
	z.Write(data) //nolint:errcheck // into memory
	z.Close()
	if err := os.WriteFile(path+".gz", packed.Bytes(), 0o644); err != nil {
		t.Fatal(err)
	}
	rep, err := Of(context.Background(), path+".gz", Options{})
	if err != nil {
		t.Fatal(err)
	}
	if !strings.HasPrefix(rep.Title, "actuator tracking") || len(rep.Notes) != 0 || rep.Samples != 10001 {
		t.Errorf("%q, notes %q, %d samples", rep.Title, rep.Notes, rep.Samples)
	}
}

// With slowdown λ the log's seconds are model seconds; delays are physical.
func TestSlowdownMakesDelaysPhysical(t *testing.T) {
	path := logged(t, 10, func(float64) (float64, float64) { return 1, 0.002 })
	rep, err := Of(context.Background(), path, Options{Slowdown: 5})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "delay", float64(rep.Channels[0].Delay), 0.010, 1e-5)
	if rep.Rate != 200 || rep.Time != 10 {
		t.Errorf("%v Hz, %v s", rep.Rate, rep.Time)
	}
}

// A pure delay and an inverse that is right: the lane that compensates ranks before
// the one that does not, and a log without a channel's name is that of the only one.
func TestAgainstRanksTheLanes(t *testing.T) {
	// The target begins at full speed, which no limit must end.
	s, err := scenarios.Load("tracking", scenarios.Change{Path: "actuator.limits.velocity", Value: "10 m/s"})
	if err != nil {
		t.Fatal(err)
	}
	path := logged(t, 10, func(float64) (float64, float64) { return 1, 0.008 })
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(strings.ReplaceAll(string(text), "a.", "")), 0o644); err != nil {
		t.Fatal(err)
	}
	rep, err := Of(context.Background(), path, Options{Against: s})
	if err != nil {
		t.Fatal(err)
	}
	lanes := rep.Against.Channels[0].Lanes
	names := make([]string, len(lanes))
	for i, l := range lanes {
		names[i] = l.Name
	}
	if got := strings.Join(names, " "); got != "recorded configured none polynomial" {
		t.Fatalf("lanes %s", got)
	}
	// 7 ms of delay and 5 ms of lag: at 2 Hz the actuator is τ + atan(ωT)/ω late.
	late := 0.007 + math.Atan(omega*0.005)/omega
	near(t, "delay without a compensator", float64(lanes[2].Channels[0].Delay), late, 1e-5)
	near(t, "delay of the record", float64(lanes[0].Channels[0].Delay), 0.008, 1e-6)
	if !(lanes[1].Channels[0].NRMSE < lanes[0].Channels[0].NRMSE && lanes[0].Channels[0].NRMSE < lanes[2].Channels[0].NRMSE) {
		t.Errorf("errors %v, %v, %v", lanes[1].Channels[0].NRMSE, lanes[0].Channels[0].NRMSE, lanes[2].Channels[0].NRMSE)
	}
	if len(rep.Notes) != 1 || !strings.Contains(rep.Notes[0], "driven at the log's rate, 1000 Hz") {
		t.Errorf("notes %q", rep.Notes)
	}
	two, err := scenarios.Load("piperack")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Of(context.Background(), path, Options{Against: two}); err == nil || !strings.Contains(err.Error(), "--map brace-low.target=…") {
		t.Errorf("%v", err)
	}
}

// The table of windows reads as CSV, a row to a window, whatever the channel's name.
func TestTableOfWindows(t *testing.T) {
	path := logged(t, 10, func(float64) (float64, float64) { return 1, 0.002 })
	rep, err := Of(context.Background(), path, Options{Window: 1})
	if err != nil {
		t.Fatal(err)
	}
	rep.Channels[0].Name = `north, "upper"`
	records, err := csv.NewReader(strings.NewReader(string(rep.CSV()))).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(records) != 1+len(rep.Channels[0].Windows) || records[1][0] != rep.Channels[0].Name || records[0][6] != "delay_s" {
		t.Fatalf("%d records, %q", len(records), records[1])
	}
	if got, err := strconv.ParseFloat(records[3][6], 64); err != nil || got != float64(rep.Channels[0].Windows[2].Delay) {
		t.Errorf("delay %v, %v", got, err)
	}
}

// However many windows there are, so many are kept, and of those that go the ones
// with the smaller error.
func TestWindowsAreThinned(t *testing.T) {
	w := newWindows(1e-3, 32)
	for i := range 3 * windowsMost {
		one := Window{first: int64(i), PeakError: 1}
		if i == 100001 {
			one.PeakError = 7
		}
		w.keep(one)
	}
	worst := 0.0
	for _, d := range w.done {
		worst = max(worst, float64(d.PeakError))
	}
	if len(w.done) > windowsMost || len(w.done) < windowsMost/2 || worst != 7 {
		t.Errorf("%d windows, the worst %v", len(w.done), worst)
	}
}
