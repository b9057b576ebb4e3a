package main

import (
	"bytes"
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"

	"antelag/scenarios"
)

// logged is a log read whole, by a reader that is not the program's own.
type logged struct {
	header []string
	values [][]float64 // by column; NaN where empty
	rows   int
	t      *testing.T
}

// readLog reads a log and checks its form: a header, whole rows of numbers,
// time that grows, and every number in full precision.
func readLog(t *testing.T, path string) *logged {
	t.Helper()
	text := read(t, path)
	if !strings.HasSuffix(text, "\n") {
		t.Errorf("%s does not end with a whole row: %q", path, text[max(0, len(text)-100):])
	}
	r := csv.NewReader(strings.NewReader(text))
	r.ReuseRecord = true
	header, err := r.Read()
	if err != nil {
		t.Fatal(err)
	}
	l := &logged{header: slices.Clone(header), values: make([][]float64, len(header)), t: t}
	for {
		row, err := r.Read()
		if row == nil {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		for i, cell := range row {
			v := math.NaN()
			if cell != "" || i < len(row)-1 { // the margin alone may be empty
				if v, err = strconv.ParseFloat(cell, 64); err != nil || strconv.FormatFloat(v, 'g', -1, 64) != cell {
					t.Fatalf("%s row %d: %q is not a number of full precision", path, l.rows, cell)
				}
			}
			l.values[i] = append(l.values[i], v)
		}
		l.rows++
	}
	time := l.column("time_s")
	if len(time) == 0 || time[0] != 0 {
		t.Fatalf("%s does not start at t = 0", path)
	}
	for k := 1; k < len(time); k++ {
		if !(time[k] > time[k-1]) {
			t.Fatalf("%s: time goes from %g s to %g s", path, time[k-1], time[k])
		}
	}
	return l
}

func (l *logged) column(name string) []float64 {
	l.t.Helper()
	i := slices.Index(l.header, name)
	if i < 0 {
		l.t.Fatalf("no column %s among %v", name, l.header)
	}
	return l.values[i]
}

// targets are the targets of all channels in one row.
func (l *logged) targets(row int) []float64 {
	var out []float64
	for i, name := range l.header {
		if strings.HasSuffix(name, ".target_m") {
			out = append(out, l.values[i][row])
		}
	}
	return out
}

func largest(values []float64) float64 {
	m := 0.0
	for _, v := range values {
		m = math.Max(m, math.Abs(v))
	}
	return m
}

// evaluationIndex is the frequency evaluation index of Guo et al. 2014 with
// exponent 2, from the spectra of whole records. A record whose length has a
// prime factor above 13 leaves out its first samples.
func evaluationIndex(x, y []float64, dt float64) (amplitude, delay, frequency float64) {
	smooth := func(n int) bool {
		for _, p := range []int{2, 3, 5, 7, 11, 13} {
			for n%p == 0 {
				n /= p
			}
		}
		return n == 1
	}
	for !smooth(len(x)) {
		x, y = x[1:], y[1:]
	}
	n := len(x)
	f := fourier.NewFFT(n)
	fx, fy := f.Coefficients(nil, x), f.Coefficients(nil, y)
	var re, im, power, moment float64
	for i := 1; i < len(fx); i++ {
		a, b, c, d := real(fx[i]), imag(fx[i]), real(fy[i]), imag(fy[i])
		re, im = re+a*c+b*d, im+a*d-b*c
		power += a*a + b*b
		moment += (a*a + b*b) * float64(i) / float64(n) / dt
	}
	frequency = moment / power
	return math.Hypot(re, im) / power, -math.Atan2(im, re) / (2 * math.Pi * frequency), frequency
}

func TestLogColumns(t *testing.T) {
	of := func(channels ...string) []string {
		var out []string
		for _, c := range channels {
			out = append(out, c+".target_m", c+".command_m", c+".measured_m", c+".force_N")
		}
		return out
	}
	for _, c := range []struct {
		scenario, drives string
		columns          []string
	}{
		{"piperack", "ground_m_s2", of("brace-low", "brace-high")},
		{"gantry-pulse", "applied_N", of("bearing")},
		{"tracking", "", of("actuator")},
		{"mast-release", "ground_m_s2", of("guy")},
	} {
		t.Run(c.scenario, func(t *testing.T) {
			t.Parallel()
			dir := t.TempDir()
			antelag(t, dir, "run", c.scenario, "--log", "x.csv", "--set", "loop.duration=1 s")
			l := readLog(t, filepath.Join(dir, "x.csv"))
			want := []string{"time_s"}
			if c.drives != "" {
				want = append(want, c.drives)
			}
			want = append(append(want, c.columns...), "energy_margin")
			if !reflect.DeepEqual(l.header, want) {
				t.Errorf("columns %v, want %v", l.header, want)
			}
			s, err := scenarios.Load(c.scenario)
			if err != nil {
				t.Fatal(err)
			}
			if rate := s.Loop.Num("rate"); l.rows != int(rate)+1 || l.column("time_s")[1] != 1/rate {
				t.Errorf("%d rows, the second at %g s, at %g Hz", l.rows, l.column("time_s")[1], rate)
			}
			switch c.scenario {
			case "gantry-pulse": // half a sine of 60 kN over 120 ms: its crest is at 60 ms
				if at := int(math.Round(0.06 * 4096)); math.Abs(l.column("applied_N")[at]-60e3) > 60e3*1e-4 {
					t.Errorf("applied %g N at 60 ms", l.column("applied_N")[at])
				}
			case "mast-release": // held at 40 mm, where the guy spans both storeys; to the rounding of the compensator's weights
				if x := l.targets(0)[0]; math.Abs(x-0.04) > 1e-15 || math.Abs(l.column("guy.measured_m")[0]-x) > 1e-15 ||
					math.Abs(l.column("guy.command_m")[0]-x) > 1e-15 || math.Abs(l.column("guy.force_N")[0]-0.3e6*x) > 1e-9 {
					t.Errorf("starts at %g m with %g N", x, l.column("guy.force_N")[0])
				}
			}
		})
	}
}

func TestLogLane(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	antelag(t, dir, "run", "rig.toml", "--log", "a.csv").good(t)
	antelag(t, dir, "run", "rig.toml", "--log", "b.csv", "--log-lane", "late").good(t)
	a, b := readLog(t, filepath.Join(dir, "a.csv")), readLog(t, filepath.Join(dir, "b.csv"))
	if !reflect.DeepEqual(a.column("ground_m_s2"), b.column("ground_m_s2")) {
		t.Error("two lanes have two motions")
	}
	same := func(l *logged) bool {
		return reflect.DeepEqual(l.column("damper.target_m"), l.column("damper.command_m"))
	}
	if same(a) || !same(b) { // the lane called late commands the target
		t.Error("one of the logs is of the wrong lane")
	}
	if text := read(t, dir, "b.csv.toml"); !strings.Contains(text, "\nlane = \"late\"\n") {
		t.Errorf("the provenance does not say the lane:\n%s", text)
	}
}

func TestLogOverwritesOnlyByForce(t *testing.T) {
	t.Parallel()
	for _, existing := range []string{"x.csv", "x.csv.toml"} {
		dir := folder(t, "rig.toml", rig, existing, "precious\n")
		before := listing(t, dir)
		antelag(t, dir, "run", "rig.toml", "--log", "x.csv").refused(t, existing+": file already exists; --force overwrites it")
		unchanged(t, dir, before)
		antelag(t, dir, "run", "rig.toml", "--log", "x.csv", "--force").good(t)
		if l := readLog(t, filepath.Join(dir, "x.csv")); l.rows != 8001 {
			t.Errorf("%d rows", l.rows)
		}
	}
	// A shorter run over a longer log leaves nothing of the longer.
	dir := folder(t, "rig.toml", rig)
	antelag(t, dir, "run", "rig.toml", "--log", "x.csv").good(t)
	antelag(t, dir, "run", "rig.toml", "--log", "x.csv", "--force", "--set", "loop.duration=1 s", "--set", "damper.compensator.order=1")
	if l := readLog(t, filepath.Join(dir, "x.csv")); l.rows != 1001 {
		t.Errorf("%d rows", l.rows)
	}
	if _, err := scenarios.Load(filepath.Join(dir, "x.csv.toml")); err != nil {
		t.Error(err)
	}
}

// The provenance of a log is a scenario that gives the same log, byte for
// byte, changes and lane included.
func TestProvenanceRunsAgain(t *testing.T) {
	dir := folder(t, append([]string{"rig.toml", rig, "record.toml"}, withRecord(t, "0\n0.1\n-0.2\n0.05\n0\n")[1:]...)...)
	for _, c := range []struct{ name, scenario, lane, set string }{
		{"a", "rig.toml", "late", "damper.actuator.lag=4.3 ms"},
		{"b", "record.toml", "configured", "loop.slowdown=1.7"},
		{"c", "tank", "configured", "loop.duration=5 s"},
	} {
		t.Run(c.scenario, func(t *testing.T) {
			t.Parallel()
			antelag(t, dir, "run", c.scenario, "--log", c.name+"1.csv", "--log-lane", c.lane, "--set", c.set)
			antelag(t, dir, "run", c.name+"1.csv.toml", "--log", c.name+"2.csv", "--log-lane", c.lane)
			first, second := read(t, dir, c.name+"1.csv"), read(t, dir, c.name+"2.csv")
			if len(first) < 1000 || first != second {
				t.Errorf("two logs of %d and %d bytes differ", len(first), len(second))
			}
			one, _, _ := strings.Cut(read(t, dir, c.name+"1.csv.toml"), "[provenance]")
			two, _, _ := strings.Cut(read(t, dir, c.name+"2.csv.toml"), "[provenance]")
			if one != two {
				t.Errorf("the provenances differ:\n%s\n%s", one, two)
			}
		})
	}
}

func TestUnwritableLog(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "plain", "precious\n")
	if err := os.Mkdir(filepath.Join(dir, "folder"), 0o755); err != nil {
		t.Fatal(err)
	}
	before := listing(t, dir)
	for log, want := range map[string]string{
		"nowhere/x.csv":          "nowhere/x.csv: no such file or directory",
		"plain/x.csv":            "plain/x.csv: not a directory",
		"folder":                 "folder: is a directory",
		strings.Repeat("x", 300): "file name too long",
		strings.Repeat("x", 252): "file name too long", // of the provenance alone
	} {
		antelag(t, dir, "run", "rig.toml", "--force", "--log", log).complained(t, exitFail, "--log: ", want)
		unchanged(t, dir, before)
	}
}

