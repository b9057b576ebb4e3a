package scenarios

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// base is a small scenario that is right; the tests break it.
const base = `title = "one storey"
[loop]
rate = "1000 Hz"
duration = "1 s"
[substructure]
damping_ratio = 0.03
[[substructure.storey]]
mass = "100 t"
stiffness = "4 kN/mm"
[excitation]
kind = "sine"
amplitude = "0.1 g"
frequency = "1.5 Hz"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "polynomial"
order = 2
delay = "8 ms"
`

func TestBaseIsRight(t *testing.T) {
	s, err := Parse("base.toml", []byte(base), ".")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.Build(); err != nil {
		t.Fatal(err)
	}
}

// Every wrong file gives one message with file, line and key.
func TestWrongFiles(t *testing.T) {
	for _, c := range []struct {
		name, old, new string
		want           string
	}{
		{"unknown section", "[loop]", "[lopp]\n[loop]", `x.toml:2: lopp: unknown section of a scenario "lopp"; did you mean "loop"?`},
		{"unknown key", `order = 2`, `ordr = 2`, `x.toml:24: channel.compensator.ordr: unknown setting of polynomial "ordr"; did you mean "order"?`},
		{"misspelt kind", `"polynomial"`, `"polinomial"`, `x.toml:23: channel.compensator.kind: unknown compensator kind "polinomial"; did you mean "polynomial"?`},
		{"kind missing", `kind = "spring"`, ``, `x.toml:19: channel.specimen.kind: is missing; known kinds are [`},
		{"wrong dimension", `delay = "8 ms"`, `delay = "8 mm"`, `x.toml:18: channel.actuator.delay: "8 mm" is a length (m); it must be a time (s); allowed is a time (s), 0 s to`},
		{"no unit", `mass = "100 t"`, `mass = 100`, `x.toml:8: substructure.storey.mass: 100 has no unit; allowed is a mass (kg)`},
		{"unknown unit", `mass = "100 t"`, `mass = "100 tons"`, `x.toml:8: substructure.storey.mass: "100 tons": unknown unit "tons"`},
		{"NaN", `order = 2`, `order = nan`, `x.toml:24: channel.compensator.order: NaN is no finite number; allowed is a whole number, 0 to 4`},
		{"NaN as text", `"100 t"`, `"NaN t"`, `x.toml:8: substructure.storey.mass: "NaN t" does not begin with a finite number`},
		{"above range", `order = 2`, `order = 9`, `x.toml:24: channel.compensator.order: 9 is above 4; allowed is a whole number, 0 to 4`},
		{"not whole", `order = 2`, `order = 2.5`, `x.toml:24: channel.compensator.order: 2.5 is not a whole number`},
		{"negative mass", `"100 t"`, `"-100 t"`, `x.toml:8: substructure.storey.mass: -100 t is below 0.001 kg`},
		{"zero rate", `"1000 Hz"`, `"0 Hz"`, `x.toml:3: loop.rate: 0 Hz is below 10 Hz; allowed is a frequency (Hz), 10 Hz to 100000 Hz`},
		{"absurd duration", `"1 s"`, `"1e9 s"`, `x.toml:4: loop.duration: 1e+09 s is above 604800 s`},
		{"absurd number of ticks", "duration = \"1 s\"", "duration = \"600000 s\"\nslowdown = 9000", `x.toml:4: loop.duration: rate, duration and slowdown make 5.4e+12 ticks; at most 1e+11`},
		{"required missing", `frequency = "1.5 Hz"`, ``, `x.toml:10: excitation.frequency: is missing; sine needs it`},
		{"section missing", "[channel.actuator]\nkind = \"lag-delay\"\ndelay = \"8 ms\"", "", `x.toml:14: channel.actuator: the section [channel.actuator] is missing`},
		{"no channel", base[strings.Index(base, "[[channel]]"):], ``, `x.toml: channel: no channel; a test needs at least one [[channel]]`},
		{"channel as table", "[[channel]]", "[channel]", `x.toml:`},
		{"broken TOML", `rate = "1000 Hz"`, `rate = "1000 Hz`, `x.toml:3: `},
		{"key twice", `order = 2`, "order = 2\norder = 3", `x.toml:`},
		{"text for a table", "[loop]\nrate = \"1000 Hz\"\nduration = \"1 s\"\n", "loop = 3\n", `x.toml:2: loop: must be a section, [loop]`},
		{"levels", `name = "damper"`, "name = \"damper\"\nbetween = [0, 2]", `x.toml:16: channel.between: names level 2; the structure has levels 0 (ground) to 1`},
		{"same level twice", `name = "damper"`, "name = \"damper\"\nbetween = [1, 1]", `x.toml:16: channel.between: [1 1] does not name two levels`},
		{"bad name", `name = "damper"`, `name = "the damper"`, `x.toml:15: channel.name: "the damper" is no name`},
		{"reserved name", `name = "damper"`, `name = "loop"`, `x.toml:15: channel.name: "loop" is the name of a section`},
		{"missing record", "kind = \"sine\"\namplitude = \"0.1 g\"\nfrequency = \"1.5 Hz\"", "kind = \"record\"\nfile = \"nowhere.txt\"\nunit = \"g\"\nstep = \"20 ms\"", `x.toml:12: excitation.file: `},
		{"driven dimension", `amplitude = "0.1 g"`, `amplitude = "10 kN"`, `x.toml:12: excitation.amplitude: "10 kN" is a force (N); it must be an acceleration (m/s^2)`},
		{"structure under a driven target", `kind = "sine"`, "kind = \"sine\"\ndrives = \"target\"", `x.toml:`},
		{"embedded file misspelt", "kind = \"sine\"\namplitude = \"0.1 g\"\nfrequency = \"1.5 Hz\"", "kind = \"record\"\nfile = \"embedded:vally.txt\"\nunit = \"g\"\nstep = \"20 ms\"", `x.toml:12: excitation.file: unknown embedded data file "vally.txt"; did you mean "valley.txt"?`},
		{"more mass in the specimen than in the structure", `stiffness = "1 kN/mm"`, "stiffness = \"1 kN/mm\"\n[[channel.specimen]]\nkind = \"mass\"\nmass = \"101 t\"", `x.toml:14: channel: the specimens' masses are 1.01 times the structure's own where they act`},
		{"level without force", `kind = "sine"`, "kind = \"sine\"\nlevel = 1", `x.toml:12: excitation.level: is for drives = "force"`},
		{"amplitude beyond sense", `"0.1 g"`, `"1e30 g"`, `x.toml:12: excitation.amplitude: 9.80665e+30 m/s² is above 1000 m/s²`},
		{"unknown drive", `kind = "sine"`, "kind = \"sine\"\ndrives = \"sky\"", `x.toml:12: excitation.drives: unknown word "sky"`},
		{"unknown integrator", `damping_ratio = 0.03`, `integrator = "newmark"`, `x.toml:6: substructure.integrator: unknown integrator kind "newmark"; did you mean "newmark-explicit"?`},
		{"ratio and dashpot", `stiffness = "4 kN/mm"`, "stiffness = \"4 kN/mm\"\ndamping = \"1 kN*s/m\"", `x.toml:`},
		{"second lane misspelt", base[len(base)-1:], "\n[[lane]]\nname = \"a\"\n[lane.compensator]\nkind = \"none\"\n[[lane]]\nname = \"b\"\n[lane.compensator]\nkind = \"inverse\"\ndealy = \"1 ms\"\n", `x.toml:34: lane.compensator.dealy: unknown setting of inverse "dealy"; did you mean "delay"?`},
		{"spread of nothing", base[len(base)-1:], "\n[spread]\n\"damper.actuator.dely\" = 0.2\n", `x.toml:27: spread.damper.actuator.dely: unknown setting of lag-delay "dely"; did you mean "delay"?`},
		{"spread too wide", base[len(base)-1:], "\n[spread]\n\"damper.actuator.delay\" = 2.0\n", `x.toml:27: spread.damper.actuator.delay: 2 is above 1`},
		{"inline specimen", "[[channel.specimen]]\nkind = \"spring\"\nstiffness = \"1 kN/mm\"\n", "specimen = [{kind = \"spring\", stiffness = \"1 s\"}]\n", `x.toml:`},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := strings.Replace(base, c.old, c.new, 1)
			if c.old == "\n" {
				text = base + c.new[1:]
			}
			if text == base {
				t.Fatal("the scenario was not changed")
			}
			s, err := Parse("x.toml", []byte(text), t.TempDir())
			if err == nil {
				_, err = s.Build()
			}
			if err == nil {
				t.Fatal("no error")
			}
			if !strings.HasPrefix(err.Error(), c.want) {
				t.Errorf("got  %v\nwant %s", err, c.want)
			}
			if strings.Count(err.Error(), "\n") > 0 {
				t.Errorf("more than one line: %v", err)
			}
		})
	}
}

