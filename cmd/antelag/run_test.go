package main

import (
	"encoding/json"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"antelag/scenarios"
)

func TestAloneRunsTheDefault(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	o := antelag(t, dir).good(t)
	if !strings.HasPrefix(o.out, scenarios.Default+": ") || !strings.Contains(o.out, "\nPASS  configured lane: completed, limits met: 5 of 5\n") {
		t.Errorf("printed\n%s", o.out)
	}
	if strings.Contains(o.out, "FAIL") {
		t.Errorf("a good scenario prints a failure:\n%s", o.out)
	}
	unchanged(t, dir, nil)
}

func TestFailingScenario(t *testing.T) {
	t.Parallel()
	o := antelag(t, t.TempDir(), "run", "archive-uncompensated")
	if o.code != exitFail || o.err != "" || !strings.Contains(o.out, "\nFAIL  configured lane: completed, limits failed: 3 of 5\n") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
}

// Every embedded scenario comes to the expected end; run from the text that
// the program prints, or beside the others, it comes to the very same figures.
func TestEmbeddedScenarios(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	names := scenarios.Names()
	o := antelag(t, dir, append([]string{"run", "--json"}, names...)...)
	if o.code != exitFail || o.err != "" { // one of them is meant to fail
		t.Fatalf("exit %d: %s", o.code, o.err)
	}
	var all struct{ Runs []map[string]any }
	if err := json.Unmarshal([]byte(o.out), &all); err != nil {
		t.Fatal(err)
	}
	if len(all.Runs) != len(names) {
		t.Fatalf("%d runs of %d scenarios", len(all.Runs), len(names))
	}
	for i, name := range names {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			want := exitGood
			if name == "archive-uncompensated" {
				want = exitFail
			}
			text := antelag(t, dir, "scenarios", name).good(t).out
			write(t, filepath.Join(dir, name+"-copy.toml"), text)
			o := antelag(t, dir, "run", "--json", name+"-copy.toml")
			if o.code != want || o.err != "" {
				t.Errorf("exit %d, want %d\n%s", o.code, want, o.err)
			}
			var again map[string]any
			if err := json.Unmarshal([]byte(o.out), &again); err != nil {
				t.Fatal(err)
			}
			if again["scenario"] != name+"-copy.toml" || all.Runs[i]["scenario"] != name {
				t.Errorf("scenarios %v and %v", again["scenario"], all.Runs[i]["scenario"])
			}
			for _, key := range []string{"ticks", "rate_hz", "slowdown", "dt_s", "lanes"} {
				if !reflect.DeepEqual(again[key], all.Runs[i][key]) {
					t.Errorf("%s: %v and %v", key, again[key], all.Runs[i][key])
				}
			}
		})
	}
}

// Several scenarios are judged one after the other; one that fails is enough.
func TestSeveralScenarios(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "bad.toml", edited(t, "nrmse = 0.2", "nrmse = 0.001"))
	o := antelag(t, dir, "run", "bad.toml", "rig.toml")
	if o.code != exitFail || o.err != "" {
		t.Errorf("exit %d: %s", o.code, o.err)
	}
	bad, good := strings.Index(o.out, "bad.toml: one storey\n"), strings.Index(o.out, "\n\nrig.toml: one storey\n")
	if bad != 0 || good < 0 || !strings.Contains(o.out[:good], "\nFAIL  configured") || !strings.Contains(o.out[good:], "\nPASS  configured") {
		t.Errorf("printed\n%s", o.out)
	}
	antelag(t, dir, "run", "rig.toml", "rig.toml").good(t)
}

// A lane that is no good decides nothing.
func TestOnlyTheConfiguredLaneDecides(t *testing.T) {
	t.Parallel()
	o := antelag(t, folder(t, "rig.toml", rig), "run", "rig.toml").good(t)
	if !strings.Contains(o.out, "\n  FAIL  2. late ") {
		t.Errorf("the second lane does not fail:\n%s", o.out)
	}
}

