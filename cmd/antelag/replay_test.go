package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func decoded(t *testing.T, text string) map[string]any {
	t.Helper()
	var v map[string]any
	if err := json.Unmarshal([]byte(text), &v); err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return v
}

// same compares two JSON values; numbers may differ by rounding.
func same(t *testing.T, where string, want, got any) {
	t.Helper()
	switch w := want.(type) {
	case map[string]any:
		g, ok := got.(map[string]any)
		if !ok {
			t.Errorf("%s: %v, want %v", where, got, want)
			return
		}
		for k, v := range w {
			same(t, where+"."+k, v, g[k])
		}
	case []any:
		g, _ := got.([]any)
		if len(g) != len(w) {
			t.Errorf("%s: %d elements, want %d", where, len(g), len(w))
			return
		}
		for i := range w {
			same(t, where, w[i], g[i])
		}
	case float64:
		// The samples are the very same. What is added up in another order, or
		// over another window, differs by rounding.
		if g, ok := got.(float64); !ok || math.Abs(g-w) > 1e-11*math.Abs(w) {
			t.Errorf("%s: %v, want %v", where, got, want)
		}
	default:
		if got != want {
			t.Errorf("%s: %v, want %v", where, got, want)
		}
	}
}

// replay finds in a log what run found when it wrote it: every gauge that can be
// had from a log, of noisy sensors, of two channels, slowed down, of a driven
// target, and with response spectra.
func TestReplayFindsWhatRunFound(t *testing.T) {
	for _, c := range [][]string{
		{"rig.toml"},
		{"rig.toml", "--set", "loop.slowdown=3"},
		{"rig.toml", "--log-lane", "late"},
		{"piperack"},
		{"tracking", "--set", "loop.duration=20 s"},
		{"table"},
	} {
		t.Run(strings.Join(c, " "), func(t *testing.T) {
			t.Parallel()
			dir := folder(t, "rig.toml", rig)
			ran := antelag(t, dir, append([]string{"run", "--json", "--log", "x.csv"}, c...)...)
			replayed := decoded(t, antelag(t, dir, "replay", "x.csv", "--json").good(t).out)
			lane := decoded(t, ran.out)["lanes"].([]any)[0].(map[string]any)
			if len(c) > 2 && c[1] == "--log-lane" {
				lane = decoded(t, ran.out)["lanes"].([]any)[1].(map[string]any)
			}
			channels := replayed["channels"].([]any)
			for i, want := range lane["channels"].([]any) {
				w, g := want.(map[string]any), channels[i].(map[string]any)
				// What no log holds: the actuator's velocity, and what commanded it.
				for _, k := range []string{"peak_velocity_m_s", "compensator", "coefficients"} {
					delete(w, k)
				}
				same(t, w["name"].(string), w, g)
			}
			energy := lane["energy"].(map[string]any)
			if energy["injected_J"] != nil {
				for _, k := range []string{"injected_J", "specimen_J", "margin_min", "margin_final"} {
					if k == "specimen_J" { // that of a run counts what was stored at the start
						continue
					}
					same(t, "energy."+k, energy[k], replayed["energy"].(map[string]any)[k])
				}
			}
		})
	}
}

// The windows of a table of our own making, in mm and with decimal commas, are
// those of the same test in SI.
func TestReplayOfAForeignTable(t *testing.T) {
	dir := folder(t, "rig.toml", rig)
	antelag(t, dir, "run", "rig.toml", "--log", "x.csv")
	own := decoded(t, antelag(t, dir, "replay", "x.csv", "--json", "--window", "2 s").good(t).out)
	log := readLog(t, filepath.Join(dir, "x.csv"))
	var b strings.Builder
	b.WriteString("Versuch 7\nZeit;Soll;Ist;Kraft\n")
	x, y, r := log.column("damper.target_m"), log.column("damper.measured_m"), log.column("damper.force_N")
	for k, at := range log.column("time_s") {
		b.WriteString(strings.ReplaceAll(strings.Join([]string{exact(at), exact(1e3 * x[k]), exact(1e3 * y[k]), exact(r[k] / 1e3)}, ";"), ".", ",") + "\n")
	}
	write(t, filepath.Join(dir, "y.txt"), b.String())
	foreign := decoded(t, antelag(t, dir, "replay", "y.txt", "--json", "--window", "2 s", "--map", "time=Zeit,target=Soll,measured=Ist,force=4", "--units", "mm,kN").good(t).out)
	w, g := own["channels"].([]any)[0].(map[string]any), foreign["channels"].([]any)[0].(map[string]any)
	same(t, "nrmse", w["nrmse"], g["nrmse"])
	same(t, "delay_s", w["delay_s"], g["delay_s"])
	for i, window := range w["windows"].([]any) {
		one := window.(map[string]any)
		delete(one, "energy_margin")
		for k, v := range one {
			if s, ok := v.(float64); ok { // 1e-15 of a value in metres, on sums that cancel
				if other := g["windows"].([]any)[i].(map[string]any)[k].(float64); math.Abs(other-s) > 1e-8*math.Abs(s)+1e-9 {
					t.Errorf("window %d, %s: %v, want %v", i, k, other, s)
				}
			}
		}
	}
}

func exact(v float64) string {
	b, err := json.Marshal(v)
	if err != nil {
		panic(err) // of a number
	}
	return string(b)
}

