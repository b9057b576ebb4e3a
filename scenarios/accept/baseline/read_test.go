package baseline

import (
	"errors"
	"strings"
	"testing"

	"antelag/scenarios"
)

const small = `format = 1
version = "test 1"

[lane.configured]
outcome = "completed"
response_error = { was = "1 %", within = "0.1 %" }

[lane.configured.channel.damper]
delay = { was = "1 ms", within = "1 us" }
nrmse = { was = "undefined", within = "0 %" }

[settings]
"loop.rate" = "500 Hz"
`

// Whatever is wrong with a file is said in one line with file, line and key.
func TestBrokenFiles(t *testing.T) {
	t.Parallel()
	for _, c := range []struct{ name, old, new, want string }{
		{"not TOML", `was = "1 %"`, `was = "1 %`, "b.toml:6: "},
		{"no format", "format = 1\n", "", "b.toml: format: is missing"},
		{"of a later version", "format = 1", "format = 2", "b.toml:1: format: 2 is not 1"},
		{"format as a text", "format = 1", `format = "1"`, "b.toml:1: format: 1 is not 1"},
		{"no version", `version = "test 1"`, "", "b.toml: version: is missing"},
		{"unknown section", "[settings]", "[setings]", `b.toml:12: setings: unknown key of a baseline "setings"; did you mean "settings"?`},
		{"unknown figure of a channel", "delay =", "delai =", `b.toml:9: lane.configured.channel.damper.delai: unknown figure "delai"; did you mean "delay"?`},
		{"unknown figure of a lane", "response_error =", "nrmse =", `b.toml:6: lane.configured.nrmse: unknown figure "nrmse"`},
		{"unknown key of a figure", "within = \"1 us\"", "inside = \"1 us\"", `b.toml:9: lane.configured.channel.damper.delay.inside: unknown key of a baseline "inside"`},
		{"no tolerance", `, within = "1 us"`, "", "b.toml:9: lane.configured.channel.damper.delay.within: is missing"},
		{"a negative tolerance", `"1 us"`, `"-1 us"`, "b.toml:9: lane.configured.channel.damper.delay.within: -1 us is no tolerance"},
		{"an undefined tolerance", `"0 %"`, `"undefined"`, "b.toml:10: lane.configured.channel.damper.nrmse.within: undefined is no tolerance"},
		{"wrong dimension", `"1 ms"`, `"1 mm"`, "b.toml:9: lane.configured.channel.damper.delay.was: "},
		{"no unit", `"1 ms"`, `1`, "b.toml:9: lane.configured.channel.damper.delay.was: 1 is not a text in quotes"},
		{"no number", `"1 ms"`, `"soon"`, "b.toml:9: lane.configured.channel.damper.delay.was: "},
		{"infinite", `"1 ms"`, `"1e999 ms"`, "b.toml:9: lane.configured.channel.damper.delay.was: "},
		{"a figure that is a number", `{ was = "1 %", within = "0.1 %" }`, "0.01", "b.toml:6: lane.configured.response_error: is missing, or not a table"},
		{"no outcome", `outcome = "completed"`, "", "b.toml:4: lane.configured: has no outcome"},
		{"no lanes", small[strings.Index(small, "[lane.configured]"):strings.Index(small, "[settings]")], "", "b.toml: lane: is missing"},
		{"a lane that is a text", small[strings.Index(small, "[lane.configured]"):strings.Index(small, "[settings]")], "[lane]\nconfigured = \"x\"\n", "b.toml:5: lane.configured: is missing, or not a table"},
		{"a setting that is a number", `"500 Hz"`, "500", "b.toml:13: settings.loop.rate: 500 is not a text"},
		{"too long", "[settings]", strings.Repeat("# more\n", 1<<18) + "[settings]", "b.toml: is longer than 1048576 bytes"},
	} {
		broken := strings.Replace(small, c.old, c.new, 1)
		if broken == small {
			t.Errorf("%s: nothing was broken", c.name)
		}
		if _, err := Parse("b.toml", []byte(broken)); err == nil || !strings.HasPrefix(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	if _, err := Parse("b.toml", []byte(small)); err != nil {
		t.Error(err)
	}
}

// Names come through the file whatever is in them.
func TestHostileNames(t *testing.T) {
	t.Parallel()
	for _, name := range []string{`a "quoted" one`, "with.dots", "tab\there", "ünïcode 試", "outcome", "]", "#", `back\slash`, "line\nend"} {
		b := &Baseline{
			Version:  name,
			Settings: []scenarios.Resolved{{Path: name, Text: name}},
			Entries: []Entry{
				{Lane: name, Figure: "outcome", Word: name},
				{Lane: name, Channel: name, Figure: "delay", Was: 0.001, Within: 1e-6},
			},
		}
		if c := reread(t, b).Compare(b); !c.Whole() || c.Compared != 2 {
			t.Errorf("%q: %+v", name, c)
		}
	}
}

// Whatever is read can be written and read again, and is then the same.
func FuzzRead(f *testing.F) {
	f.Add([]byte(small))
	f.Add([]byte(text(f, figuresOf(f, load(f, short)))))
	f.Add([]byte("format = 1\nversion = \"\"\n[lane]\n[settings]\n"))
	f.Add([]byte("format = 1\n[lane.a.channel.b]\ndelay.was = \"-0 s\"\ndelay.within = \"1e-300 us\"\n"))
	f.Fuzz(func(t *testing.T, content []byte) {
		b, err := Parse("f", content)
		if err != nil {
			var placed *scenarios.Error
			if !errors.As(err, &placed) || !strings.HasPrefix(placed.Where, "f") {
				t.Errorf("an error without its place: %q", err)
			}
			return
		}
		again := reread(t, b)
		if c := b.Compare(again); !c.Same() || len(c.Added) > 0 || len(c.Settings) > 0 {
			t.Errorf("written and read again it differs: %+v", c)
		}
	})
}