func TestSet(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	v := verdict(t, antelag(t, dir, "run", "rig.toml", "--json", "--set", "loop.rate=2 kHz", "--set", `loop.duration="4 s"`,
		"--set", "loop.slowdown = 2", "--set", "damper.compensator.kind=inverse", "--set", "damper.compensator.delay=11 ms",
		"--set", "lane.late.compensator.kind=inverse", "--set", "lane.late.compensator.delay=11 ms").good(t))
	if v.Rate != 2000 || v.Slowdown != 2 || v.Ticks != 16000 || v.Step != 0.00025 {
		t.Errorf("rate %g Hz, slowdown %g, %d ticks of %g s", v.Rate, v.Slowdown, v.Ticks, v.Step)
	}
	// α = 1 + τ/dt of the inverse method, with the physical tick of 0.5 ms.
	c := v.Lanes[0].Channels[0]
	if alpha := c.Coefficients["alpha"]; c.Compensator != "inverse" || alpha == nil || *alpha != 23 {
		t.Errorf("%s, %v", c.Compensator, c.Coefficients)
	}
	v.Lanes[1].Name = v.Lanes[0].Name
	if !reflect.DeepEqual(v.Lanes[0], v.Lanes[1]) {
		t.Errorf("two lanes set alike differ:\n%+v\n%+v", v.Lanes[0], v.Lanes[1])
	}
}

func TestTrip(t *testing.T) {
	t.Parallel()
	o := antelag(t, folder(t, "rig.toml", rig), "run", "rig.toml", "--set", "damper.limits.stroke=5 mm")
	if o.code != exitFail || o.err != "" || !strings.Contains(o.out, "\nFAIL  configured lane: TRIPPED at ") ||
		!strings.Contains(o.out, " of 8 s, channel damper: stroke 5.") || !strings.Contains(o.out, " mm, allowed 5 mm\n") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
}

// Late by a third of a period, and stiffer than the structure: this grows.
func TestDivergence(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", strings.Replace(edited(t, `delay = "8 ms"`, `delay = "250 ms"`), "[channel.limits]\nstroke = \"200 mm\"\n", "", 1))
	set := []string{"run", "rig.toml", "--set", "damper.specimen.stiffness=8 kN/mm", "--set", "damper.specimen.hardening=1",
		"--set", "loop.duration=60 s", "--set", "damper.compensator.kind=none"}
	o := antelag(t, dir, set...)
	if o.code != exitFail || o.err != "" || !strings.Contains(o.out, "\nFAIL  configured lane: DIVERGED at ") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	v := verdict(t, antelag(t, dir, append(set, "--json")...))
	l := v.Lanes[0]
	if l.Outcome != "diverged" || l.Trip == nil || !strings.Contains(o.out, l.Trip.Limit) || l.Trip.Limit == "" || l.Trip.Time <= 0 || l.Pass {
		t.Errorf("%s, %+v", l.Outcome, l.Trip)
	}
}

func TestNoColourInAPipe(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	for _, more := range []string{"COLORTERM=truecolor", "NO_COLOR=1", "TERM=dumb"} {
		cmd := command(dir, "run", "rig.toml")
		cmd.Env = append(cmd.Env, more)
		if o := finish(t, cmd).good(t); strings.Contains(o.out, "\x1b") {
			t.Errorf("%s: %q", more, o.out)
		}
	}
}

// A title or a name out of a file cannot move the cursor.
func TestTitleIsText(t *testing.T) {
	t.Parallel()
	o := antelag(t, folder(t, "rig.toml", edited(t, `"one storey"`, `"one\u001b[2Jstorey\nPASS"`)), "run", "rig.toml").good(t)
	if !strings.HasPrefix(o.out, "rig.toml: one [2Jstorey PASS\n") {
		t.Errorf("printed\n%q", o.out)
	}
}
