package check

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios"
)

// short is a scenario that runs in milliseconds; %DELAY% is a setting.
const short = `title = "one storey"
[loop]
rate = "500 Hz"
duration = "4 s"
[substructure]
damping_ratio = 0.03
[[substructure.storey]]
mass = "100 t"
stiffness = "4 kN/mm"
[excitation]
kind = "sine"
amplitude = "1 m/s^2"
frequency = "1.3 Hz"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
[[channel.specimen]]
kind = "spring"
stiffness = "2 kN/mm"
[channel.compensator]
kind = "polynomial"
order = 2
delay = "8 ms"
[accept]
nrmse = 0.05
delay = "1 ms"
`

// folder makes a directory with files: name, content, name, content.
func folder(t *testing.T, files ...string) string {
	t.Helper()
	dir := t.TempDir()
	for i := 0; i < len(files); i += 2 {
		path := filepath.Join(dir, files[i])
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(files[i+1]), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

func edited(t *testing.T, old, new string) string {
	t.Helper()
	text := strings.Replace(short, old, new, 1)
	if text == short {
		t.Fatalf("%q is not in the scenario", old)
	}
	return text
}

// checked finds and runs what is under dir.
func checked(t *testing.T, dir string, o Options, w Work) *Report {
	t.Helper()
	found, err := Find([]string{dir}, o)
	if err != nil {
		t.Fatal(err)
	}
	return &Report{Results: Run(context.Background(), found.Tests, w), LeftOut: found.LeftOut, Gone: found.Gone}
}

func rel(t *testing.T, dir string, paths []string) []string {
	t.Helper()
	var out []string
	for _, p := range paths {
		r, err := filepath.Rel(dir, p)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, r)
	}
	return out
}

// What lies in a directory is found in order, once, and told apart.
func TestFind(t *testing.T) {
	t.Parallel()
	dir := folder(t,
		"b.toml", short, "a/z.toml", short, "a/a.toml", short, "a.toml", short,
		"broken.toml", "title = \"", "typo.toml", edited(t, "order = 2", "ordr = 2"),
		"log.csv.toml", short+"[provenance]\nversion = \"1\"\n", "tool.toml", "[project]\nname = \"x\"\n", "empty.toml", "",
		"gone.baseline.toml", "whatever", ".hidden/x.toml", short, "notes.txt", "no scenario", "folder.toml/inside.toml", short,
	)
	if err := os.Symlink(dir, filepath.Join(dir, "a", "loop")); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(filepath.Join(dir, "b.toml"), filepath.Join(dir, "linked.toml")); err != nil {
		t.Fatal(err)
	}
	link := filepath.Join(t.TempDir(), "link")
	if err := os.Symlink(dir, link); err != nil {
		t.Fatal(err)
	}
	for _, root := range []string{dir, dir + "/", link} {
		found, err := Find([]string{root, filepath.Join(root, "b.toml"), root}, Options{})
		if err != nil {
			t.Fatal(err)
		}
		var names, broken []string
		for _, test := range found.Tests {
			names = append(names, test.Name)
			if test.Err != nil {
				broken = append(broken, test.Name)
			}
		}
		root = filepath.Clean(root)
		if got, want := rel(t, root, names), []string{"a/a.toml", "a/z.toml", "a.toml", "b.toml", "broken.toml", "folder.toml/inside.toml", "linked.toml", "typo.toml"}; !slices.Equal(got, want) {
			t.Errorf("found %v", got)
		}
		if got := rel(t, root, broken); !slices.Equal(got, []string{"broken.toml", "typo.toml"}) {
			t.Errorf("broken are %v", got)
		}
		if got := rel(t, root, found.LeftOut); !slices.Equal(got, []string{"empty.toml", "log.csv.toml", "tool.toml"}) {
			t.Errorf("left out %v", got)
		}
		if got := rel(t, root, found.Gone); !slices.Equal(got, []string{"gone.baseline.toml"}) {
			t.Errorf("gone %v", got)
		}
	}
}

// What cannot be found, or was named and does not read, is an error at once.
func TestFindRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "good.toml", short, "typo.toml", edited(t, "order = 2", "ordr = 2"), "x.baseline.toml", "", "sub/none.txt", "",
		"held.toml", short, "held.baseline.toml", "format = 1\nversion = \"x\"\n\n[lane.configured]\noutcome = \"completed\"\nnrmsee = 1\n")
	for _, c := range []struct {
		paths []string
		o     Options
		want  string
	}{
		{[]string{"nowhere.toml"}, Options{}, "nowhere.toml: there is no such file"},
		{[]string{"good.toml", "typo.toml"}, Options{}, `typo.toml:24: channel.compensator.ordr: unknown setting`},
		{[]string{"x.baseline.toml"}, Options{}, "x.baseline.toml: is a baseline; name the scenario that it is of"},
		{[]string{"sub"}, Options{}, "sub: there are no scenarios"},
		{[]string{"."}, Options{Strict: true}, "held.baseline.toml:6: lane.configured.nrmsee: unknown figure"},
		{[]string{"held.toml"}, Options{}, "held.baseline.toml:6: lane.configured.nrmsee: unknown figure"},
		{[]string{"."}, Options{Only: "[a"}, `--only: "[a" is no pattern`},
		{[]string{"good.toml"}, Options{Only: "bad*"}, "--only bad*: matches none of the 1 scenarios: "},
		{[]string{"good.toml"}, Options{Changes: []scenarios.Change{{Path: "damper.compensator.ordr", Value: "1"}}}, "--set damper.compensator.ordr: "},
	} {
		for i, p := range c.paths {
			c.paths[i] = filepath.Join(dir, p)
		}
		if _, err := Find(c.paths, c.o); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%v: %v, want %q", c.paths, err, c.want)
		}
	}
}

