//go:build unix

package main

import (
	"bytes"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"antelag/scenarios"
)

func TestTuneRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t), "old.csv", "precious\n", "old.png", "precious\n")
	before := listing(t, dir)
	over := []string{"--over", "damper.compensator.delay=2 ms:30 ms"}
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"tune"}, "tune takes one SCENARIO"},
		{[]string{"tune", "s.toml"}, "nothing is tuned; say which settings and how far, like --over 'damper.compensator.delay=5 ms:20 ms'"},
		{[]string{"tune", "s.toml", "--over", "damper.compensator.delay=2 ms"}, "a range is given as SETTING=a:b"},
		{[]string{"tune", "s.toml", "--over", "damper.compensator.kind=1:2"}, "kind"},
		{append([]string{"tune", "s.toml", "--figure", "nrsme"}, over...), `did you mean "nrmse"?`},
		{append([]string{"tune", "s.toml", "--quantile", "7"}, over...), "a quantile of 7"},
		{append([]string{"tune", "s.toml", "--energy-margin", "much"}, over...), "--energy-margin"},
		{append([]string{"tune", "s.toml", "--delay-margin", "3 mm"}, over...), "--delay-margin"},
		{append([]string{"tune", "s.toml", "--command-velocity", "-1 m/s"}, over...), "-1 m/s is below 0"},
		{append([]string{"tune", "s.toml", "--time", "soon"}, over...), "--time"},
		{append([]string{"tune", "s.toml", "--time", "-1 s"}, over...), "is no time to search for"},
		{append([]string{"tune", "s.toml", "--runs", "5"}, over...), "5 runs are too few"},
		{append([]string{"tune", "s.toml", "--write", "old.csv"}, over...), "old.csv: file already exists; --force overwrites it"},
		{append([]string{"tune", "s.toml", "--write", "s.toml", "--force"}, over...), "is the scenario itself"},
		{append([]string{"tune", "s.toml", "--record", "old.csv"}, over...), "old.csv: exists, and there is no old.csv.toml"},
		{append([]string{"tune", "s.toml", "--png", "old.png"}, over...), "old.png"},
		{append([]string{"tune", "s.toml", "--png", "x.pdf"}, over...), "a picture ends in .png or .svg"},
		{append([]string{"tune", "tracking", "--delay-margin", "1 ms"}, "--over", "actuator.compensator.delay=2 ms:30 ms"), "--delay-margin: tracking:"},
	} {
		antelag(t, dir, c.args...).refused(t, c.want)
	}
	unchanged(t, dir, before)
}

// tuneJSON is all that tune --json says.
type tuneJSON struct {
	Scenario string  `json:"scenario"`
	Lane     string  `json:"lane"`
	Figure   string  `json:"figure"`
	Quantile float64 `json:"quantile"`
	Draws    int     `json:"draws"`
	Seed     int64   `json:"seed"`
	Pass     bool    `json:"pass"`
	Complete bool    `json:"complete"`
	Tried    int     `json:"tried"`
	Settings []struct {
		Name   string   `json:"name"`
		Before *float64 `json:"before"`
		After  *float64 `json:"after"`
		Low    float64  `json:"low"`
		High   float64  `json:"high"`
		Log    bool     `json:"log"`
	} `json:"settings"`
	Limits []struct {
		Name    string   `json:"name"`
		Limit   *float64 `json:"limit"`
		AtLeast bool     `json:"at_least"`
		Pass    bool     `json:"pass"`
	} `json:"limits"`
	Before *tuneCandidate  `json:"before"`
	Best   tuneCandidate   `json:"best"`
	Front  []tuneCandidate `json:"front"`
	Stands []struct {
		Limit   string   `json:"limit"`
		Got     *float64 `json:"got"`
		Nearest *float64 `json:"nearest"`
		Ever    bool     `json:"met_by_others"`
	} `json:"in_the_way"`
	Check    *sweepJSON `json:"other_draws"`
	Commands []string   `json:"commands"`
	Compute  struct {
		Wall    float64 `json:"wall_s"`
		Runs    int64   `json:"runs"`
		Workers int     `json:"workers"`
	} `json:"compute"`
}

