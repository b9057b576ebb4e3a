package report

import (
	"context"
	"encoding/xml"
	"errors"
	"io"
	"regexp"
	"strings"
	"testing"

	"antelag/scenarios"
)

// rig is a small test: one storey, one channel.
const rig = `title = "one storey"
[loop]
rate = "512 Hz"
duration = "4 s"
[substructure]
damping_ratio = 0.03
[[substructure.storey]]
mass = "100 t"
stiffness = "8 kN/mm"
[excitation]
kind = "filtered-noise"
drives = "ground"
peak = "0.2 g"
rise = "1 s"
strong = "2 s"
[[channel]]
name = "damper"
between = [0, 1]
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "4 ms"
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "polynomial"
order = 3
delay = "12 ms"
[channel.limits]
stroke = "500 mm"
error = "25 mm"
[accept]
nrmse = 0.05
energy_margin = 0.1
[spread]
"damper.actuator.delay" = 0.2
`

// tracked is an actuator alone.
const tracked = `title = "an actuator alone"
[loop]
rate = "512 Hz"
duration = "4 s"
[excitation]
kind = "sine"
drives = "target"
amplitude = "10 mm"
frequency = "1 Hz"
[[channel]]
[channel.actuator]
kind = "second-order"
[channel.compensator]
kind = "adaptive-inverse"
delay = "10 ms"
`