// What would need more memory than a laptop has, or a step at which explicit
// Newmark cannot be stable, is refused before anything is allocated.
func TestRefusedBeforeBuilding(t *testing.T) {
	for _, c := range []struct{ path, value, also, want string }{
		{"substructure.integrator", "newmark-explicit", "substructure.storey[0].stiffness=1e9 N/mm", `x.toml:3: loop.rate: the model step of 1 ms is not below`},
		{"excitation.frequency", "60 Hz", "loop.rate=100 Hz", `--set excitation.frequency: excitation.frequency: 60 Hz is not below half the rate in model time, 50 Hz`},
		{"loop.rate", "100000 Hz", "loop.duration=86400 s", `x.toml:2: loop: 1 lanes of 1 channels`},
	} {
		also, err := ParseChange(c.also)
		if err != nil {
			t.Fatal(err)
		}
		changes := []Change{{c.path, c.value}, also}
		if c.path == "loop.rate" {
			changes = append(changes, Change{"loop.energy_window", "86400 s"})
		}
		s, err := Parse("x.toml", []byte(base), ".", changes...)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := s.Build(); err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%v: got %v\nwant %s", changes, err, c.want)
		}
	}
}

func TestSetReachesEverySection(t *testing.T) {
	s, err := Parse("base.toml", []byte(base), ".")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		path, value string
		want        float64
	}{
		{"loop.rate", "2048 Hz", 2048},
		{"damper.compensator.delay", "12 ms", 0.012},
		{"damper.compensator.order", "4", 4},
		{"channel[0].compensator.order", "1", 1},
		{"damper.specimen.stiffness", "3 kN/mm", 3e6},
		{"damper.specimen[0].stiffness", `"2 kN/mm"`, 2e6},
		{"damper.limits.stroke", "50 mm", 0.05},
		{"damper.sensor.force_noise", "10 N", 10},
		{"substructure.storey[0].mass", "90 t", 90e3},
		{"excitation.amplitude", "0.2 g", 0.2 * 9.80665},
		{"accept.nrmse", "0.2", 0.2},
	} {
		changed, err := s.With(Change{c.path, c.value})
		if err != nil {
			t.Errorf("%s: %v", c.path, err)
			continue
		}
		at, err := changed.Locate(c.path)
		if err != nil {
			t.Errorf("%s: %v", c.path, err)
			continue
		}
		if got := at.Values[at.Setting.Name].Num; got != c.want {
			t.Errorf("%s = %v, want %v", c.path, got, c.want)
		}
	}
	if before, _ := s.Locate("loop.rate"); before.Values.Num("rate") != 1000 {
		t.Error("With changed the scenario it was called on")
	}
}

