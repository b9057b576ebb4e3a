//go:build unix

package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"antelag/scenarios"
)

// patienceOfTests is how long a test waits for what takes milliseconds on a
// quick machine. It is no measure of speed.
const patienceOfTests = time.Minute

// long is a run that nothing but a signal ends: a week of test.
func long(t *testing.T) string {
	t.Helper()
	return edited(t, `"8 s"`, `"7 d"`)
}

// start starts a run and returns when its log has grown by so many bytes.
func start(t *testing.T, cmd *exec.Cmd, log string, size int64) {
	t.Helper()
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { cmd.Process.Kill() }) //nolint:errcheck // it may have ended
	grows(t, log, size)
}

func grows(t *testing.T, path string, size int64) {
	t.Helper()
	for end := time.Now().Add(patienceOfTests); time.Now().Before(end); time.Sleep(2 * time.Millisecond) {
		if info, err := os.Stat(path); err == nil && info.Size() >= size {
			return
		}
	}
	t.Fatalf("%s does not grow to %d bytes", path, size)
}

// ends waits for the end of a command and returns its exit code.
func ends(t *testing.T, cmd *exec.Cmd) int {
	t.Helper()
	watchdog := time.AfterFunc(patienceOfTests, func() { cmd.Process.Kill() }) //nolint:errcheck // it may have ended
	cmd.Wait()                                                                 //nolint:errcheck // the exit code tells
	if !watchdog.Stop() {
		t.Fatal("the run does not end")
	}
	return cmd.ProcessState.ExitCode()
}

// Ctrl-C ends a long run with the verdict of what there is, exit 1, and a log
// of whole rows.
func TestInterrupt(t *testing.T) {
	for _, signal := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM} {
		for _, form := range []string{"text", "json"} {
			t.Run(signal.String()+" "+form, func(t *testing.T) {
				t.Parallel()
				dir := folder(t, "long.toml", long(t))
				log := filepath.Join(dir, "x.csv")
				args := []string{"run", "long.toml", "--log", "x.csv"}
				if form == "json" {
					args = append(args, "--json")
				}
				cmd := command(dir, args...)
				var out, stderr bytes.Buffer
				cmd.Stdout, cmd.Stderr = &out, &stderr
				start(t, cmd, log, 1<<18)
				if err := cmd.Process.Signal(signal); err != nil {
					t.Fatal(err)
				}
				if code := ends(t, cmd); code != exitFail || stderr.Len() > 0 {
					t.Errorf("exit %d\n%s", code, stderr.String())
				}
				l := readLog(t, log)
				if form == "text" {
					if !strings.Contains(out.String(), "\nFAIL  configured lane: INTERRUPTED after ") ||
						!strings.Contains(out.String(), " of 604800 s; the figures are of what ran\n") {
						t.Errorf("printed\n%s", out.String())
					}
					return
				}
				v := verdict(t, outcome{out: out.String()})
				for _, lane := range v.Lanes {
					if lane.Outcome != "interrupted" || lane.Trip != nil || lane.Pass {
						t.Errorf("lane %s: %s", lane.Name, lane.Outcome)
					}
				}
				checkSums(t, &v.Lanes[0].Channels[0], l, 1/v.Rate)
				checkEnergy(t, &v.Lanes[0], l)
				checkAccept(t, &v.Lanes[0])
			})
		}
	}
}

// What nobody can catch still leaves a log that reads up to a whole row, and
// the scenario that it came from. The log grows while the run lasts.
func TestKill(t *testing.T) {
	t.Parallel()
	dir := folder(t, "long.toml", long(t))
	log := filepath.Join(dir, "x.csv")
	cmd := command(dir, "run", "long.toml", "--log", "x.csv")
	start(t, cmd, log, 1<<18)
	for range 3 {
		info, err := os.Stat(log)
		if err != nil {
			t.Fatal(err)
		}
		grows(t, log, info.Size()+1)
	}
	if err := cmd.Process.Signal(syscall.SIGKILL); err != nil {
		t.Fatal(err)
	}
	ends(t, cmd)
	// Killed within a write, the last row alone may be cut off.
	text := read(t, log)
	write(t, log, text[:strings.LastIndexByte(text, '\n')+1])
	if l := readLog(t, log); l.rows < 1000 {
		t.Errorf("%d rows", l.rows)
	}
	if _, err := scenarios.Load(log + ".toml"); err != nil {
		t.Error(err)
	}
}

// A run of several scenarios that is interrupted in the first says what it
// has, in the form of several, and fails: the second never ran.
func TestInterruptSeveral(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	fifo := filepath.Join(dir, "long.toml")
	if err := syscall.Mkfifo(fifo, 0o644); err != nil {
		t.Fatal(err)
	}
	cmd := command(dir, "run", "--json", "long.toml", "rig.toml")
	var out bytes.Buffer
	cmd.Stdout = &out
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	defer cmd.Process.Kill() //nolint:errcheck // it has ended
	// The pipe opens when the program reads its scenario, so that the signal
	// comes neither before it can be caught nor after the end.
	w, err := os.OpenFile(fifo, os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := w.WriteString(long(t)); err != nil {
		t.Fatal(err)
	}
	if err := cmd.Process.Signal(syscall.SIGINT); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	if code := ends(t, cmd); code != exitFail {
		t.Errorf("exit %d", code)
	}
	var all struct {
		Runs []verdictJSON `json:"runs"`
	}
	strictly(t, out.String(), &all)
	if len(all.Runs) != 1 || all.Runs[0].Scenario != "long.toml" || all.Runs[0].Lanes[0].Outcome != "interrupted" {
		t.Errorf("printed\n%s", out.String())
	}
}
