package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// marginJSON is what margin --json promises.
type marginJSON struct {
	SpectralRadius *float64 `json:"spectral_radius"`
	Stable         bool     `json:"stable"`
	Mode           struct {
		Frequency *float64 `json:"frequency_hz"`
		Damping   *float64 `json:"damping_ratio"`
	} `json:"mode"`
	Channels []struct {
		Name     string   `json:"name"`
		Delay    *float64 `json:"delay_margin_s"`
		Critical *float64 `json:"critical_delay_s"`
		Gain     *float64 `json:"gain_margin"`
	} `json:"channels"`
	Together struct {
		Delay *float64 `json:"delay_margin_s"`
		Gain  *float64 `json:"gain_margin"`
	} `json:"together"`
}

func margins(t *testing.T, o outcome) (m marginJSON) {
	t.Helper()
	if err := json.Unmarshal([]byte(o.out), &m); err != nil {
		t.Fatalf("%v\n%s", err, o.out)
	}
	return m
}

// The margins as JSON; with that much more delay the loop is on the edge, with more
// it grows and the command fails.
func TestMargin(t *testing.T) {
	dir := folder(t, "rig.toml", rig)
	m := margins(t, antelag(t, dir, "margin", "rig.toml", "--json").good(t))
	c := m.Channels[0]
	if !m.Stable || *m.SpectralRadius >= 1 || *m.Mode.Damping <= 0 || *m.Mode.Frequency < 0.5 || *m.Mode.Frequency > 5 || c.Name != "damper" {
		t.Fatalf("%+v", m)
	}
	near(t, "critical delay", c.Critical, 8e-3+*c.Delay, 1e-12)
	near(t, "together", m.Together.Delay, *c.Delay, 1e-12)
	edge := func(share float64) outcome {
		return antelag(t, dir, "margin", "rig.toml", "--json", "--set", "damper.actuator.delay="+text(8e-3+share**c.Delay)+" s")
	}
	if m := margins(t, edge(0.999).good(t)); !m.Stable {
		t.Error("it grows below the critical delay")
	}
	o := edge(1.001)
	if m := margins(t, o); o.code != exitFail || m.Stable || *m.Channels[0].Delay >= 0 || o.err != "" {
		t.Errorf("exit %d beyond the critical delay: %+v %s", o.code, m, o.err)
	}
	words := antelag(t, dir, "margin", "rig.toml").good(t).out
	for _, want := range []string{"STABLE", "damping ratio", "extra delay", "damper", "initial stiffness"} {
		if !strings.Contains(words, want) {
			t.Errorf("the report does not say %q:\n%s", want, words)
		}
	}
	late := margins(t, antelag(t, dir, "margin", "rig.toml", "--json", "--lane", "late").good(t))
	if *late.Channels[0].Delay == *c.Delay {
		t.Error("another lane has the same margin")
	}
}

func text(v float64) string {
	b, _ := json.Marshal(v) //nolint:errcheck // a finite number
	return string(b)
}

const someMap = "damper.actuator.delay=0:60 ms:9,damper.compensator.delay=0:40 ms:7"

