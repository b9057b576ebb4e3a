package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// coarse is a stability map that is worked out at once.
const coarse = "damper.actuator.delay=0:20 ms:5,damper.compensator.delay=0:20 ms:5"

// A report is written under a name with spaces, with its pictures, and comes to
// the same bytes again.
func TestReport(t *testing.T) {
	t.Parallel()
	dir := folder(t, "my rig.toml", rig)
	args := []string{"report", "my rig.toml", "--stability-map", coarse, "--date", "1 December", "--set", "loop.duration=4 s"}
	o := antelag(t, dir, append(args, "-o", "the page.html", "--plots", "some pictures")...).good(t)
	if !strings.HasPrefix(o.out, "PASS  my rig.toml: completed, limits met: 4 of 4") || !strings.HasSuffix(o.out, "\nwritten to the page.html\n") {
		t.Error(o.out)
	}
	page := read(t, dir, "the page.html")
	for _, want := range []string{"<title>one storey – test report</title>", "1 December", "loop.duration=4 s", "It is no interlock."} {
		if !strings.Contains(page, want) {
			t.Errorf("not on the page: %s", want)
		}
	}
	figures := strings.Count(page, "<figure>")
	if pictures := listing(t, filepath.Join(dir, "some pictures")); figures != 6 || len(pictures) != 2*figures || !strings.HasPrefix(pictures["my-rig-damper-tracking.svg"], "<svg ") ||
		!strings.HasPrefix(pictures["my-rig-damper-tracking.png"], "\x89PNG") {
		t.Errorf("%d figures, %d pictures", figures, len(pictures))
	}
	antelag(t, dir, append(args, "-o", "again.html")...).good(t)
	if read(t, dir, "again.html") != page {
		t.Error("the same input came to another page")
	}
}

// Several tests share a page; one that fails decides the exit code.
func TestReportOfSeveral(t *testing.T) {
	t.Parallel()
	dir := folder(t, "good.toml", rig, "bad.toml", edited(t, "nrmse = 0.2", "nrmse = 0.00001"))
	antelag(t, dir, "run", "good.toml", "--log", "log.csv").good(t)
	o := antelag(t, dir, "report", "good.toml", "bad.toml", "log.csv", "-o", "x.html", "--json", "--stability-map", coarse)
	var got struct {
		Report   string
		Pictures []string
		Tests    []struct {
			Name, Verdict string
			Pass          bool
			Run           *verdictJSON
		}
	}
	if err := json.Unmarshal([]byte(o.out), &got); err != nil || o.code != exitFail || o.err != "" {
		t.Fatalf("exit %d, %v\n%s%s", o.code, err, o.out, o.err)
	}
	if got.Report != "x.html" || len(got.Tests) != 3 || got.Tests[0].Verdict != "PASS" || got.Tests[1].Verdict != "FAIL" || got.Tests[2].Verdict != "RECORD" ||
		got.Tests[0].Run == nil || got.Tests[2].Run != nil || !got.Tests[2].Pass {
		t.Errorf("%+v", got)
	}
	if page := read(t, dir, "x.html"); !strings.Contains(page, "Of 3 tests: 1 passed, 1 failed and 1 of records, which are not judged.") {
		t.Error("the page does not sum up")
	}
}

// What is wrong is said in one line before anything runs or is written.
func TestReportRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "old.html", "precious\n", "log.csv", "time,target,measured\n0,0,0\n1,1,1\n2,0,0\n", "words.csv", "no,numbers\n")
	if err := os.Mkdir(filepath.Join(dir, "folder.html"), 0o755); err != nil {
		t.Fatal(err)
	}
	before := listing(t, dir)
	for _, c := range []struct {
		args string
		want []string
	}{
		{"", []string{"report takes a SCENARIO: a file, or one of archive", "or a LOG"}},
		{"rig.toml", []string{"report needs -o FILE.html"}},
		{"rig.toml -o old.html", []string{"-o: old.html: file already exists; --force overwrites it"}},
		{"rig.toml -o folder.html", []string{"-o: folder.html: file already exists and is a directory; a file name is needed"}},
		{"rig.toml -o folder.html --force", []string{"is a directory"}},
		{"rig.toml -o rig.toml --force", []string{"-o: rig.toml is what the report is about; choose another name"}},
		{"rig.toml -o x.html --plots old.html", []string{"--plots: old.html: file already exists and is no directory"}},
		{"gone.toml -o x.html", []string{"gone.toml: there is no such file"}},
		{"rig.toml -o x.html --set loop.rte=5", []string{`unknown`, `did you mean "rate"`}},
		{"rig.toml -o x.html --stability-map loop.rate", []string{"is not two ranges"}},
		{"rig.toml -o x.html --sweep gone.csv", []string{"sweep: open gone.csv: no such file"}},
		{"rig.toml -o x.html --sweep log.csv", []string{"sweep: log.csv: has no column of a figure that the scenario judges"}},
		{"rig.toml archive -o x.html --sweep log.csv", []string{"--sweep takes one scenario at a time"}},
		{"rig.toml -o x.html --map time=1", []string{"--map is for logs, and only scenarios are given"}},
		{"log.csv -o x.html --set loop.rate=5", []string{"--set is for scenarios, and only logs are given"}},
		{"gone.csv -o x.html", []string{"gone.csv: no such file"}},
		{"words.csv -o x.html", []string{"words.csv"}},
	} {
		antelag(t, dir, append([]string{"report"}, strings.Fields(c.args)...)...).refused(t, c.want...)
		unchanged(t, dir, before)
	}
	for _, place := range []string{"nowhere", "old.html"} {
		antelag(t, dir, "report", "rig.toml", "-o", place+"/x.html").complained(t, exitFail, "-o: "+place+"/x.html: there is no directory "+place)
	}
	unchanged(t, dir, before)
}

// A disk that takes no more is a failure that leaves what was there and nothing
// that is half written. The limit on the size of a file does here what a full
// disk does.
func TestReportOnAFullDisk(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "old.html", "precious\n")
	before := listing(t, dir)
	for _, out := range []string{"old.html", "new.html"} {
		cmd := command(dir)
		cmd.Path = "/bin/sh"
		cmd.Args = []string{"sh", "-c", `ulimit -f 100; exec "$0" report rig.toml --stability-map "$1" --force -o ` + out, binary, coarse}
		finish(t, cmd).complained(t, exitFail, "-o: write "+out+": file too large")
		unchanged(t, dir, before)
	}
	antelag(t, dir, "report", "rig.toml", "--stability-map", coarse, "--force", "-o", "/dev/full").complained(t, exitFail, "no space left on device")
}
