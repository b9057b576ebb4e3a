//go:build unix

package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// spreading is rig, made shorter, with a spread.
func spreading(t *testing.T) string {
	t.Helper()
	return edited(t, `"8 s"`, `"2 s"`) + "[spread]\n\"damper.actuator.delay\" = 0.5\n\"damper.actuator.lag\" = [\"1 ms\", \"5 ms\"]\n"
}

// whatever says that a sweep ran, whether all its runs passed or not.
func (o outcome) swept(t *testing.T) outcome {
	t.Helper()
	if o.code == exitUsage || o.err != "" {
		t.Fatalf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	return o
}

func TestSweepRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t), "none.toml", rig, "old.csv", "precious\n", "x.1-of-2.csv", "a\n")
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"sweep"}, "sweep takes one SCENARIO"},
		{[]string{"sweep", "s.toml"}, "nothing varies"},
		{[]string{"sweep", "s.toml", "none.toml", "--draws", "3"}, "sweep takes one SCENARIO"},
		{[]string{"sweep", "none.toml", "--draws", "3"}, "has no [spread]"},
		{[]string{"sweep", "nowhere.toml", "--draws", "3"}, "there is no such file"},
		{[]string{"sweep", "s.toml", "--draws", "-1"}, "-1 draws are none"},
		{[]string{"sweep", "s.toml", "--draws", "many"}, "many"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--law", "norml"}, `did you mean "normal"?`},
		{[]string{"sweep", "s.toml", "--draws", "3", "--sampling", "sobol"}, `unknown sampling "sobol"`},
		{[]string{"sweep", "s.toml", "--draws", "3", "--lane", "lat"}, `did you mean "late"?`},
		{[]string{"sweep", "s.toml", "--draws", "3", "--workers", "-2"}, "--workers -2"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--shard", "1/2"}, "say which with --csv"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--shard", "3/2", "--csv", "x.csv"}, "a shard is given as i/n"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--shard", "slurm", "--csv", "x.csv"}, "this is no task of a job array"},
		{[]string{"sweep", "s.toml", "--over", "damper.compensator.delay=5 ms:1 ms:3"}, "5 ms is above 1 ms"},
		{[]string{"sweep", "s.toml", "--over", "damper.compensator.dely=5 ms:10 ms:3"}, `did you mean "delay"?`},
		{[]string{"sweep", "s.toml", "--over", "damper.compensator.delay=5 ms:900 ms:3"}, "900 ms is above 500 ms"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--set", "loop.rate=0 Hz"}, "0 Hz is below 10 Hz"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--csv", "old.csv"}, "old.csv: exists, and there is no old.csv.toml"},
		{[]string{"sweep", "s.toml", "--draws", "3", "--csv", "s.toml"}, "is the scenario itself"},
		{[]string{"gather"}, "gather takes one FILE.csv"},
		{[]string{"gather", "y.csv"}, "there are no shards of it, like y.1-of-7.csv"},
		{[]string{"gather", "old.csv"}, "old.csv: file already exists; --force"},
		{[]string{"gather", "x.csv"}, "shards 1/2, 2/2 are missing or not whole"},
	} {
		antelag(t, dir, c.args...).refused(t, c.want)
	}
	unchanged(t, dir, before)
}

// A table is the same for any number of workers, and its rows are those that run
// comes to by the command that the summary prints.
func TestSweepIsTheSameForAnyWorkers(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	args := []string{"sweep", "s.toml", "--draws", "70", "--set", "loop.seed=4", "--law", "normal"}
	var first string
	for i, workers := range []string{"1", "2", "7"} {
		o := antelag(t, dir, append(args, "--csv", workers+".csv", "--workers", workers)...).swept(t)
		text := read(t, dir, workers+".csv")
		if i == 0 {
			first = text
			printedCommandsRun(t, dir, o.out)
		}
		if text != first || read(t, dir, workers+".csv.toml") != read(t, dir, "1.csv.toml") {
			t.Errorf("%s workers write another table", workers)
		}
	}
}

func printedCommandsRun(t *testing.T, dir, out string) {
	t.Helper()
	ran := 0
	for _, line := range strings.Split(out, "\n") {
		line, ok := strings.CutPrefix(strings.TrimSpace(line), "antelag run ")
		if !ok {
			continue
		}
		ran++
		cmd := exec.Command("sh", "-c", `"$0" run --json `+line, binary)
		cmd.Dir = dir
		text, _ := cmd.Output() //nolint:errcheck // exit 1 is a verdict
		v := verdict(t, outcome{out: string(text)})
		row := fmt.Sprintf(",%v,", *v.Lanes[0].Channels[0].NRMSE)
		if !strings.Contains(read(t, dir, "1.csv"), row) {
			t.Errorf("%s\ncomes to nrmse %s, which no row has", line, row)
		}
	}
	if ran == 0 {
		t.Errorf("no command in\n%s", out)
	}
}