// Driven with its own log's target, the configured lane comes to what it came to in
// the run, when the target was driven there too.
func TestReplayAgainst(t *testing.T) {
	dir := folder(t, "rig.toml", rig)
	ran := decoded(t, antelag(t, dir, "run", "tracking", "--json", "--log", "x.csv", "--set", "loop.duration=20 s").good(t).out)
	out := antelag(t, dir, "replay", "x.csv", "--json", "--against", "tracking").good(t)
	against := decoded(t, out.out)["against"].(map[string]any)["channels"].([]any)[0].(map[string]any)["lanes"].([]any)
	if against[0].(map[string]any)["name"] != "recorded" {
		t.Errorf("the first lane is %v", against[0].(map[string]any)["name"])
	}
	lanes := ran["lanes"].([]any)
	for i, lane := range lanes {
		w, g := lane.(map[string]any)["channels"].([]any)[0], against[1+i].(map[string]any)["channels"].([]any)[0]
		// The very last target ahead of the end is not in the log, so that the last
		// derivative differs.
		for _, k := range []string{"nrmse", "delay_s", "amplitude_ratio"} {
			a, b := w.(map[string]any)[k].(float64), g.(map[string]any)[k].(float64)
			if math.Abs(a-b) > 1e-6*(1+math.Abs(a)) {
				t.Errorf("lane %d, %s: %v, want %v", i, k, b, a)
			}
		}
	}
	text := antelag(t, dir, "replay", "x.csv", "--against", "tracking").good(t).out
	if !strings.Contains(text, "nothing is said about stability") || !strings.Contains(text, "1. ") {
		t.Errorf("no ranking, or none that says what it does not say:\n%s", text)
	}
	// A lane that fails decides the exit code; --set reaches the scenario.
	if got := antelag(t, dir, "replay", "x.csv", "--against", "tracking", "--set", "actuator.compensator.kind=none"); got.code != exitFail || got.err != "" || !strings.Contains(got.out, "FAIL") {
		t.Errorf("exit %d\n%s%s", got.code, got.out, got.err)
	}
	antelag(t, dir, "replay", "x.csv", "--against", "rig.toml").refused(t, `has no channel "actuator"`, "damper")
	antelag(t, dir, "replay", "x.csv", "--set", "loop.rate=1 Hz").refused(t, "--set", "--against")
}

func TestReplayWritesAndRefuses(t *testing.T) {
	dir := folder(t, "rig.toml", rig, "other.csv", "precious\n", "bad.csv", "time_s,a.target_m,a.measured_m\n0,0,0\n1,x,0\n2,0,0\n")
	antelag(t, dir, "run", "rig.toml", "--log", "x.csv")
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		want []string
	}{
		{nil, []string{"replay takes one LOG"}},
		{[]string{"none.csv"}, []string{"none.csv", "no such file"}},
		{[]string{"bad.csv", "--csv", "w.csv"}, []string{"bad.csv:3: column 2 (a.target)", `"x" is not a number`}},
		{[]string{"rig.toml"}, []string{"rig.toml:"}},
		{[]string{"x.csv", "--csv", "other.csv"}, []string{"--csv: other.csv", "--force"}},
		{[]string{"x.csv", "--csv", "x.csv", "--force"}, []string{"belongs to the log itself"}},
		{[]string{"x.csv", "--png", "x.gif"}, []string{"--png", ".png or .svg"}},
		{[]string{"x.csv", "--window", "2 mm"}, []string{"--window", "is a length (m); it must be a time (s)"}},
		{[]string{"x.csv", "--window", "1 ms"}, []string{"window: 0.001 s is not between"}},
		{[]string{"x.csv", "--rate", "0 Hz"}, []string{"--rate", "above zero"}},
		{[]string{"x.csv", "--map", "soll=1"}, []string{"--map", `"soll" is none of time`}},
		{[]string{"x.csv", "--units", "mm,furlong"}, []string{"--units", "furlong"}},
		{[]string{"x.csv", "--slowdown", "0"}, []string{"--slowdown 0"}},
		{[]string{"x.csv", "--channel", "b"}, []string{`no channel is named "b"; there are: damper`}},
		{[]string{"x.csv", "--against", "nowhere"}, []string{"nowhere: there is no such file"}},
	} {
		antelag(t, dir, append([]string{"replay"}, c.args...)...).refused(t, c.want...)
		unchanged(t, dir, before)
	}
	antelag(t, dir, "replay", "x.csv", "--csv", "w.csv", "--png", "w.png").good(t)
	if rows := strings.Split(strings.TrimSpace(read(t, dir, "w.csv")), "\n"); len(rows) < 10 || strings.Count(rows[0], ",") != strings.Count(rows[3], ",") {
		t.Errorf("%d rows, the first %q", len(rows), rows[0])
	}
	if !strings.HasPrefix(read(t, dir, "w.png"), "\x89PNG") {
		t.Error("no picture")
	}
	antelag(t, dir, "replay", "x.csv", "--csv", "w.csv").refused(t, "w.csv", "--force")
	antelag(t, dir, "replay", "x.csv", "--csv", "w.csv", "--force").good(t)
	if _, err := os.Stat("/dev/full"); err == nil {
		full := antelag(t, dir, "replay", "x.csv", "--csv", "/dev/full", "--force")
		if full.code != exitFail || !strings.Contains(full.err, "no space left") || strings.Count(full.err, "\n") != 1 {
			t.Errorf("a full disk: exit %d, %q", full.code, full.err)
		}
	}
}
