package identified

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/plant"
	"antelag/plant/identify"
	"antelag/rtloop"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
)

// logged runs a scenario and keeps its log, as run does.
func logged(t *testing.T, name string, sets ...string) string {
	t.Helper()
	var changes []scenarios.Change
	for _, text := range sets {
		c, err := scenarios.ParseChange(text)
		if err != nil {
			t.Fatal(err)
		}
		changes = append(changes, c)
	}
	s, err := scenarios.Load(name, changes...)
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "log.csv")
	log, err := runlog.Create(path, s.ChannelNames(), s.Excitation.Drives, s.Resolved(), false)
	if err != nil {
		t.Fatal(err)
	}
	_, err = accept.Run(context.Background(), s, accept.Options{Observe: func(lane string) func(*rtloop.Loop) error {
		if lane != scenarios.Configured {
			return nil
		}
		return log.Row
	}})
	if err != nil {
		t.Fatal(err)
	}
	if err := log.Close(); err != nil {
		t.Fatal(err)
	}
	return path
}

func of(t *testing.T, path string, o Options) *Report {
	t.Helper()
	r, err := Of(context.Background(), path, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func check(t *testing.T, name string, e identify.Estimate, want, tolerance float64) {
	t.Helper()
	if math.Abs(e.Value-want) > max(tolerance, 3*e.Sigma) {
		t.Errorf("%s %v ± %v, want %v", name, e.Value, e.Sigma, want)
	}
}

func TestLogsOfRunGiveTheActuatorBack(t *testing.T) {
	for _, c := range []struct {
		name       string
		sets       []string
		delay, lag float64
	}{
		{"tracking", []string{"loop.duration=10 s"}, 7e-3, 5e-3},
		{"in a loop", []string{"loop.rate=512 Hz", "loop.duration=12 s"}, 8e-3, 6e-3},
		{"slowed down", []string{"loop.slowdown=4", "loop.rate=512 Hz", "loop.duration=10 s"}, 7e-3, 5e-3},
		{"held", []string{"loop.hold=step", "loop.rate=512 Hz", "loop.duration=10 s"}, 7e-3, 5e-3},
	} {
		scenario := "tracking"
		if c.name == "in a loop" {
			scenario = "archive"
		}
		r := of(t, logged(t, scenario, c.sets...), Options{})
		if r.Best().Kind != "lag-delay" {
			t.Errorf("%s: %s", c.name, r.Best().Kind)
		}
		check(t, c.name+": delay", r.LagDelay.Delay, c.delay, 1e-4)
		check(t, c.name+": lag", r.LagDelay.Lag, c.lag, 0.02*c.lag)
		check(t, c.name+": gain", r.LagDelay.Gain, 1, 0.02)
		check(t, c.name+": total", r.LagDelay.Total, c.delay+c.lag, 1e-4)
	}
}

// The block goes into a scenario, for both kinds, and says what was fitted.
func TestTheBlockLoads(t *testing.T) {
	for _, c := range []struct {
		sets []string
		kind string
	}{
		{nil, "lag-delay"},
		{[]string{"actuator.actuator.kind=second-order", "actuator.actuator.frequency=15 Hz", "actuator.actuator.damping_ratio=0.6"}, "second-order"},
	} {
		r := of(t, logged(t, "tracking", append(c.sets, "loop.rate=512 Hz", "loop.duration=20 s")...), Options{})
		if err := r.Usable(); err != nil {
			t.Fatal(err)
		}
		text, err := scenarios.Text("tracking")
		if err != nil {
			t.Fatal(err)
		}
		before, after, ok := strings.Cut(string(text), "[channel.actuator]\n")
		_, after, ok2 := strings.Cut(after, "[[channel.specimen]]")
		if !ok || !ok2 {
			t.Fatal("the scenario has changed its form")
		}
		pasted := before + r.Block() + "[[channel.specimen]]" + after
		s, err := scenarios.Parse("pasted.toml", []byte(pasted), ".")
		if err != nil {
			t.Fatalf("%v in\n%s", err, r.Block())
		}
		if _, err := s.Build(); err != nil {
			t.Fatal(err)
		}
		a := s.Channels[0].Actuator
		if a.Kind.Name != c.kind {
			t.Fatalf("kind %s, want %s", a.Kind.Name, c.kind)
		}
		for name, v := range r.Best().Settings() {
			// Six digits are written.
			if got := a.Values.Num(name); math.Abs(got-v.Num) > 1e-5*math.Abs(v.Num)+1e-12 {
				t.Errorf("%s: %v was written, %v fitted", name, got, v.Num)
			}
		}
	}
}

// A foreign table: another unit, other headings, no provenance.
func TestForeignTables(t *testing.T) {
	entry, err := plant.Actuators.Find("lag-delay")
	if err != nil {
		t.Fatal(err)
	}
	a, err := entry.New(plant.Timing{Tick: 1.0 / 512}, kind.Values{"delay": kind.Num(0.01), "lag": kind.Num(0.004), "gain": kind.Num(0.98)})
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	b.WriteString("t;drive;lvdt\n")
	none := plant.NewSpecimen()
	a.Start(0, none)
	phase := 0.0
	for k := range 8192 {
		u := 10 * math.Sin(phase)
		phase += 2 * math.Pi / 512 * (0.3 + 8*float64(k)/8192)
		y := 0.0
		if k > 0 {
			y, _ = a.Advance(u/1e3, none)
		}
		fmt.Fprintf(&b, "%.6f;%.6f;%.6f\n", float64(k)/512, u, 1e3*y)
	}
	path := filepath.Join(t.TempDir(), "lab.csv")
	if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	m, err := runlog.ParseMap("time=t,command=drive,measured=lvdt")
	if err != nil {
		t.Fatal(err)
	}
	u, err := runlog.ParseUnits("mm")
	if err != nil {
		t.Fatal(err)
	}
	r := of(t, path, Options{Log: runlog.Options{Map: m, Units: u}})
	check(t, "delay", r.LagDelay.Delay, 0.01, 1e-4)
	check(t, "lag", r.LagDelay.Lag, 0.004, 8e-5)
	check(t, "gain", r.LagDelay.Gain, 0.98, 0.002)

	// A slowdown that is given counts: everything takes longer.
	r = of(t, path, Options{Log: runlog.Options{Map: m, Units: u}, Slowdown: 10})
	check(t, "slowed delay", r.LagDelay.Total, 0.14, 1e-3)
}

func TestJSONIsWhatIsPromised(t *testing.T) {
	r := of(t, logged(t, "tracking", "loop.rate=512 Hz"), Options{})
	r.LagDelay.Lag.Sigma = math.Inf(1) // what is undefined is null
	text, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	var got map[string]any
	if err := json.Unmarshal(text, &got); err != nil {
		t.Fatal(err)
	}
	for _, key := range []string{"gain", "delay_s", "lag_s", "total_delay_s", "fit_nrmse", "coherence_min"} {
		if _, ok := got[key].(float64); !ok {
			t.Errorf("%s is %v", key, got[key])
		}
	}
	sigma := got["sigma"].(map[string]any)
	if v, there := sigma["lag_s"]; !there || v != nil {
		t.Errorf("an undefined standard error is %v", v)
	}
	if band := got["band_hz"].([]any); len(band) != 2 {
		t.Errorf("band_hz is %v", band)
	}
	frf := got["frf"].([]any)
	if len(frf) == 0 {
		t.Fatal("no frf")
	}
	for _, key := range []string{"hz", "gain", "delay_s", "coherence"} {
		if _, ok := frf[0].(map[string]any)[key].(float64); !ok {
			t.Errorf("frf %s is %v", key, frf[0])
		}
	}
	if sum := got["delay_s"].(float64) + got["lag_s"].(float64); math.Abs(sum-got["total_delay_s"].(float64)) > 1e-12 {
		t.Errorf("total_delay_s is %v, delay and lag %v", got["total_delay_s"], sum)
	}
}

func TestTextSaysWhatCounts(t *testing.T) {
	r := of(t, logged(t, "tracking", "loop.rate=512 Hz"), Options{})
	var b bytes.Buffer
	if err := r.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"The actuator answers 11.9", "late between", "lag-delay (taken)", "coherence at least", "[channel.actuator]\nkind = \"lag-delay\"\ndelay = \"", "amplitude"} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("%q is missing in\n%s", want, b.String())
		}
	}
	if _, err := r.Figure().SVG(); err != nil {
		t.Error(err)
	}
}