func TestSetErrors(t *testing.T) {
	s, err := Parse("base.toml", []byte(base), ".")
	if err != nil {
		t.Fatal(err)
	}
	for path, want := range map[string]string{
		"damper.compensator.dely":      `--set damper.compensator.dely: channel.compensator.dely: unknown setting of polynomial "dely"; did you mean "delay"?`,
		"dampr.compensator.delay":      `--set dampr.compensator.delay: unknown channel or section "dampr"; did you mean "damper"?`,
		"loop.rate":                    `--set loop.rate: loop.rate: "12 ms" is a time (s); it must be a frequency (Hz)`,
		"substructure.storey[3].mass":  `--set substructure.storey[3].mass: there is no substructure.storey[3]; there are 1, counted from 0`,
		"delay":                        `--set delay: "delay" names no setting`,
		"lane.fast.compensator.delay":  `--set lane.fast.compensator.delay: unknown lane "fast"`,
		"damper.compensator.kind":      `--set damper.compensator.kind: channel.compensator.kind: unknown compensator kind "12 ms"`,
		"damper.specimen[1].stiffness": `--set damper.specimen[1].stiffness: there is no channel[0].specimen[1]`,
	} {
		_, err := s.With(Change{path, "12 ms"})
		if err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%s: got %v\nwant %s", path, err, want)
		}
	}
	if _, err := ParseChange("delay"); err == nil {
		t.Error("a change without a value was taken")
	}
}

