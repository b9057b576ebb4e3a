package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

const recorded = `kind = "record"
file = "motion.txt"
step = "20 ms"
unit = "g"
`

// withRecord is rig with a record for its motion, lines 11 to 14.
func withRecord(t *testing.T, record string) []string {
	t.Helper()
	text := edited(t, "kind = \"filtered-noise\"\npeak = \"0.2 g\"\nrise = \"1 s\"\nstrong = \"4 s\"\n", recorded)
	if record == "" {
		return []string{"rig.toml", text}
	}
	return []string{"rig.toml", text, "motion.txt", record}
}

// A wrong file, however it is wrong and however it is come upon, gives exit 2
// and one line that says where, which key and what; nothing is written, and
// what was there stays, even under --force.
func TestWrongFiles(t *testing.T) {
	text := func(text string) []string { return []string{"rig.toml", text} }
	edit := func(old, new string) []string { return text(edited(t, old, new)) }
	for _, c := range []struct {
		name  string
		files []string
		want  []string
	}{
		{"unknown key", edit("order = 2", "ordr = 2"), []string{"rig.toml:28: channel.compensator.ordr: ", `did you mean "order"`}},
		{"unknown section", edit("[accept]", "[acept]"), []string{"rig.toml:39: acept: ", `did you mean "accept"`}},
		{"misspelt kind", edit(`"polynomial"`, `"polynomal"`), []string{"rig.toml:27: channel.compensator.kind: ", `did you mean "polynomial"`}},
		{"wrong dimension", edit(`delay = "8 ms"`, `delay = "8 mm"`), []string{"rig.toml:20: channel.actuator.delay: ", "is a length (m); it must be a time (s)"}},
		{"no unit", edit(`delay = "8 ms"`, `delay = 0.008`), []string{"rig.toml:20: channel.actuator.delay: ", "0.008 has no unit"}},
		{"NaN", edit("damping_ratio = 0.03", "damping_ratio = nan"), []string{"rig.toml:7: substructure.damping_ratio: ", "NaN is no finite number"}},
		{"NaN as text", edit(`"100 t"`, `"nan t"`), []string{"rig.toml:9: substructure.storey.mass: ", "finite number"}},
		{"infinite", edit(`"100 t"`, `"1e400 t"`), []string{"rig.toml:9: substructure.storey.mass: ", "finite number"}},
		{"negative mass", edit(`"100 t"`, `"-100 t"`), []string{"rig.toml:9: substructure.storey.mass: ", "-100 t is below 0.001 kg"}},
		{"zero rate", edit(`"1000 Hz"`, `"0 Hz"`), []string{"rig.toml:3: loop.rate: ", "0 Hz is below 10 Hz"}},
		{"absurd duration", edit(`"8 s"`, `"1e12 s"`), []string{"rig.toml:4: loop.duration: ", "is above 604800 s"}},
		{"broken TOML", edit(`title = "one storey"`, `title = "one storey`), []string{"rig.toml:1: "}},
		{"value cut off", text(rig[:strings.Index(rig, ` "8 s"`)]), []string{"rig.toml:4: "}},
		{"empty file", text(""), []string{"rig.toml: ", "the section ["}},
		{"binary file", text("\x7fELF\x02\x01\x01\x00\x00\x00\x00\xff\xfe\x00"), []string{"rig.toml:1: "}},
		{"huge file", text(rig + strings.Repeat("# more of the same\n", 1<<17)), []string{"rig.toml: is ", "longer than 1048576 bytes"}},
		{"key with a line end in it", text(rig + "\"a\\nb\" = 1\n"), []string{"rig.toml:44: accept.a\\nb: "}},
		{"no record", withRecord(t, ""), []string{"rig.toml:13: excitation.file: ", "motion.txt", "no such file"}},
		{"record with NaN", withRecord(t, "0\n0.1\nNaN\n0.2\n"), []string{"rig.toml:11: excitation: motion.txt:3: ", "NaN is not a finite number"}},
		{"record with text", withRecord(t, "0\n0.1\n0.3\n0.2 broken\n"), []string{"rig.toml:11: excitation: motion.txt:4: ", `"broken" is not a number`}},
		{"record that is empty", withRecord(t, "\n"), []string{"rig.toml:11: excitation: motion.txt: ", "0 values"}},
		{"record without unit", []string{"rig.toml", strings.Replace(withRecord(t, "x")[1], "unit = \"g\"\n", "", 1), "motion.txt", "0\n0.1\n"},
			[]string{"rig.toml:11: excitation.unit: "}},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			refusedEverywhere(t, folder(t, c.files...), "rig.toml", c.want...)
		})
	}
}