func TestLogsThatCannotBeFitted(t *testing.T) {
	dir := t.TempDir()
	write := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	var short, two, flipped strings.Builder
	short.WriteString("time,command,measured\n")
	two.WriteString("time,a.command [mm],a.measured [mm],b.command [mm],b.measured [mm]\n")
	flipped.WriteString("time,command [mm],measured [mm]\n")
	for k := range 400 {
		if k < 20 {
			fmt.Fprintf(&short, "%d,%d,%d\n", k, k%3, k%3)
		}
		fmt.Fprintf(&two, "%g,%d,%d,%d,%d\n", float64(k)/100, k%7, k%7, k%5, k%5)
		fmt.Fprintf(&flipped, "%g,%g,%g\n", float64(k)/100, math.Sin(float64(k*k)/4000), -math.Sin(float64(k*k)/4000))
	}
	for _, c := range []struct{ name, text, want string }{
		{"short.csv", strings.ReplaceAll(short.String(), "command,measured", "command [mm],measured [mm]"), "short.csv: 20 samples; a fit takes at least 64"},
		{"two.csv", two.String(), "two.csv: has the channels a, b; say which with --channel"},
		{"nocommand.csv", "time,target [mm],measured [mm]\n0,1,2\n1,2,3\n2,3,4\n", "command"},
		{"empty.csv", "", "empty.csv: is empty"},
	} {
		_, err := Of(context.Background(), write(c.name, c.text), Options{})
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	r := of(t, write("flipped.csv", flipped.String()), Options{})
	if err := r.Usable(); err == nil || !strings.Contains(err.Error(), "the fitted gain, -1") {
		t.Errorf("flipped: %v", err)
	}
	var b bytes.Buffer
	if err := r.WriteText(&b); err != nil || !strings.Contains(b.String(), "No block to paste") {
		t.Errorf("flipped: %v\n%s", err, b.String())
	}
}