// Switching the kind drops the settings of the old one.
func TestSetKind(t *testing.T) {
	s, err := Parse("base.toml", []byte(base), ".", Change{"damper.compensator.kind", "inverse"}, Change{"damper.compensator.delay", "9 ms"})
	if err != nil {
		t.Fatal(err)
	}
	if c := s.Channels[0].Compensator; c.Kind.Name != "inverse" || c.Values.Num("delay") != 0.009 {
		t.Errorf("got %s %v", c.Kind.Name, c.Values)
	}
}

// Choosing a kind or an integrator drops what belonged to the old one and keeps
// what was set beside it, in whatever order the changes come.
func TestSetChoosesBeforeItSets(t *testing.T) {
	with := func(text string, changes ...string) *Scenario {
		t.Helper()
		var cs []Change
		for _, c := range changes {
			change, err := ParseChange(c)
			if err != nil {
				t.Fatal(err)
			}
			cs = append(cs, change)
		}
		s, err := Parse("x.toml", []byte(text), ".", cs...)
		if err != nil {
			t.Fatalf("%v: %v", changes, err)
		}
		return s
	}
	for _, kind := range []string{"polynomial", `"polynomial"`} { // what it is already, quoted or not
		if s := with(base, "damper.compensator.kind="+kind); s.Channels[0].Compensator.Values.Num("delay") != 0.008 {
			t.Errorf("the same kind %s lost its delay", kind)
		}
	}
	if s := with(base, "damper.compensator.delay=5 ms", "damper.compensator.kind=inverse"); s.Channels[0].Compensator.Values.Num("delay") != 0.005 {
		t.Error("a setting before its kind was lost")
	}
	force := strings.Replace(base, "kind = \"sine\"\namplitude = \"0.1 g\"", "kind = \"pulse\"\ndrives = \"force\"\nlevel = 1\nwidth = \"1 s\"\namplitude = \"1 kN\"", 1)
	force = strings.Replace(force, "frequency = \"1.5 Hz\"\n", "", 1)
	if s := with(force, "excitation.kind=sine", "excitation.amplitude=2 kN", "excitation.frequency=1 Hz"); s.Excitation.Values.Int("level") != 1 {
		t.Error("the force moved to another level")
	}
	spread := base + "\n[spread]\n\"damper.actuator.delay\" = 0.2\n\"damper.compensator.delay\" = 0.1\n"
	for _, path := range []string{"damper.actuator.kind", "channel[0].actuator.kind"} {
		if s := with(spread, path+"=servo-hydraulic"); len(s.Spread) != 1 || s.Spread[0].Path != "damper.compensator.delay" {
			t.Errorf("%s: spread %v", path, s.Spread)
		}
	}
	kr := strings.Replace(base, "damping_ratio = 0.03", "damping_ratio = 0.03\nintegrator = \"KR-alpha\"\nrho_infinity = 0.5", 1)
	if s := with(kr, "substructure.integrator=CR"); s.Substructure.Values.Has("rho_infinity") || !s.Substructure.Values.Has("damping_ratio") {
		t.Errorf("substructure %v", s.Substructure.Values)
	}
	if _, err := Parse("x.toml", []byte(strings.Replace(kr, "KR-alpha", "CR", 1)), "."); err == nil ||
		err.Error() != "x.toml:8: substructure.rho_infinity: is a setting of the integrator KR-alpha; here it is CR" {
		t.Errorf("got %v", err)
	}
}