type tuneCandidate struct {
	Settings map[string]*float64 `json:"settings"`
	Figure   *float64            `json:"figure"`
	Measured map[string]*float64 `json:"measured"`
	Pass     bool                `json:"pass"`
}

// Tune finds a setting that passes, writes it as a scenario that runs and whose
// worst case sweep finds again, and does not overwrite it.
func TestTune(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	args := []string{"tune", "s.toml", "--set", "damper.compensator.delay=4 ms", "--over", "damper.compensator.delay=1 ms:30 ms", "--draws", "6", "--json"}
	o := antelag(t, dir, append(args, "--write", "new.toml", "--png", "new.png", "--record", "new.csv")...).good(t)
	var got tuneJSON
	strictly(t, o.out, &got)
	if !got.Pass || !got.Complete || len(got.Settings) != 1 || got.Best.Figure == nil || got.Before == nil || *got.Best.Figure >= *got.Before.Figure {
		t.Errorf("%s", o.out)
	}
	s, err := scenarios.Load(filepath.Join(dir, "new.toml"))
	if err != nil {
		t.Fatal(err)
	}
	if v := s.Channels[0].Compensator.Values.Num("delay"); v != *got.Settings[0].After {
		t.Errorf("written %v, found %v", v, *got.Settings[0].After)
	}
	worst := 0.0
	for _, over := range [][]string{{"--draws", "6"}, {"--over", "damper.actuator.delay=0.004 s:0.012 s:2", "--over", "damper.actuator.lag=1 ms:5 ms:2"}, {"--over", "loop.seed=3:3:1"}} {
		var sum sweepJSON
		strictly(t, antelag(t, dir, append([]string{"sweep", "new.toml", "--json"}, over...)...).swept(t).out, &sum)
		for _, f := range sum.Figures {
			if f.Name == "response_error" {
				worst = max(worst, *f.Worst.Value)
			}
		}
	}
	if worst != *got.Best.Figure {
		t.Errorf("tuned to %v, sweep finds %v", *got.Best.Figure, worst)
	}
	antelag(t, dir, append(args, "--write", "new.toml")...).refused(t, "new.toml: file already exists")
	// With the record nothing is run again, with the same result.
	var again tuneJSON
	strictly(t, antelag(t, dir, append(args, "--record", "new.csv")...).good(t).out, &again)
	if again.Compute.Runs != 0 || *again.Best.Figure != *got.Best.Figure || again.Tried != got.Tried {
		t.Errorf("again %d runs, %v", again.Compute.Runs, *again.Best.Figure)
	}
}

func TestTuneThatCannotPass(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	o := antelag(t, dir, "tune", "s.toml", "--over", "damper.compensator.delay=1 ms:30 ms", "--draws", "2", "--command-velocity", "1 mm/s", "--write", "new.toml")
	if o.code != exitFail || !strings.Contains(o.out, "\nFAIL  no setting passes; the nearest is shown. In the way stands\n        command velocity, all runs: ") || o.err != "" {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	// The nearest is not written: it is not to be used.
	if _, err := scenarios.Load(filepath.Join(dir, "new.toml")); err == nil {
		t.Error("a scenario that does not pass was written")
	}
}

// Ctrl-C ends a search with what there is, exit 1; with the record it is gone on
// with.
func TestTuneInterrupted(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", strings.Replace(spreading(t), `"2 s"`, `"40 s"`, 1))
	cmd := command(dir, "tune", "s.toml", "--over", "damper.compensator.delay=1 ms:30 ms", "--record", "r.csv")
	var out, stderr bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &stderr
	start(t, cmd, filepath.Join(dir, "r.csv"), 300)
	if err := cmd.Process.Signal(syscall.SIGINT); err != nil {
		t.Fatal(err)
	}
	if code := ends(t, cmd); code != exitFail || stderr.Len() > 0 && !strings.Contains(stderr.String(), "before a single setting was tried") {
		t.Errorf("exit %d\n%s", code, stderr.String())
	}
	if out.Len() > 0 && !strings.Contains(out.String(), "the search was cut short") {
		t.Errorf("printed\n%s", out.String())
	}
}