func scene(t *testing.T, text string, changes ...string) *scenarios.Scenario {
	t.Helper()
	var all []scenarios.Change
	for _, c := range changes {
		change, err := scenarios.ParseChange(c)
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, change)
	}
	s, err := scenarios.Parse("rig.toml", []byte(text), ".", all...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// coarse is a map that is worked out at once.
const coarse = "damper.actuator.delay=0:20 ms:5,damper.compensator.delay=0:20 ms:5"

func reported(t *testing.T, s *scenarios.Scenario, o Options) *Test {
	t.Helper()
	if o.Map == "" && s.Substructure != nil {
		o.Map = coarse
	}
	test, err := Run(context.Background(), s, o)
	if err != nil {
		t.Fatal(err)
	}
	return test
}

func html(t *testing.T, p *Page) string {
	t.Helper()
	var out strings.Builder
	if err := p.Write(&out); err != nil {
		t.Fatal(err)
	}
	return out.String()
}

func TestSameInputSameBytes(t *testing.T) {
	page := func() string {
		return html(t, &Page{Version: "v1", Date: "2026-12-01", Tests: []*Test{reported(t, scene(t, rig), Options{}), reported(t, scene(t, tracked), Options{})}})
	}
	a, b := page(), page()
	if a != b {
		t.Error("two pages of the same input differ")
	}
	if !strings.Contains(a, "antelag v1, 2026-12-01") {
		t.Error("version and date are not there")
	}
}

// Everything that the brief of a test asks for stands on its page.
func TestPageHasItsParts(t *testing.T) {
	for _, c := range []struct {
		name, text string
		headings   []string
		pictures   []string
	}{
		{"hybrid", rig,
			[]string{"Acceptance", "Tracking and force", "Energy", "Frequency response of compensator and actuator", "Stability", "Figures by channel", "Structure and motion", "Channel damper", "Assumed, and not tested", "Provenance"},
			[]string{"damper-tracking", "damper-synchronization", "damper-force", "energy-margin", "damper-response", "stability"}},
		{"actuator alone", tracked,
			[]string{"Acceptance", "Tracking and force", "Frequency response of compensator and actuator", "Figures by channel", "Structure and motion", "Channel channel1", "Assumed, and not tested", "Provenance"},
			[]string{"channel1-tracking", "channel1-synchronization", "channel1-force", "channel1-response"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			test, err := Run(context.Background(), scene(t, c.text), Options{})
			if err != nil {
				t.Fatal(err)
			}
			var headings, pictures []string
			for _, p := range test.Parts {
				headings = append(headings, p.Heading)
			}
			for _, p := range test.Pictures() {
				pictures = append(pictures, p.Name)
			}
			if strings.Join(headings, "; ") != strings.Join(c.headings, "; ") {
				t.Errorf("headings %q", headings)
			}
			if strings.Join(pictures, "; ") != strings.Join(c.pictures, "; ") {
				t.Errorf("pictures %q", pictures)
			}
			page := html(t, &Page{Tests: []*Test{test}})
			for _, caution := range Cautions {
				if !strings.Contains(page, caution) {
					t.Errorf("no %q", caution)
				}
			}
			if n := strings.Count(page, "<svg "); n != len(c.pictures) {
				t.Errorf("%d pictures on the page", n)
			}
			if strings.Index(page, `class="answer"`) > strings.Index(page, "<h2") {
				t.Error("the verdict does not come first")
			}
		})
	}
}

// A page is safe to open whatever a scenario has for words: well-formed, and
// nothing on it runs, loads or leads away.
func TestHostileWords(t *testing.T) {
	evil := `<script>alert(1)</script><img src=x onerror=alert(2)>"'&`
	text := strings.Replace(rig, `"one storey"`, "'''"+evil+"'''", 1)
	test := reported(t, scene(t, text), Options{Sets: []string{evil}})
	test.Name = evil
	for _, tests := range [][]*Test{{test}, {test, reported(t, scene(t, tracked), Options{})}} {
		page := html(t, &Page{Version: evil, Date: evil, Tests: tests})
		seen := map[string]bool{}
		d := xml.NewDecoder(strings.NewReader(strings.NewReplacer("<!DOCTYPE html>", "", `<meta charset="utf-8">`, "",
			`<meta name="viewport" content="width=device-width, initial-scale=1">`, "",
			`<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'">`, "").Replace(page)))
		d.Strict = true
		for {
			token, err := d.Token()
			if errors.Is(err, io.EOF) {
				break
			}
			if err != nil {
				t.Fatal(err)
			}
			e, ok := token.(xml.StartElement)
			if !ok {
				continue
			}
			seen[e.Name.Local] = true
			for _, a := range e.Attr {
				name := strings.ToLower(a.Name.Local)
				if strings.HasPrefix(name, "on") || name == "src" || name == "href" && !strings.HasPrefix(a.Value, "#") {
					t.Errorf("<%s %s=%q>", e.Name.Local, a.Name.Local, a.Value)
				}
			}
		}
		for _, bad := range []string{"script", "img", "iframe", "object", "link", "base", "form"} {
			if seen[bad] {
				t.Errorf("a <%s>", bad)
			}
		}
		for _, bad := range []string{"@import", "url("} {
			if strings.Contains(page, bad) {
				t.Errorf("the page has %s", bad)
			}
		}
	}
}

// Headings go down one level at a time, every table has a caption and scoped
// headings, every id is there once and every reference leads to one.
func TestReadersFindTheirWay(t *testing.T) {
	one := reported(t, scene(t, rig), Options{})
	for name, page := range map[string]string{
		"one":     html(t, &Page{Tests: []*Test{one}}),
		"several": html(t, &Page{Tests: []*Test{one, reported(t, scene(t, tracked), Options{})}}),
	} {
		level := 0
		for _, m := range regexp.MustCompile(`<h([1-6])[ >]`).FindAllStringSubmatch(page, -1) {
			next := int(m[1][0] - '0')
			if next > level+1 {
				t.Errorf("%s: h%d below h%d", name, next, level)
			}
			level = next
		}
		if n := strings.Count(page, "<h1"); n != 1 {
			t.Errorf("%s: %d h1", name, n)
		}
		if tables, captions := strings.Count(page, "<table>"), strings.Count(page, "<caption>"); tables == 0 || tables != captions {
			t.Errorf("%s: %d tables, %d captions", name, tables, captions)
		}
		if strings.Contains(page, "<th>") {
			t.Errorf("%s: a heading without scope", name)
		}
		ids := map[string]int{}
		for _, m := range regexp.MustCompile(` id="([^"]*)"`).FindAllStringSubmatch(page, -1) {
			ids[m[1]]++
		}
		for id, n := range ids {
			if n > 1 {
				t.Errorf("%s: id %s is there %d times", name, id, n)
			}
		}
		for _, m := range regexp.MustCompile(`(?:aria-labelledby="|href="#)([^"]*)"`).FindAllStringSubmatch(page, -1) {
			if ids[m[1]] != 1 {
				t.Errorf("%s: %s leads nowhere", name, m[0])
			}
		}
	}
}

// A run that is stopped, trips or diverges still has its page.
func TestRunsThatDoNotEnd(t *testing.T) {
	stopped, stop := context.WithCancel(context.Background())
	stop()
	for _, c := range []struct {
		name    string
		ctx     context.Context
		changes []string
		want    string
	}{
		{"tripped at the first tick", context.Background(), []string{"damper.limits.error=0.1 um", "damper.sensor.displacement_noise=1 mm"}, "TRIPPED at 0.000 s"},
		{"tripped later", context.Background(), []string{"damper.limits.stroke=1 mm"}, "TRIPPED at"},
		{"grows", context.Background(), []string{"damper.actuator.delay=200 ms", "damper.specimen.stiffness=100 kN/mm", "damper.limits.stroke=100 m", "damper.limits.error=100 m"}, "TRIPPED at"},
		{"diverged", context.Background(), []string{"damper.actuator.delay=200 ms", "damper.specimen.stiffness=100 kN/mm"}, "DIVERGED at"},
		{"interrupted", stopped, nil, "INTERRUPTED"},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := rig
			if c.name == "diverged" {
				text = strings.Replace(rig, "[channel.limits]\nstroke = \"500 mm\"\nerror = \"25 mm\"\n", "", 1)
			}
			test, err := Run(c.ctx, scene(t, text, c.changes...), Options{Map: coarse})
			if err != nil {
				t.Fatal(err)
			}
			if test.Pass || test.Word != "FAIL" || !strings.Contains(test.Verdict, c.want) {
				t.Errorf("%s %s", test.Word, test.Verdict)
			}
			if page := html(t, &Page{Tests: []*Test{test}}); strings.Contains(page, "NaN") {
				t.Errorf("NaN: %s", regexp.MustCompile(".{80}NaN.{40}").FindString(page))
			}
		})
	}
}