// A full disk ends the run, which says so, shows the figures of what ran, and
// exits 1.
func TestFullDisk(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	for _, name := range []string{"x.csv", "y.csv.toml"} {
		if err := os.Symlink("/dev/full", filepath.Join(dir, name)); err != nil {
			t.Fatal(err)
		}
	}
	o := antelag(t, dir, "run", "rig.toml", "--log", "x.csv", "--force")
	if o.code != exitFail || o.err != "antelag: lane configured: log: write x.csv: no space left on device\n" ||
		!strings.Contains(o.out, "\nFAIL  configured lane: INTERRUPTED after ") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	o = antelag(t, dir, "run", "rig.toml", "--log", "x.csv", "--force", "--json")
	if v := verdict(t, o); o.code != exitFail || v.Lanes[0].Outcome != "interrupted" || v.Lanes[0].Pass || v.Lanes[1].Outcome != "completed" {
		t.Errorf("exit %d, %s", o.code, o.out)
	}
	// Where there is no room even for the provenance nothing runs.
	antelag(t, dir, "run", "rig.toml", "--log", "y.csv", "--force").complained(t, exitFail, "write y.csv.toml: no space left on device")
	if _, err := os.Stat(filepath.Join(dir, "y.csv")); err == nil {
		t.Error("an empty log is left behind")
	}
}