// A sweep that is killed as often as it gets somewhere, and gone on with each
// time, writes what one that never was writes.
func TestSweepKilledAndResumed(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	args := []string{"sweep", "s.toml", "--draws", "400", "--sampling", "independent"}
	whole := antelag(t, dir, append(args, "--csv", "whole.csv")...).swept(t)
	path := filepath.Join(dir, "x.csv")
	size := int64(0)
	for range 3 {
		cmd := command(dir, append(args, "--csv", "x.csv")...)
		start(t, cmd, path, size+2000)
		if err := cmd.Process.Signal(syscall.SIGKILL); err != nil {
			t.Fatal(err)
		}
		ends(t, cmd)
		info, err := os.Stat(path)
		if err != nil {
			t.Fatal(err)
		}
		size = info.Size()
		// As if it had been killed within a row.
		if err := os.Truncate(path, size-7); err != nil {
			t.Fatal(err)
		}
	}
	last := antelag(t, dir, append(args, "--csv", "x.csv")...).swept(t)
	if read(t, dir, "x.csv") != read(t, dir, "whole.csv") || read(t, dir, "x.csv.toml") != read(t, dir, "whole.csv.toml") {
		t.Error("the tables differ")
	}
	if a, b := tail(last.out), tail(whole.out); a != b || last.code != whole.code {
		t.Errorf("resumed\n%s\nwhole\n%s", a, b)
	}
	// Once more there is nothing left to do.
	if again := antelag(t, dir, append(args, "--csv", "x.csv")...).swept(t); tail(again.out) != tail(whole.out) {
		t.Errorf("again\n%s", again.out)
	}
}

// tail is a summary without what it says of the time it took.
func tail(out string) string {
	lines := strings.SplitN(out, "\n", 4)
	return lines[len(lines)-1]
}

// Ctrl-C ends a sweep with the summary of what there is, exit 1, and a table that
// is gone on with.
func TestSweepInterrupted(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	cmd := command(dir, "sweep", "s.toml", "--draws", "1000000", "--csv", "x.csv")
	var out, stderr bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &stderr
	start(t, cmd, filepath.Join(dir, "x.csv"), 4000)
	if err := cmd.Process.Signal(syscall.SIGINT); err != nil {
		t.Fatal(err)
	}
	if code := ends(t, cmd); code != exitFail || stderr.Len() > 0 {
		t.Errorf("exit %d\n%s", code, stderr.String())
	}
	if !strings.Contains(out.String(), " of 1000000 runs of 2 s of test each") {
		t.Errorf("printed\n%s", out.String())
	}
	if text := read(t, dir, "x.csv"); !strings.HasSuffix(text, "\n") {
		t.Error("the table ends within a row")
	}
}

