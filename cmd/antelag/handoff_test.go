package main

import (
	"crypto/sha256"
	"encoding/hex"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios"
)

// handoffJSON is what handoff --json prints.
type handoffJSON struct {
	Scenario string  `json:"scenario"`
	Lane     string  `json:"lane"`
	Digest   string  `json:"scenario_sha256"`
	Rate     float64 `json:"rate_hz"`
	Channels []struct {
		Name        string   `json:"name"`
		Compensator string   `json:"compensator"`
		Identifier  string   `json:"identifier"`
		StateBytes  int      `json:"state_bytes"`
		Steps       int      `json:"steps"`
		Peak        float64  `json:"peak_command_m"`
		DoubleBound float64  `json:"double_bound_m"`
		FloatBound  float64  `json:"float_bound_m"`
		Unguarded   []string `json:"unguarded"`
	} `json:"channels"`
	Files []string `json:"files"`
}

// files lists a directory.
func files(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	out := []string{}
	for _, e := range entries {
		out = append(out, e.Name())
	}
	return out
}

// A handoff says what it wrote, and the digest is that of the scenario beside it,
// which reads as a scenario.
func TestHandoff(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	out := antelag(t, dir, "handoff", "rig.toml", "-o", "to the lab", "--json").good(t).out
	var r handoffJSON
	strictly(t, out, &r)
	want := []string{"antelag_damper.h", "antelag_damper.c", "vectors.csv", "selftest.c", "Makefile", "scenario.toml"}
	c := r.Channels[0]
	if len(r.Channels) != 1 || c.Name != "damper" || c.Identifier != "antelag_damper" || r.Rate != 1000 || r.Lane != "configured" ||
		r.Scenario != "rig.toml" || !slices.Equal(r.Files, want) || c.Steps < 3000 || !(c.Peak > 0) || !(c.FloatBound >= c.DoubleBound) {
		t.Errorf("printed\n%s", out)
	}
	to := filepath.Join(dir, "to the lab")
	slices.Sort(want)
	if got := files(t, to); !slices.Equal(got, want) {
		t.Errorf("written: %v", got)
	}
	text := read(t, filepath.Join(to, "scenario.toml"))
	sum := sha256.Sum256([]byte(text))
	if r.Digest != hex.EncodeToString(sum[:]) {
		t.Error("the digest is another file's")
	}
	if _, err := scenarios.Load(filepath.Join(to, "scenario.toml")); err != nil {
		t.Error(err)
	}
	text = antelag(t, dir, "handoff", "rig.toml", "-o", "to the lab", "--force").good(t).out
	for _, w := range []string{"rig.toml, configured lane, 1000 ticks a second, in to the lab\n", "antelag_damper.h, .c", "make -C 'to the lab' test", "no interlock"} {
		if !strings.Contains(text, w) {
			t.Errorf("does not say %q:\n%s", w, text)
		}
	}
}

// Lanes, channels and changes choose what is handed over.
func TestHandoffChooses(t *testing.T) {
	t.Parallel()
	for _, c := range []struct {
		name string
		args []string
		want string // channel:kind
	}{
		{"configured", nil, "brace-low:polynomial brace-high:polynomial"},
		{"a lane for one channel", []string{"--lane", "high-adaptive"}, "brace-low:polynomial brace-high:adaptive-inverse"},
		{"one channel of it", []string{"--lane", "high-adaptive", "--channel", "brace-high"}, "brace-high:adaptive-inverse"},
		{"both, the other way round", []string{"--channel", "brace-high", "--channel", "brace-low"}, "brace-low:polynomial brace-high:polynomial"},
		{"changed", []string{"--set", "brace-low.compensator.kind=taylor"}, "brace-low:taylor brace-high:polynomial"},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			var r handoffJSON
			strictly(t, antelag(t, t.TempDir(), append([]string{"handoff", "piperack", "-o", "x", "--json"}, c.args...)...).good(t).out, &r)
			var got []string
			for _, ch := range r.Channels {
				got = append(got, ch.Name+":"+ch.Compensator)
			}
			if strings.Join(got, " ") != c.want {
				t.Errorf("handed over %v, want %s", got, c.want)
			}
		})
	}
}

// What is wrong is said in one line, and nothing is written.
func TestHandoffRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "file", "x\n", "bad.toml", strings.Replace(rig, "storey\"", "storey", 1))
	antelag(t, dir, "handoff", "rig.toml", "-o", "there").good(t)
	write(t, filepath.Join(dir, "scenario.toml"), rig)
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		code int
		want string
	}{
		{[]string{}, exitUsage, "handoff takes one SCENARIO"},
		{[]string{"rig.toml", "archive", "-o", "x"}, exitUsage, "handoff takes one SCENARIO"},
		{[]string{"rig.toml"}, exitUsage, "handoff needs -o DIR"},
		{[]string{"nowhere.toml", "-o", "x"}, exitUsage, "there is no such file"},
		{[]string{"bad.toml", "-o", "x"}, exitUsage, "bad.toml:1"},
		{[]string{"rig.toml", "-o", "x", "--lane", "othr"}, exitUsage, `--lane: unknown lane "othr"`},
		{[]string{"rig.toml", "-o", "x", "--channel", "damp"}, exitUsage, `--channel: unknown channel "damp"; did you mean "damper"?`},
		{[]string{"rig.toml", "-o", "x", "--set", "damper.compensator.order=9"}, exitUsage, "order: 9 is above 4"},
		{[]string{"rig.toml", "-o", "x", "--set", "damper.compensator.kind=adaptive-time-series", "--set", "damper.compensator.cutoff=500 Hz"}, exitUsage, "cutoff"},
		{[]string{"rig.toml", "-o", "there"}, exitUsage, "-o: there/antelag_damper.h: file already exists; --force overwrites it"},
		{[]string{"rig.toml", "-o", "file", "--force"}, exitUsage, "-o: file: file already exists, and is no directory"},
		{[]string{"scenario.toml", "-o", ".", "--force"}, exitUsage, "-o: scenario.toml is the scenario itself"},
		{[]string{"rig.toml", "-o", "file/x"}, exitFail, "-o: "},
		{[]string{"rig.toml", "-o", "/proc/self/nowhere"}, exitFail, "-o: mkdir /proc"},
	} {
		antelag(t, dir, append([]string{"handoff"}, c.args...)...).complained(t, c.code, c.want)
		unchanged(t, dir, before)
	}
}

// A scenario's words cannot become code.
func TestHandoffOfHostileWords(t *testing.T) {
	t.Parallel()
	const evil = `*/ int evil(void) { return 1; } /* <script>alert(1)</script> ??/`
	dir := folder(t, "rig.toml", strings.Replace(rig, `"one storey"`, `'`+evil+`'`, 1))
	antelag(t, dir, "handoff", "rig.toml", "-o", "x").good(t)
	for _, name := range []string{"antelag_damper.h", "antelag_damper.c", "selftest.c", "Makefile"} {
		text := read(t, filepath.Join(dir, "x", name))
		for _, w := range []string{"*/ int", "} /*", "??/"} {
			if strings.Contains(text, w) {
				t.Errorf("%s has %q", name, w)
			}
		}
	}
}