// A disk that takes part of a write: what was written stays readable to its
// end. The limit on the size of a file does here what a full disk does.
func TestFullDiskLeavesWholeRows(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	cmd := command(dir)
	cmd.Path = "/bin/sh"
	cmd.Args = []string{"sh", "-c", `ulimit -f 200; exec "$0" run rig.toml --log x.csv`, binary}
	o := finish(t, cmd)
	if o.code != exitFail || !strings.Contains(o.err, "x.csv: file too large") || strings.Count(o.err, "\n") != 1 {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	if l := readLog(t, filepath.Join(dir, "x.csv")); l.rows < 100 || l.rows > 8000 {
		t.Errorf("%d rows", l.rows)
	}
}

// What could not be printed is a failure too.
func TestFullStdout(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	full, err := os.OpenFile("/dev/full", os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer full.Close()
	for _, args := range [][]string{{"run", "rig.toml"}, {"run", "rig.toml", "--json"}, {"describe"}, {"scenarios"}, {"scenarios", "archive"}, {"version"}} {
		var stderr bytes.Buffer
		cmd := command(dir, args...)
		cmd.Stdout, cmd.Stderr = full, &stderr
		cmd.Run() //nolint:errcheck // the exit code tells
		if code := cmd.ProcessState.ExitCode(); code != exitFail || !strings.Contains(stderr.String(), "no space left on device") {
			t.Errorf("%v: exit %d, %q", args, code, stderr.String())
		}
	}
}