// A full disk ends a sweep, which says so, exit 1; what is there is gone on with
// to the same table. The limit on the size of a file does what a full disk does.
func TestSweepOnAFullDisk(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	const args = " sweep s.toml --draws 60 --csv "
	antelag(t, dir, strings.Fields(args+"whole.csv")...).swept(t)
	cmd := exec.Command("sh", "-c", `ulimit -f 8; trap "" XFSZ; exec "$0"`+args+"x.csv", binary)
	cmd.Dir = dir
	o := finish(t, cmd)
	if o.code != exitFail || strings.Count(o.err, "\n") != 1 || !strings.Contains(o.err, "x.csv") || !strings.Contains(o.err, "gone on with by the same command") {
		t.Errorf("exit %d\n%s", o.code, o.err)
	}
	if !strings.Contains(o.out, " of 60 runs") {
		t.Errorf("printed\n%s", o.out)
	}
	antelag(t, dir, strings.Fields(args+"x.csv")...).swept(t)
	if read(t, dir, "x.csv") != read(t, dir, "whole.csv") {
		t.Error("the tables differ")
	}
	for _, path := range []string{"nowhere/x.csv", "s.toml/x.csv"} {
		antelag(t, dir, strings.Fields(args+path)...).complained(t, exitFail, path)
	}
	full, err := os.OpenFile("/dev/full", os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer full.Close()
	cmd = command(dir, strings.Fields(args+"x.csv")...)
	var stderr bytes.Buffer
	cmd.Stdout, cmd.Stderr = full, &stderr
	cmd.Run() //nolint:errcheck // the exit code tells
	if code := cmd.ProcessState.ExitCode(); code != exitFail || !strings.Contains(stderr.String(), "no space left on device") {
		t.Errorf("exit %d\n%s", code, stderr.String())
	}
}

// Seven shards, as tasks of a job array are told apart, come together as the
// table of one sweep.
func TestSweepInShards(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	args := []string{"sweep", "s.toml", "--draws", "31", "--over", "damper.compensator.delay=8 ms:12 ms:2"}
	whole := antelag(t, dir, append(args, "--csv", "whole.csv")...).swept(t)
	for i := range 7 {
		cmd := command(dir, append(args, "--csv", "x.csv", "--shard", "slurm", "--workers", "1")...)
		cmd.Env = append(cmd.Env, fmt.Sprint("SLURM_ARRAY_TASK_ID=", 10+i), "SLURM_ARRAY_TASK_MIN=10", "SLURM_ARRAY_TASK_COUNT=7", "SLURM_ARRAY_TASK_MAX=16", "SLURM_ARRAY_TASK_STEP=1")
		if i == 3 {
			antelag(t, dir, "gather", "x.csv").refused(t, "shards 4/7, 5/7, 6/7, 7/7 are missing or not whole")
		}
		finish(t, cmd).swept(t)
	}
	o := antelag(t, dir, "gather", "x.csv").swept(t)
	if read(t, dir, "x.csv") != read(t, dir, "whole.csv") || read(t, dir, "x.csv.toml") != read(t, dir, "whole.csv.toml") {
		t.Error("the tables differ")
	}
	if tail(o.out) != tail(whole.out) || o.code != whole.code {
		t.Errorf("gathered\n%s\nwhole\n%s", o.out, whole.out)
	}
}

// sweepJSON is all that sweep --json says.
type sweepJSON struct {
	Scenario string           `json:"scenario"`
	Lane     string           `json:"lane"`
	Sets     []string         `json:"set"`
	Draws    int64            `json:"draws"`
	Law      *string          `json:"law"`
	Sampling *string          `json:"sampling"`
	Seed     *int64           `json:"seed"`
	Settings []map[string]any `json:"settings"`
	Of       int64            `json:"of"`
	Runs     int64            `json:"runs"`
	Passed   int64            `json:"passed"`
	Pass     bool             `json:"pass"`
	AtLeast  *float64         `json:"pass_at_least"`
	Outcomes map[string]int64 `json:"outcomes"`
	Limits   map[string]int64 `json:"limits"`
	Figures  []struct {
		Name      string              `json:"name"`
		Limit     *float64            `json:"limit"`
		Failed    int64               `json:"failed"`
		Worst     extremeJSON         `json:"worst"`
		Best      extremeJSON         `json:"best"`
		Quantiles map[string]*float64 `json:"quantiles"`
	} `json:"figures"`
	Points []struct {
		Values []float64           `json:"values"`
		Runs   int64               `json:"runs"`
		Passed int64               `json:"passed"`
		Worst  map[string]*float64 `json:"worst"`
		Most   map[string]*float64 `json:"q95"`
	} `json:"points"`
	Spans   [][2]float64 `json:"all_pass"`
	Compute struct {
		Wall    float64 `json:"wall_s"`
		Runs    int64   `json:"runs"`
		Workers int     `json:"workers"`
	} `json:"compute"`
}

type extremeJSON struct {
	Run     int64    `json:"run"`
	Value   *float64 `json:"value"`
	Outcome string   `json:"outcome"`
	Command string   `json:"command"`
}

func TestSweepJSON(t *testing.T) {
	t.Parallel()
	dir := folder(t, "s.toml", spreading(t))
	for _, args := range [][]string{
		{"--draws", "9"},
		{"--over", "damper.actuator.gain=0.5:9:5"},
		{"--over", "damper.actuator.gain=0.9:1.1:3", "--draws", "4", "--lane", "late"},
	} {
		o := antelag(t, dir, append([]string{"sweep", "s.toml", "--json"}, args...)...).swept(t)
		var got sweepJSON
		strictly(t, o.out, &got)
		if got.Runs != got.Of || got.Pass != (got.Passed == got.Runs) || got.Pass != (o.code == exitGood) || len(got.Figures) == 0 {
			t.Errorf("%v: exit %d\n%s", args, o.code, o.out)
		}
	}
}
