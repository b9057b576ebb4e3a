package main

import (
	"encoding/json"
	"encoding/xml"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// A lab's day at the prompt: record, hold, detune, find out, mean it.
func TestCheck(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "other.toml", rig)
	o := antelag(t, dir, "check", ".").good(t)
	if !strings.Contains(o.out, "PASS   rig.toml    limits met: 4 of 4  no baseline\n") || !strings.Contains(o.out, "2 scenarios: 2 passed\n") {
		t.Errorf("printed\n%s", o.out)
	}
	if o = antelag(t, dir, "check", ".", "--record").good(t); !strings.Contains(o.out, "PASS   rig.toml    limits met: 4 of 4  baseline recorded\n") {
		t.Errorf("printed\n%s", o.out)
	}
	before := listing(t, dir)
	antelag(t, dir, "check", ".").good(t)
	antelag(t, dir, "check", ".", "--record").good(t)
	antelag(t, dir, "check", "--only", "rig", ".", "rig.toml").good(t)
	o = antelag(t, dir, "check", ".", "--set", "damper.compensator.delay=10.1 ms")
	if o.code != exitFail || o.err != "" || !strings.Contains(o.out, "damper.compensator.delay  10 ms → 10.1 ms\n") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	unchanged(t, dir, before)

	write(t, filepath.Join(dir, "rig.toml"), edited(t, "yield_displacement = \"10 mm\"", "yield_displacement = \"10.1 mm\""))
	before = listing(t, dir)
	o = antelag(t, dir, "check", ".", "--json")
	var report struct {
		Pass      bool
		Scenarios []struct {
			Scenario string
			Pass     bool
			Baseline struct {
				State    string
				Settings []struct{ Path, Was, Is string } `json:"settings_changed"`
				Moved    []struct {
					Figure           string
					Was, Is, Allowed any
				}
			}
		}
	}
	if err := json.Unmarshal([]byte(o.out), &report); err != nil || o.code != exitFail || o.err != "" {
		t.Fatalf("exit %d, %v\n%s%s", o.code, err, o.out, o.err)
	}
	if s := report.Scenarios; report.Pass || len(s) != 2 || !s[0].Pass || s[1].Pass || s[1].Baseline.State != "moved" ||
		len(s[1].Baseline.Settings) != 1 || s[1].Baseline.Settings[0].Path != "damper.specimen[0].yield_displacement" || len(s[1].Baseline.Moved) < 5 {
		t.Errorf("%+v", report)
	}
	unchanged(t, dir, before)
	if o = antelag(t, dir, "check", "rig.toml", "--record").good(t); !strings.Contains(o.out, "baseline recorded anew: ") || !strings.Contains(o.out, "10 mm → 10.1 mm") {
		t.Errorf("printed\n%s", o.out)
	}
	antelag(t, dir, "check", ".").good(t)
}

// An embedded scenario keeps its baseline in the working directory.
func TestCheckEmbedded(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	antelag(t, dir, "check", "mast-release", "--record").good(t)
	read(t, dir, "mast-release.baseline.toml")
	antelag(t, dir, "check", "mast-release", "gantry-pulse").good(t)
	antelag(t, dir, "check", ".").complained(t, exitUsage, ".: there are no scenarios")
}

// Wrong usage and wrong files are one line and exit 2, and nothing is written.
func TestCheckRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "bad.toml", edited(t, "order = 2", "ordr = 2"), "held.toml", rig,
		"held.baseline.toml", "format = 1\nversion = \"1\"\n[lane.configured]\noutcome = \"completed\"\ndelay = 3\n", "old.xml", "precious")
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		want string
	}{
		{nil, "check takes PATH…"},
		{[]string{"nowhere"}, "nowhere: there is no such file"},
		{[]string{"bad.toml"}, "bad.toml:28: channel.compensator.ordr"},
		{[]string{"rig.toml", "held.toml"}, "held.baseline.toml:5: lane.configured.delay: unknown figure"},
		{[]string{"held.baseline.toml"}, "is a baseline"},
		{[]string{".", "--record"}, "bad.toml:28: "},
		{[]string{"rig.toml", "--record", "--set", "loop.seed=4"}, "--record keeps"},
		{[]string{"rig.toml", "--set", "loop.sed=4"}, "--set loop.sed: "},
		{[]string{"rig.toml", "--set", "x"}, "--set: "},
		{[]string{"rig.toml", "--only", "[x"}, "--only: "},
		{[]string{"rig.toml", "--only", "none"}, "--only none: matches none"},
		{[]string{".", "--junit", "rig.toml", "--force"}, "--junit: rig.toml belongs to what is checked"},
		{[]string{"rig.toml", "--junit", "old.xml"}, "--junit: old.xml: file already exists; --force overwrites it"},
	} {
		antelag(t, dir, append([]string{"check"}, c.args...)...).refused(t, c.want)
	}
	unchanged(t, dir, before)
}

// In a directory, what does not read stands beside the results of the others;
// the exit code is that of bad input, and the line says where it is.
func TestCheckBrokenBesideGood(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "bad.toml", edited(t, "order = 2", "ordr = 2"))
	o := antelag(t, dir, "check", ".", "--junit", "out.xml")
	if o.code != exitUsage || !strings.HasPrefix(o.err, "antelag: bad.toml:28: ") || strings.Count(o.err, "\n") != 1 ||
		!strings.Contains(o.out, "ERROR  bad.toml  bad.toml:28: ") || !strings.Contains(o.out, "PASS   rig.toml  limits met") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	var suites struct {
		Tests, Failures, Errors int `xml:",attr"`
		Suites                  []struct {
			Name string `xml:"name,attr"`
		} `xml:"testsuite"`
	}
	if err := xml.Unmarshal([]byte(read(t, dir, "out.xml")), &suites); err != nil || len(suites.Suites) != 2 {
		t.Errorf("%v, %+v", err, suites)
	}
}

// What cannot be written is said, exit 1, and what was there stays.
func TestCheckCannotWrite(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	antelag(t, dir, "check", "rig.toml", "--record").good(t)
	write(t, filepath.Join(dir, "rig.toml"), edited(t, `delay = "10 ms"`, `delay = "11 ms"`))
	before := listing(t, dir)

	// The limit on the size of a file does here what a full disk does.
	cmd := command(dir)
	cmd.Path = "/bin/sh"
	cmd.Args = []string{"sh", "-c", `ulimit -f 1; exec "$0" check rig.toml --record`, binary}
	o := finish(t, cmd)
	if o.code != exitFail || !strings.Contains(o.err, "baseline not recorded: rig.baseline.toml is as it was: ") || !strings.Contains(o.err, "file too large") || strings.Count(o.err, "\n") != 1 {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	unchanged(t, dir, before)

	for _, junit := range []string{"nowhere/x.xml", "rig.toml/x.xml"} {
		if o := antelag(t, dir, "check", "rig.toml", "--only", "rig", "--junit", junit, "--force"); o.code != exitFail || !strings.Contains(o.err, "--junit: ") {
			t.Errorf("exit %d\n%s", o.code, o.err)
		}
	}
	if err := os.Symlink("/dev/full", filepath.Join(dir, "full.xml")); err != nil {
		t.Fatal(err)
	}
	if o := antelag(t, dir, "check", "rig.toml", "--junit", "full.xml", "--force"); o.code != exitFail || !strings.Contains(o.err, "no space left on device") {
		t.Errorf("exit %d\n%s", o.code, o.err)
	}
	if got := read(t, dir, "rig.baseline.toml"); got != before["rig.baseline.toml"] {
		t.Error("the baseline was changed")
	}
}