func TestMarginMap(t *testing.T) {
	dir := folder(t, "rig.toml", rig)
	o := antelag(t, dir, "margin", "rig.toml", "--map", someMap, "--csv", "m.csv", "--png", "m.png").good(t)
	antelag(t, dir, "margin", "rig.toml", "--map", someMap, "--png", "m.svg").good(t)
	for _, want := range []string{"up     damper.compensator.delay", "right  damper.actuator.delay", "◆ the scenario", "grows", "50", "ms"} {
		if !strings.Contains(o.out, want) {
			t.Errorf("the drawing does not say %q:\n%s", want, o.out)
		}
	}
	for _, line := range strings.Split(o.out, "\n") {
		if n := len([]rune(line)); n > 80 {
			t.Errorf("a line of %d columns:\n%s", n, line)
		}
	}
	rows := strings.Split(strings.TrimSpace(read(t, dir, "m.csv")), "\n")
	if rows[0] != "damper.actuator.delay_s,damper.compensator.delay_s,spectral_radius,damping_ratio,stable" || len(rows) != 1+9*7 {
		t.Errorf("%d rows under %s", len(rows), rows[0])
	}
	if !strings.HasPrefix(read(t, dir, "m.png"), "\x89PNG") || !strings.Contains(read(t, dir, "m.svg"), "<svg") {
		t.Error("the pictures are none")
	}
	var g struct {
		X, Y struct {
			Path, Unit string
			Values     []float64
			At         *float64
		}
		Radius [][]*float64 `json:"spectral_radius"`
	}
	o = antelag(t, dir, "margin", "rig.toml", "--map", someMap, "--json").good(t)
	if err := json.Unmarshal([]byte(o.out), &g); err != nil {
		t.Fatal(err)
	}
	if g.X.Path != "damper.actuator.delay" || g.X.Unit != "s" || len(g.X.Values) != 9 || *g.X.At != 8e-3 || len(g.Radius) != 7 || len(g.Radius[0]) != 9 {
		t.Errorf("%+v", g)
	}
	// The cell where the scenario has other delays is that scenario's radius.
	m := margins(t, antelag(t, dir, "margin", "rig.toml", "--json", "--set", "damper.actuator.delay=15 ms", "--set", "damper.compensator.delay=20 ms").good(t))
	if got := *g.Radius[3][2]; math.Abs(got-*m.SpectralRadius) > 1e-10 {
		t.Errorf("%v in the map, %v alone", got, *m.SpectralRadius)
	}
}

// What margin refuses: one line, exit 2, nothing written.
func TestMarginRefuses(t *testing.T) {
	dir := folder(t, "rig.toml", rig, "old.png", "precious")
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{}, "takes one SCENARIO"},
		{[]string{"nowhere.toml"}, "nowhere.toml"},
		{[]string{"rig.toml", "--lane", "later"}, `did you mean "late"`},
		{[]string{"rig.toml", "--png", "m.png"}, "there is no --map"},
		{[]string{"rig.toml", "--map", "loop.rate=500 Hz:900 Hz:3"}, "not two ranges"},
		{[]string{"rig.toml", "--map", "loop.rate=500 Hz:900 s:3,loop.slowdown=1:3:3"}, "time"},
		{[]string{"rig.toml", "--map", someMap, "--measure", "colour"}, "allowed are damping and radius"},
		{[]string{"rig.toml", "--map", someMap, "--png", "old.png"}, "--force overwrites it"},
		{[]string{"rig.toml", "--map", someMap, "--png", "m.pdf"}, "--png: m.pdf: a picture ends in .png or .svg"},
		{[]string{"rig.toml", "--map", someMap, "--csv", "rig.toml", "--force"}, "--csv: rig.toml is the scenario itself"},
		{[]string{"rig.toml", "--map", someMap, "--csv", "m.png", "--png", "./m.png"}, "--csv and --png name the same file"},
		{[]string{"rig.toml", "--map", someMap, "--workers", "-1"}, "--workers"},
		{[]string{"table"}, "excitation.drives: the excitation drives the target"},
		{[]string{"rig.toml", "--set", "damper.specimen.kind=viscous", "--set", "damper.specimen.force=50 kN",
			"--set", "damper.specimen.speed=0.2 m/s", "--set", "damper.specimen.exponent=0.5", "--set", "substructure.storey[0].stiffness=6 kN/mm"},
			"channel.specimen: viscous: with the exponent 0.5 force over velocity grows without bound"},
	} {
		antelag(t, dir, append([]string{"margin"}, c.args...)...).refused(t, c.want)
	}
	// Where there is no place for the map none is worked out.
	antelag(t, dir, "margin", "rig.toml", "--map", someMap, "--csv", "no/such/m.csv").
		complained(t, exitFail, "--csv: no/such/m.csv: there is no directory no/such")
	unchanged(t, dir, before)
	// A disk that is full is a failure.
	if _, err := os.Stat("/dev/full"); err == nil {
		if err := os.Symlink("/dev/full", filepath.Join(dir, "full.png")); err != nil {
			t.Fatal(err)
		}
		o := antelag(t, dir, "margin", "rig.toml", "--map", someMap, "--png", "full.png", "--force")
		if o.code != exitFail || !strings.Contains(o.err, "--png") {
			t.Errorf("exit %d: %s", o.code, o.err)
		}
	}
}