// A pattern takes the path, the file's name, or the name without its ending; a
// word takes whatever holds it.
func TestOnly(t *testing.T) {
	t.Parallel()
	for pattern, want := range map[string]bool{
		"": true, "frame": true, "lab/": true, "frame-*": true, "*-2.toml": true, "lab/*": true, "frame-[12]": true, "FRAME": false, "frame-?": true, "frame-[3]": false, "*.csv": false,
	} {
		if got := (&finder{Options: Options{Only: pattern}}).wanted("lab/frame-2.toml"); got != want {
			t.Errorf("%q: %v", pattern, got)
		}
	}
}

// The output is the same, byte for byte, whatever the number of workers.
func TestOrderDoesNotDependOnWorkers(t *testing.T) {
	t.Parallel()
	var files []string
	for _, name := range []string{"a", "b", "c", "d", "e", "f"} {
		files = append(files, name+".toml", edited(t, `duration = "4 s"`, `duration = "`+map[string]string{"a": "9", "b": "1", "c": "5", "d": "2", "e": "7", "f": "1"}[name]+` s"`))
	}
	dir := folder(t, files...)
	var was string
	for _, workers := range []int{1, 2, 3, 0, 16} {
		r := checked(t, dir, Options{}, Work{Workers: workers})
		var out bytes.Buffer
		if err := r.WriteText(&out, false); err != nil {
			t.Fatal(err)
		}
		object, err := json.Marshal(r)
		if err != nil {
			t.Fatal(err)
		}
		if out.Write(object); was != "" && out.String() != was {
			t.Errorf("%d workers print\n%s\none prints\n%s", workers, out.String(), was)
		}
		was = out.String()
	}
}

// states lists what became of the baselines.
func states(r *Report) string {
	var out []string
	for i := range r.Results {
		out = append(out, r.Results[i].status()+" "+string(r.Results[i].State))
	}
	return strings.Join(out, ", ")
}