func TestWhatIsAssumed(t *testing.T) {
	for _, c := range []struct {
		name    string
		changes []string
		want    []string
		not     []string
	}{
		{"as it is", nil, []string{"does not saturate", "Sensors are perfect", "No trip limit on velocity and force is set", "A sweep over the spread was not given", "No acceptance limit was given for: delay; tracking error, peak; response error"}, []string{"slowed down"}},
		{"slow", []string{"loop.slowdown=8"}, []string{"slowed down 8 times"}, nil},
		{"noisy", []string{"damper.sensor.force_noise=50 N"}, []string{"one draw of all noise (seed 1)"}, []string{"Sensors are perfect"}},
		{"servo-hydraulic", []string{"damper.actuator.kind=servo-hydraulic"}, []string{"The actuator is a servo-hydraulic"}, []string{"does not saturate"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := scene(t, rig, append(c.changes, "loop.duration=0.5 s")...)
			text := strings.Join((&run{s: s}).assumed(), "\n")
			for _, want := range c.want {
				if !strings.Contains(text, want) {
					t.Errorf("not said: %q in\n%s", want, text)
				}
			}
			for _, not := range c.not {
				if strings.Contains(text, not) {
					t.Errorf("said: %q", not)
				}
			}
		})
	}
}

// What a page says of its scenario reads as that scenario again.
func TestProvenanceReadsBack(t *testing.T) {
	test := reported(t, scene(t, rig), Options{Sets: []string{"loop.rate=512 Hz"}})
	last := test.Parts[len(test.Parts)-1]
	again := reported(t, scene(t, last.Listing), Options{Sets: []string{"loop.rate=512 Hz"}})
	if a, b := html(t, &Page{Tests: []*Test{test}}), html(t, &Page{Tests: []*Test{again}}); a != b {
		t.Error("the scenario on the page does not come to the same page")
	}
	if row := last.Tables[0].Rows[2]; row[0] != "changed by --set" || row[1] != "loop.rate=512 Hz" {
		t.Errorf("changes: %q", row)
	}
}