// refusedEverywhere runs a bad scenario alone, behind a good one, with a log,
// and with a log that would overwrite others.
func refusedEverywhere(t *testing.T, dir, scenario string, want ...string) {
	t.Helper()
	write(t, filepath.Join(dir, "old.csv"), "precious\n")
	write(t, filepath.Join(dir, "old.csv.toml"), "precious = true\n")
	before := listing(t, dir)
	for _, args := range [][]string{
		{scenario},
		{scenario, "--json"},
		{"mast-release", scenario},
		{scenario, "--log", "x.csv"},
		{scenario, "--log", "old.csv", "--force"},
	} {
		antelag(t, dir, append([]string{"run"}, args...)...).refused(t, want...)
		unchanged(t, dir, before)
	}
}

// What is no readable file at all.
func TestNoScenario(t *testing.T) {
	for _, c := range []struct {
		name  string
		make  func(path string) error
		wants string
	}{
		{"missing", func(string) error { return nil }, "there is no such file, nor an embedded scenario of that name"},
		{"directory", func(path string) error { return os.Mkdir(path, 0o755) }, "is a directory"},
		// Root may read every file, but nobody can follow a link to itself.
		{"unreadable", func(path string) error { return os.Symlink("x.toml", path) }, "too many levels of symbolic links"},
		{"dangling link", func(path string) error { return os.Symlink("nowhere.toml", path) }, "there is no such file"},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			dir := t.TempDir()
			if err := c.make(filepath.Join(dir, "x.toml")); err != nil {
				t.Fatal(err)
			}
			refusedEverywhere(t, dir, "x.toml", "x.toml", c.wants)
		})
	}
}

func TestWrongUsage(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	before := listing(t, dir)
	for _, c := range []struct {
		args string
		want string
	}{
		{"rnu", `unknown command "rnu"; did you mean "run"?`},
		{"rig.toml", "a scenario is run by antelag run SCENARIO"},
		{"run", "run takes a SCENARIO: a file, or one of archive, archive-uncompensated, "},
		{"run rig.toml --lgo x.csv", "unknown flag: --lgo"},
		{"run rig.toml --log", "flag needs an argument: --log"},
		{"run rig.toml --log-lane late", "there is no --log"},
		{"run rig.toml --log x.csv --log-lane latte", `unknown lane "latte"; did you mean "late"?`},
		{"run rig.toml archive --log x.csv", "--log takes one scenario at a time"},
		{"run rig.toml --log rig.toml --force", "rig.toml is the scenario itself"},
		{"run rig.toml --log rig --force", "rig.toml is the scenario itself"},
		{"describe polynomal", `did you mean "polynomial"?`},
		{"help polynomal", `unknown command "polynomal"`},
		{"pace now", `pace takes no argument; there is "now"`},
		{"sweep rig.toml --draws 1e9", "--draws 1e9: it must be a whole number"},
		{"sweep rig.toml --draws 99999999999999999999", "--draws 99999999999999999999: it must be smaller"},
		{"handoff rig.toml -o x --seed -1", "--seed -1: it must be a whole number from 0 on"},
		{"replay x.csv --speed fast", "--speed fast: it must be a number"},
		{"margin rig.toml --lane latte", `--lane: unknown lane "latte"; did you mean "late"?`},
		{"tempo rig.toml --lane latte", `--lane: unknown lane "latte"; did you mean "late"?`},
		{"sweep rig.toml --lane latte --draws 2", `--lane: unknown lane "latte"; did you mean "late"?`},
		{"tune rig.toml --lane latte --over damper.compensator.delay=5ms:9ms", `--lane: unknown lane "latte"; did you mean "late"?`},
		{"describe inverse none", "accepts at most 1 arg(s), received 2"},
		{"scenarios achive", `unknown embedded scenario "achive"; did you mean "archive"?`},
		{"version 2", "version takes no argument"},
	} {
		antelag(t, dir, strings.Fields(c.args)...).refused(t, c.want)
		unchanged(t, dir, before)
	}
}

func TestWrongSet(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	before := listing(t, dir)
	for set, want := range map[string]string{
		"damper.compensator.delay":            "PATH=VALUE",
		"=12 ms":                              "PATH=VALUE",
		"delay=12 ms":                         `"delay" names no setting`,
		"damper.compensator.dely=12 ms":       `did you mean "delay"?`,
		"dampr.compensator.delay=12 ms":       `did you mean "damper"?`,
		"damper.compensator.delay=12 mm":      "is a length (m); it must be a time (s)",
		"damper.compensator.delay=12":         "12 has no unit",
		"damper.compensator.delay=nan":        "NaN has no unit",
		"damper.compensator.delay=9 s":        "is above 500 ms",
		"damper.compensator.order=2.5":        "2.5 is not a whole number",
		"damper.compensator.kind=inverted":    `unknown compensator kind "inverted"; did you mean "inverse"?`,
		"lane.latte.compensator.delay=1 ms":   `unknown lane "latte"; did you mean "late"?`,
		"substructure.storey[4].mass=1 t":     "there are 1, counted from 0",
		"loop.duration=0 s":                   "is below",
		"loop.rate=\"1000 Hz\"\nslowdown = 2": "loop.rate",
	} {
		antelag(t, dir, "run", "rig.toml", "--log", "x.csv", "--set", set).refused(t, "--set", want)
		unchanged(t, dir, before)
	}
}