// A lab's week: no baseline, recorded, the same, detuned, recorded anew.
func TestRecordAndCompare(t *testing.T) {
	t.Parallel()
	dir := folder(t, "a.toml", short, "b.toml", short)
	step := func(what, want string, o Options, w Work) *Report {
		t.Helper()
		r := checked(t, dir, o, w)
		if got := states(r); got != want {
			t.Errorf("%s: %s, want %s", what, got, want)
		}
		return r
	}
	rewrite := func(name, text string) {
		t.Helper()
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	file := func() string {
		text, err := os.ReadFile(filepath.Join(dir, "a.baseline.toml"))
		if err != nil {
			t.Fatal(err)
		}
		return string(text)
	}
	step("at first", "PASS none, PASS none", Options{}, Work{})
	step("recorded", "PASS recorded, PASS recorded", Options{}, Work{Record: true, Version: "1"})
	first := file()
	step("again", "PASS same, PASS same", Options{}, Work{})
	step("recorded again", "PASS unchanged, PASS unchanged", Options{}, Work{Record: true, Version: "2"})
	if file() != first {
		t.Error("recording the same changed the file")
	}
	r := step("tried out", "FAIL moved, FAIL moved", Options{Changes: []scenarios.Change{{Path: "damper.compensator.delay", Value: "8.02 ms"}}}, Work{})
	if len(r.Results[0].Comparison.Settings) != 1 {
		t.Errorf("settings %v", r.Results[0].Comparison.Settings)
	}
	rewrite("a.toml", edited(t, "delay = \"8 ms\"\n[accept]", "delay = \"8.02 ms\"\n[accept]"))
	r = step("detuned", "FAIL moved, PASS same", Options{}, Work{})
	var out bytes.Buffer
	r.WriteText(&out, false) //nolint:errcheck // a Buffer does not fail
	for _, want := range []string{"damper.compensator.delay  8 ms → 8.02 ms", "figure delay", "was ", "1 failed", "where a change is meant, --record keeps the new figures"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("no %q in\n%s", want, out.String())
		}
	}
	step("meant", "PASS replaced, PASS unchanged", Options{}, Work{Record: true, Version: "2"})
	if file() == first || !strings.Contains(file(), "version = \"2\"") || !strings.Contains(file(), `"damper.compensator.delay" = "8.02 ms"`) {
		t.Errorf("not replaced:\n%s", file())
	}
	step("and held", "PASS same, PASS same", Options{}, Work{})

	// A limit that is missed fails beside a baseline that holds.
	rewrite("a.toml", edited(t, "nrmse = 0.05", "nrmse = 0.00001"))
	rewrite("b.toml", strings.Replace(short, "[accept]\nnrmse = 0.05\ndelay = \"1 ms\"\n", "", 1))
	if err := os.Remove(filepath.Join(dir, "b.baseline.toml")); err != nil {
		t.Fatal(err)
	}
	step("missed", "FAIL moved, DONE none", Options{}, Work{})
}

// A change of a limit alone moves no figure and is said.
func TestLimitChange(t *testing.T) {
	t.Parallel()
	dir := folder(t, "a.toml", short)
	checked(t, dir, Options{}, Work{Record: true})
	r := checked(t, dir, Options{Changes: []scenarios.Change{{Path: "accept.nrmse", Value: "0.06"}}}, Work{})
	var out bytes.Buffer
	r.WriteText(&out, false) //nolint:errcheck // a Buffer does not fail
	if got := states(r); got != "PASS same" || !strings.Contains(out.String(), "accept.nrmse  0.05 → 0.06") || !strings.Contains(out.String(), "no figure left its tolerance") {
		t.Errorf("%s\n%s", got, out.String())
	}
}

// An interruption leaves no half-run scenario recorded or judged.
func TestInterruption(t *testing.T) {
	t.Parallel()
	dir := folder(t, "a.toml", short, "b.toml", short)
	ctx, stop := context.WithCancel(context.Background())
	stop()
	found, err := Find([]string{dir}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range Run(ctx, found.Tests, Work{Record: true}) {
		if r.Pass() || !r.Interrupted() || r.State != Absent {
			t.Errorf("%+v", r)
		}
	}
	if _, err := os.Stat(filepath.Join(dir, "a.baseline.toml")); err == nil {
		t.Error("an interrupted run was recorded")
	}
}

// A baseline that cannot be written fails, and the others are written.
func TestUnwritten(t *testing.T) {
	t.Parallel()
	dir := folder(t, "a.toml", short, "b.toml", short)
	found, err := Find([]string{dir}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	found.Tests[0].Path = filepath.Join(dir, "a.toml", "x") // below a file: nobody can write there
	r := &Report{Results: Run(context.Background(), found.Tests, Work{Record: true})}
	if got := states(r); got != "ERROR unwritten, PASS recorded" || r.Results[0].Err == nil || r.Pass() {
		t.Errorf("%s: %v", got, r.Results[0].Err)
	}
}
