package main

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// binary is the program under test, built once: what is tested is what people
// run, with its exit codes and its two streams.
var binary string

func TestMain(m *testing.M) { os.Exit(withBinary(m.Run)) }

func withBinary(run func() int) int {
	dir, err := os.MkdirTemp("", "antelag")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	defer os.RemoveAll(dir)
	binary = filepath.Join(dir, "antelag")
	if out, err := exec.Command("go", "build", "-buildvcs=false", "-o", binary, ".").CombinedOutput(); err != nil {
		fmt.Fprintf(os.Stderr, "go build: %v\n%s", err, out)
		return 1
	}
	return run()
}

// outcome is what a finished command left behind.
type outcome struct {
	code     int
	out, err string
}

func command(dir string, args ...string) *exec.Cmd {
	cmd := exec.Command(binary, args...)
	cmd.Dir = dir
	// A terminal that could show colours, were there one.
	cmd.Env = []string{"TERM=xterm-256color", "HOME=" + dir, "PATH=" + os.Getenv("PATH")}
	return cmd
}

// antelag runs the program in dir to its end.
func antelag(t *testing.T, dir string, args ...string) outcome {
	t.Helper()
	return finish(t, command(dir, args...))
}

func finish(t *testing.T, cmd *exec.Cmd) outcome {
	t.Helper()
	var out, err bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &err
	e := cmd.Run()
	var exit *exec.ExitError
	if e != nil && !errors.As(e, &exit) {
		t.Fatal(e)
	}
	return outcome{cmd.ProcessState.ExitCode(), out.String(), err.String()}
}

// refused checks that the command saw bad input: exit 2, one line on stderr,
// nothing on stdout.
func (o outcome) refused(t *testing.T, want ...string) {
	t.Helper()
	o.complained(t, exitUsage, want...)
}

// complained checks that the command did no more than say in one line what is
// wrong.
func (o outcome) complained(t *testing.T, code int, want ...string) {
	t.Helper()
	if o.code != code {
		t.Errorf("exit %d, want %d", o.code, code)
	}
	if o.out != "" {
		t.Errorf("stdout is not empty:\n%s", o.out)
	}
	if strings.Count(o.err, "\n") != 1 || !strings.HasPrefix(o.err, "antelag: ") || !strings.HasSuffix(o.err, "\n") {
		t.Errorf("not one line on stderr:\n%s", o.err)
	}
	for _, w := range want {
		if !strings.Contains(o.err, w) {
			t.Errorf("the message does not say %q:\n%s", w, o.err)
		}
	}
}

// good checks that the command did its work without a word on stderr.
func (o outcome) good(t *testing.T) outcome {
	t.Helper()
	if o.code != exitGood || o.err != "" {
		t.Fatalf("exit %d\n%s%s", o.code, o.out, o.err)
	}
	return o
}

// rig is a small test: one storey, so that the target is the displacement of
// the structure, with noisy sensors and a second lane.
const rig = `title = "one storey"
[loop]
rate = "1000 Hz"
duration = "8 s"
seed = 3
[substructure]
damping_ratio = 0.03
[[substructure.storey]]
mass = "100 t"
stiffness = "4 kN/mm"
[excitation]
kind = "filtered-noise"
peak = "0.2 g"
rise = "1 s"
strong = "4 s"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "3 ms"
[[channel.specimen]]
kind = "bouc-wen"
stiffness = "2 kN/mm"
yield_displacement = "10 mm"
[channel.compensator]
kind = "polynomial"
order = 2
delay = "10 ms"
[channel.sensor]
displacement_noise = "0.01 mm"
force_noise = "20 N"
[channel.limits]
stroke = "200 mm"
[[lane]]
name = "late"
[lane.compensator]
kind = "none"
[accept]
nrmse = 0.2
delay = "3 ms"
energy_margin = 0.1
response_error = 0.3
`

// edited is rig with one text replaced.
func edited(t *testing.T, old, new string) string {
	t.Helper()
	text := strings.Replace(rig, old, new, 1)
	if text == rig {
		t.Fatalf("%q is not in the scenario", old)
	}
	return text
}

// folder makes a directory with the given files: name, content, name, content.
func folder(t *testing.T, files ...string) string {
	t.Helper()
	dir := t.TempDir()
	for i := 0; i < len(files); i += 2 {
		write(t, filepath.Join(dir, files[i]), files[i+1])
	}
	return dir
}

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

func read(t *testing.T, parts ...string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(parts...))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// listing is everything in a directory: each name with its content.
func listing(t *testing.T, dir string) map[string]string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	all := map[string]string{}
	for _, e := range entries {
		all[e.Name()] = e.Type().String()
		if e.Type() == fs.FileMode(0) {
			all[e.Name()] = read(t, dir, e.Name())
		}
	}
	return all
}

// unchanged checks that a directory is as it was.
func unchanged(t *testing.T, dir string, before map[string]string) {
	t.Helper()
	after := listing(t, dir)
	for name, text := range after {
		if was, ok := before[name]; !ok {
			t.Errorf("%s was written", name)
		} else if was != text {
			t.Errorf("%s was changed", name)
		}
	}
	for name := range before {
		if _, ok := after[name]; !ok {
			t.Errorf("%s was removed", name)
		}
	}
}
