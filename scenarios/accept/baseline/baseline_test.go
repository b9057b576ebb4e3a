package baseline

import (
	"bytes"
	"context"
	"math"
	"regexp"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// short is a scenario with two lanes that runs in milliseconds.
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
lag = "3 ms"
[[channel.specimen]]
kind = "bouc-wen"
stiffness = "2 kN/mm"
yield_displacement = "10 mm"
[channel.compensator]
kind = "polynomial"
order = 2
delay = "11 ms"
[[lane]]
name = "late"
[lane.compensator]
kind = "none"
`

func load(t testing.TB, text string, changes ...scenarios.Change) *scenarios.Scenario {
	t.Helper()
	s, err := scenarios.Parse("short.toml", []byte(text), ".", changes...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// figuresOf runs a scenario and takes its figures.
func figuresOf(t testing.TB, s *scenarios.Scenario) *Baseline {
	t.Helper()
	v, err := accept.Run(context.Background(), s, accept.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return From(v, "test 1")
}

func text(t testing.TB, b *Baseline) string {
	t.Helper()
	var out bytes.Buffer
	if err := b.WriteTo(&out, "short.toml"); err != nil {
		t.Fatal(err)
	}
	return out.String()
}

// reread writes a baseline and reads it back.
func reread(t testing.TB, b *Baseline) *Baseline {
	t.Helper()
	back, err := Parse("short.baseline.toml", []byte(text(t, b)))
	if err != nil {
		t.Fatal(err)
	}
	return back
}

// What is written and read back holds the run that it was taken from: the
// rounding of the text stays below a thousandth of every tolerance.
func TestWrittenAndReadHolds(t *testing.T) {
	t.Parallel()
	run := figuresOf(t, load(t, short))
	c := reread(t, run).Compare(run)
	if !c.Whole() || c.Compared != len(run.Entries) || len(run.Entries) != 2*(1+len(laneFigures)+len(channelFigures)-1) {
		t.Errorf("compared %d of %d: %+v", c.Compared, len(run.Entries), c)
	}
	if c.Widest > 1e-3 {
		t.Errorf("the text moves a figure by %.2g of its tolerance", c.Widest)
	}
	if a, b := text(t, run), text(t, figuresOf(t, load(t, short))); a != b {
		t.Error("the same run writes another text")
	}
}

func spaced(words ...string) string {
	return strings.Join(strings.Fields(strings.Join(words, " ")), " ")
}

// moved lists figures that moved, "lane channel figure".
func moved(c *Comparison) []string {
	var out []string
	for _, m := range c.Moved {
		out = append(out, spaced(m.Lane, m.Channel, m.Figure))
	}
	return out
}

// Each change of a thousandth, of a setting of ours or of the plant, shows in
// at least the figures named here, with the setting named.
func TestChangesShow(t *testing.T) {
	t.Parallel()
	was := reread(t, figuresOf(t, load(t, short)))
	for _, c := range []struct{ path, value, from, figure string }{
		{"damper.compensator.delay", "11.011 ms", "11 ms", "configured damper delay"},
		{"damper.actuator.delay", "8.008 ms", "8 ms", "late damper delay"},
		{"damper.actuator.gain", "1.001", "1", "configured damper amplitude_ratio"},
		{"damper.specimen.stiffness", "2.002 kN/mm", "2 kN/mm", "configured damper peak_force"},
		{"substructure.storey[0].mass", "100.1 t", "100 t", "configured input"},
		{"damper.sensor.force_gain", "1.001", "1", "late damper peak_force"},
		{"excitation.amplitude", "1.001 m/s^2", "1 m/s^2", "configured damper peak_target"},
		{"loop.hold", "step", "ramp", "configured damper nrmse"},
	} {
		got := was.Compare(figuresOf(t, load(t, short, scenarios.Change{Path: c.path, Value: c.value})))
		if got.Same() || !slices.Contains(moved(got), c.figure) {
			t.Errorf("%s = %s: moved %v, not %s", c.path, c.value, moved(got), c.figure)
		}
		path := strings.Replace(c.path, "specimen.", "specimen[0].", 1)
		if len(got.Settings) != 1 || got.Settings[0] != (SettingChange{path, c.from, c.value}) {
			t.Errorf("%s: settings %v", c.path, got.Settings)
		}
	}
}

// A default of ours that is not what it was when the baseline was recorded: the
// scenario's text is the same, the resolved setting is not.
func TestChangedDefaultShows(t *testing.T) {
	t.Parallel()
	implicit := strings.Replace(short, "order = 2\n", "", 1)
	then := load(t, implicit, scenarios.Change{Path: "damper.compensator.order", Value: "1"})
	c := reread(t, figuresOf(t, then)).Compare(figuresOf(t, load(t, implicit)))
	if !slices.Contains(moved(c), "configured damper nrmse") || len(c.Settings) != 1 || c.Settings[0] != (SettingChange{"damper.compensator.order", "1", "3"}) {
		t.Errorf("moved %v, settings %v", moved(c), c.Settings)
	}
}

// What the baseline has and the run has not is a failure; what the run has
// more is only said.
func TestLanesComeAndGo(t *testing.T) {
	t.Parallel()
	without, with := short[:strings.Index(short, "[[lane]]")], short
	two, one := figuresOf(t, load(t, with)), figuresOf(t, load(t, without))
	c := two.Compare(one)
	if n := len(two.Entries) / 2; len(c.Moved) != n || c.Compared != 2*n || c.Moved[0].Lane != "late" || c.Moved[0].IsText != "gone" || c.Moved[0].Is != nil {
		t.Errorf("a lane is gone: %+v", c.Moved)
	}
	c = one.Compare(two)
	if !c.Same() || c.Whole() || len(c.Added) != len(one.Entries) || c.Added[0] != "late: outcome" {
		t.Errorf("a lane is new: %+v", c)
	}
}

// A lane that trips keeps what tripped and when.
func TestTrips(t *testing.T) {
	t.Parallel()
	limited := strings.Replace(short, "[[channel.specimen]]", "[channel.limits]\nstroke = \"20 mm\"\n[[channel.specimen]]", 1)
	run := figuresOf(t, load(t, limited))
	c := reread(t, run).Compare(run)
	if !c.Whole() || run.Text("configured", "", "outcome") != "tripped" || run.Text("configured", "", "trip") != "stroke of damper" {
		t.Errorf("%+v\n%s", c, text(t, run))
	}
	later := figuresOf(t, load(t, limited, scenarios.Change{Path: "damper.limits.stroke", Value: "21 mm"}))
	if !slices.Contains(moved(run.Compare(later)), "configured trip_time") {
		t.Errorf("moved %v", moved(run.Compare(later)))
	}
	if c := run.Compare(figuresOf(t, load(t, short))); !slices.Contains(moved(c), "configured outcome") || !slices.Contains(moved(c), "configured trip") {
		t.Errorf("moved %v", moved(c))
	}
}

// Undefined is a value like another: it may neither come nor go.
func TestUndefined(t *testing.T) {
	t.Parallel()
	e := func(v float64) *Entry { return &Entry{Figure: "delay", Was: v, Within: 1} }
	nan := math.NaN()
	for _, c := range []struct {
		was, is float64
		holds   bool
	}{{nan, nan, true}, {nan, 0, false}, {0, nan, false}, {0, 1, true}, {0, 1.0001, false}, {0, -1, true}} {
		if got := e(c.was).holds(e(c.is)); got != c.holds {
			t.Errorf("%g was, %g is: %v", c.was, c.is, got)
		}
	}
}

// Recording again keeps what holds as it stands in the file, and tolerances
// that were set by hand; it replaces what moved.
func TestRenew(t *testing.T) {
	t.Parallel()
	old := text(t, figuresOf(t, load(t, short)))
	wide := regexp.MustCompile(`(?m)^nrmse = \{ was = ("[^"]*"), within = "[^"]*" \}$`).ReplaceAllString(old, `nrmse = { was = $1, within = "50 %" }`)
	was, err := Parse("x", []byte(wide))
	if err != nil {
		t.Fatal(err)
	}
	run := figuresOf(t, load(t, short, scenarios.Change{Path: "damper.compensator.delay", Value: "14 ms"}))
	c, now := was.Compare(run), was.Renew(run)
	if again := now.Compare(run); !again.Whole() {
		t.Errorf("what was recorded does not hold: %+v", again)
	}
	before, renewed := was.index(), now.index()
	for key, e := range renewed {
		o := before[key]
		switch hit := slices.Contains(moved(c), spaced(key[0], key[1], key[2])); {
		case !hit && *e != *o:
			t.Errorf("%v holds, and was replaced", key)
		case hit && !e.word() && e.Was == o.Was:
			t.Errorf("%v moved, and was kept", key)
		}
	}
	if e := renewed[[3]string{"configured", "damper", "nrmse"}]; e.Within != 0.5 || slices.Contains(moved(c), "configured damper nrmse") {
		t.Errorf("the tolerance set by hand is %g", e.Within)
	}
	if e := renewed[[3]string{"configured", "damper", "delay"}]; e.Within > 2e-6 || !slices.Contains(moved(c), "configured damper delay") {
		t.Errorf("the usual tolerance is %g", e.Within)
	}
}

// A tolerance counts as set by hand if and only if it was.
func TestUsualTolerancesAreNotByHand(t *testing.T) {
	t.Parallel()
	b := reread(t, figuresOf(t, load(t, short)))
	for i := range b.Entries {
		if b.byHand(&b.Entries[i]) {
			t.Errorf("%s: %g", b.Entries[i].place(), b.Entries[i].Within)
		}
	}
	b.Entries[2].Within *= 3
	if !b.byHand(&b.Entries[2]) {
		t.Error("three times as wide is not taken for set by hand")
	}
}

// Two values that differ look different, four digits at least.
func TestApart(t *testing.T) {
	t.Parallel()
	for _, c := range []struct {
		was, is    float64
		figure     string
		wasT, isT  string
		difference bool
	}{
		{0.00935, 0.0244, "nrmse", "0.935 %", "2.44 %", true},
		{7.9e-5, -2.1e-3, "delay", "0.079 ms", "-2.1 ms", true},
		{64123.4, 64123.9, "input", "64.123 kJ", "64.124 kJ", true},
		{0.02, 0.02, "peak_target", "20 mm", "20 mm", false},
		{0.02, math.NaN(), "peak_target", "20 mm", "undefined", true},
	} {
		dim, _, _ := described(c.figure)
		if a, b := apart(c.was, c.is, dim); a != c.wasT || b != c.isT || (a != b) != c.difference {
			t.Errorf("%g, %g: %q, %q", c.was, c.is, a, b)
		}
	}
}