// What is written reads back as the same scenario, and writing that again
// gives the same text.
func TestWriteReadsBack(t *testing.T) {
	for _, name := range Names() {
		s, err := Load(name)
		if err != nil {
			t.Fatal(err)
		}
		var first, second strings.Builder
		s.WriteTo(&first)
		again, err := Parse("again.toml", []byte(first.String()), ".")
		if err != nil {
			t.Fatalf("%s: %v\n%s", name, err, first.String())
		}
		again.WriteTo(&second)
		if first.String() != second.String() {
			t.Errorf("%s: written twice, not the same:\n%s\n%s", name, first.String(), second.String())
		}
	}
}

// Every kind of the manual has an example that loads, so that what describe
// shows can be pasted.
func TestExamplesLoad(t *testing.T) {
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "motion.txt"), []byte("0 0\n1 0.1\n2 0\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	cut := func(from, to string) string {
		i := strings.Index(base, from)
		j := len(base)
		if to != "" {
			j = strings.Index(base, to)
		}
		return base[i:j]
	}
	places := map[string]string{
		"[channel.compensator]": cut("[channel.compensator]", ""),
		"[channel.actuator]":    cut("[channel.actuator]", "[[channel.specimen]]"),
		"[[channel.specimen]]":  cut("[[channel.specimen]]", "[channel.compensator]"),
		"[substructure]":        cut("[substructure]", "[[substructure.storey]]"),
		"[excitation]":          cut("[excitation]", "[[channel]]"),
	}
	for _, chapter := range Chapters() {
		old, ok := places[chapter.Header]
		if !ok {
			continue
		}
		for _, k := range chapter.Kinds {
			text := strings.Replace(base, old, chapter.Example(k), 1)
			s, err := Parse(k.Name+".toml", []byte(text), dir)
			if err == nil {
				_, err = s.Build()
			}
			if err != nil {
				t.Errorf("%v\n%s", err, chapter.Example(k))
			}
		}
	}
}

func TestManual(t *testing.T) {
	for _, chapter := range Chapters() {
		for _, k := range chapter.Kinds {
			var out strings.Builder
			if err := WriteManual(&out, k.Name); err != nil {
				t.Error(err)
			}
			for _, s := range k.Settings {
				if s.Doc == "" || !strings.Contains(out.String(), s.Name) {
					t.Errorf("%s.%s is not documented", k.Name, s.Name)
				}
			}
			if k.Doc == "" || k.Source == "" {
				t.Errorf("%s has no line of documentation or no source", k.Name)
			}
		}
	}
	if err := WriteManual(&strings.Builder{}, "polinomial"); err == nil || !strings.Contains(err.Error(), `did you mean "polynomial"`) {
		t.Errorf("got %v", err)
	}
}

func FuzzParse(f *testing.F) {
	f.Add([]byte(base))
	for _, name := range Names() {
		text, err := Text(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text)
	}
	f.Add([]byte("[[channel]]\nspecimen = [{kind = \"spring\"}, {}]\n[channel.actuator]\n[lane]\n"))
	f.Add([]byte("substructure.storey = [{mass = \"1 t\"}]\nloop = {rate = \"1 Hz\"}\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		s, err := Parse("fuzz.toml", text, t.TempDir())
		if err != nil {
			if !strings.HasPrefix(err.Error(), "fuzz.toml") {
				t.Fatalf("an error that does not name the file: %v", err)
			}
			return
		}
		// What was accepted can be written and read again.
		var out strings.Builder
		s.WriteTo(&out)
		if _, err := Parse("again.toml", []byte(out.String()), "."); err != nil {
			t.Fatalf("%v\n%s", err, out.String())
		}
	})
}
