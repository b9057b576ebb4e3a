package main

import (
	"encoding/json"
	"strings"
	"testing"

	"antelag/scenarios"
)

func TestScenariosLists(t *testing.T) {
	t.Parallel()
	o := antelag(t, t.TempDir(), "scenarios").good(t)
	lines := strings.Split(strings.TrimSuffix(o.out, "\n"), "\n")
	if len(lines) != len(scenarios.Names()) {
		t.Fatalf("%d lines for %d scenarios:\n%s", len(lines), len(scenarios.Names()), o.out)
	}
	for i, name := range scenarios.Names() {
		s, err := scenarios.Load(name)
		if err != nil {
			t.Fatal(err)
		}
		if fields := strings.Fields(lines[i]); fields[0] != name || !strings.HasSuffix(lines[i], "  "+s.Title) {
			t.Errorf("%q is not %s with its title", lines[i], name)
		}
	}
}

func TestScenariosPrintsTheText(t *testing.T) {
	t.Parallel()
	for _, name := range []string{"archive", "archive.toml"} {
		want, err := scenarios.Text("archive")
		if err != nil {
			t.Fatal(err)
		}
		if o := antelag(t, t.TempDir(), "scenarios", name).good(t); o.out != string(want) {
			t.Errorf("%s: another text:\n%s", name, o.out)
		}
	}
}

func TestDescribe(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	all := antelag(t, dir, "describe").good(t).out
	for _, chapter := range scenarios.Chapters() {
		text := antelag(t, dir, "describe", chapter.Title).good(t).out
		if !strings.Contains(all, text) {
			t.Errorf("describe does not hold the chapter %s", chapter.Title)
		}
		for _, k := range chapter.Kinds {
			if !strings.Contains(text, "\n  "+k.Name+" ") || !strings.Contains(text, k.Source) {
				t.Errorf("describe %s leaves out %s, or its source", chapter.Title, k.Name)
			}
		}
	}
	text := antelag(t, dir, "describe", "polynomial").good(t).out
	for _, want := range []string{
		"polynomial (compensators): ", "\n  equation  u = Σ", "\n  source    Horiuchi et al. 1999\n",
		"\n  setting  default  allowed ", "\n  delay    10 ms    a time (s), 0 s to 500 ms  ",
		"\n[channel.compensator]\nkind = \"polynomial\"\norder = 3\ndelay = \"10 ms\"\n",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("describe polynomial does not say %q:\n%s", want, text)
		}
	}
}

// The example that describe shows can be pasted into a scenario.
func TestDescribedExampleRuns(t *testing.T) {
	t.Parallel()
	old := rig[strings.Index(rig, "[channel.compensator]"):strings.Index(rig, "[channel.sensor]")]
	text := antelag(t, t.TempDir(), "describe", "adaptive-inverse").good(t).out
	dir := folder(t, "rig.toml", edited(t, old, text[strings.Index(text, "[channel.compensator]"):]))
	v := verdict(t, antelag(t, dir, "run", "rig.toml", "--json"))
	if c := v.Lanes[0].Channels[0].Compensator; c != "adaptive-inverse" || v.Lanes[0].Outcome != "completed" {
		t.Errorf("%s %s", c, v.Lanes[0].Outcome)
	}
}

func TestHelp(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	caution := "Caution: hydraulic actuators crush. This is a simulation; it is no interlock."
	for _, args := range []string{"--help", "-h", "help"} {
		o := antelag(t, dir, strings.Fields(args)...).good(t)
		for _, want := range []string{caution, `embedded scenario "archive"`, "\n  run  ", "\n  describe  ", "\n  scenarios  "} {
			if !strings.Contains(o.out, want) {
				t.Errorf("%s does not say %q:\n%s", args, want, o.out)
			}
		}
	}
	o := antelag(t, dir, "run", "--help").good(t)
	for _, want := range []string{caution, "--set PATH=VALUE", "--log FILE", "--log-lane", "--force", "--json"} {
		if !strings.Contains(o.out, want) {
			t.Errorf("run --help does not say %q:\n%s", want, o.out)
		}
	}
}

// Every command whose answer may be acted on at the machine carries the caution,
// and says what its exit codes mean; every one that takes a scenario takes --set.
func TestHelpOfEveryCommand(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	for _, name := range []string{"bench", "run", "replay", "identify", "margin", "tempo", "tune", "sweep", "gather", "check", "handoff", "report"} {
		text := antelag(t, dir, name, "--help").good(t).out
		wants := []string{"Caution: hydraulic actuators crush.", "no interlock", "2 bad input", "overwrite existing files", "--json", "--set PATH=VALUE"}
		switch name {
		case "bench": // it runs until it is left, and writes nothing by flags
			wants = []string{wants[0], wants[1], wants[5]}
		case "gather", "identify": // of tables and logs
			wants = wants[:5]
		}
		words := strings.Join(strings.Fields(text), " ")
		for _, want := range wants {
			if !strings.Contains(words, want) {
				t.Errorf("%s --help does not say %q:\n%s", name, want, text)
			}
		}
	}
}

func TestVersion(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	long := antelag(t, dir, "version").good(t).out
	short := antelag(t, dir, "--version").good(t).out
	if !strings.HasPrefix(short, "antelag ") || strings.Count(short, "\n") != 1 || !strings.HasPrefix(long, strings.TrimSpace(short)+", go1.") {
		t.Errorf("%q and %q", short, long)
	}
}

func TestCompletion(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	for shell, want := range map[string]string{
		"bash": "complete -o default -F __start_antelag antelag", "zsh": "#compdef antelag", "fish": "complete -c antelag",
	} {
		if o := antelag(t, dir, "completion", shell).good(t); !strings.Contains(o.out, want) {
			t.Errorf("completion %s does not hold %q", shell, want)
		}
	}
	for args, want := range map[string]string{
		"run": "mast-release\n", "describe": "adaptive-inverse\n", "scenarios": "mast-release\n", "": "describe\t",
	} {
		o := antelag(t, dir, append(append([]string{"__complete"}, strings.Fields(args)...), "")...)
		if o.code != 0 || !strings.Contains(o.out, want) {
			t.Errorf("antelag %s <tab> does not offer %q:\n%s", args, want, o.out)
		}
	}
}

// With --json the manual and the list are one object, and the bare command takes
// the flags of run.
func TestJSONEverywhere(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	for _, c := range []struct {
		args []string
		key  string
		want string
	}{
		{[]string{"describe", "--json"}, "kinds", "adaptive-time-series"},
		{[]string{"describe", "inverse", "--json"}, "kinds", "assumed delay"},
		{[]string{"scenarios", "--json"}, "scenarios", "water tank"},
		{[]string{"scenarios", "tank", "--json"}, "text", "bouc-wen"},
		{[]string{"--json", "--set", "loop.duration=3 s"}, "lanes", "configured"},
	} {
		o := antelag(t, dir, c.args...).good(t)
		var object map[string]json.RawMessage
		d := json.NewDecoder(strings.NewReader(o.out))
		if err := d.Decode(&object); err != nil || d.More() {
			t.Errorf("%v: not one JSON object: %v", c.args, err)
		}
		if !strings.Contains(string(object[c.key]), c.want) {
			t.Errorf("%v: %s does not hold %q", c.args, c.key, c.want)
		}
	}
	antelag(t, dir, "describe", "nothing", "--json").refused(t, "nothing")
}
