package accept

import (
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"unicode/utf8"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var update = flag.Bool("update", false, "write the golden files anew")

// scene has the trip limits of two channels; the second has fewer.
func scene() *scenarios.Scenario {
	return &scenarios.Scenario{Channels: []scenarios.Channel{
		{Name: "brace-low", Limits: kind.Values{"stroke": kind.Num(0.075), "velocity": kind.Num(1), "force": kind.Num(250e3), "error": kind.Num(0.015)}},
		{Name: "brace-high", Limits: kind.Values{"stroke": kind.Num(0.075)}},
	}}
}

func low(method string) rtloop.ChannelResult {
	return rtloop.ChannelResult{
		Name: "brace-low", Compensator: method, NRMSE: 0.003426, PeakError: 0.1677e-3, PeakErrorRatio: 0.0054, Delay: -0.0322e-3,
		AmplitudeRatio: 0.9995, PeakTarget: 0.03101, PeakCommand: 0.03104, PeakVelocity: 0.2381, PeakForce: 45.69e3,
	}
}

func high(method string) rtloop.ChannelResult {
	return rtloop.ChannelResult{
		Name: "brace-high", Compensator: method, NRMSE: 0.00951, PeakError: 0.2849e-3, PeakErrorRatio: 0.0105, Delay: 0.000004,
		AmplitudeRatio: 1.009, PeakTarget: 0.02707, PeakCommand: 0.02708, PeakVelocity: 0.2168, PeakForce: 1.204e6,
	}
}

func energy() rtloop.EnergyResult {
	return rtloop.EnergyResult{
		Window: 3.829, MarginMin: 0.9673, MarginFinal: 0.9871, Injected: 50.59, Damped: 30.65e3, Specimen: 26.94e3, Input: 57.54e3,
		Kinetic: 0.03397, Strain: 1.486, BalanceError: 3.8e-11, AddedDamping: -0.000064,
	}
}

var allLimits = kind.Values{
	"nrmse": kind.Num(0.06), "delay": kind.Num(0.001), "peak_error": kind.Num(0.003),
	"energy_margin": kind.Num(0.3), "response_error": kind.Num(0.1),
}

func verdictOf(slowdown float64, limits kind.Values, results ...rtloop.LaneResult) *Verdict {
	v := &Verdict{
		Scenario: "piperack", Title: "pipe rack, two braces", Ticks: 61440, Rate: 2048, Slowdown: slowdown, Step: 1.0 / 2048 / slowdown,
		Time: 30 / slowdown, Drive: quantity.Acceleration, Scene: scene(), Compute: Compute{Wall: 0.1234, NsPerTick: 2000},
	}
	for _, r := range results {
		l := judge(r, limits)
		l.Ran = v.Time
		if r.Outcome == rtloop.Interrupted {
			l.Ran = 4.5
		}
		v.Lanes = append(v.Lanes, l)
	}
	return v
}

// result is a completed lane of both channels; change makes it another.
func result(name string, change func(*rtloop.LaneResult), methods ...string) rtloop.LaneResult {
	r := rtloop.LaneResult{Name: name, Outcome: rtloop.Completed, Energy: energy(), ResponseError: 0.00263,
		Channels: []rtloop.ChannelResult{low(methods[0]), high(methods[len(methods)-1])}}
	if change != nil {
		change(&r)
	}
	return r
}

func verdicts() map[string]*Verdict {
	uncompensated := func(r *rtloop.LaneResult) {
		c := &r.Channels[1]
		c.NRMSE, c.Delay, c.PeakError, c.AmplitudeRatio = 0.1356, 0.013988, 3.952e-3, 0.9983
		r.Energy.MarginMin, r.Energy.MarginFinal, r.Energy.Injected, r.Energy.AddedDamping, r.Energy.BalanceError = -0.122, nan, 6221, -0.0056, 0.0012
		r.ResponseError = 0.1003
	}
	trip := func(limit string, value, allowed rtloop.Figure) func(*rtloop.LaneResult) {
		return func(r *rtloop.LaneResult) {
			r.Outcome, r.Trip = rtloop.Tripped, &rtloop.Trip{Limit: limit, Channel: "brace-high", Value: value, Allowed: allowed, Time: 5.9140625}
		}
	}
	diverge := func(limit string, value rtloop.Figure) func(*rtloop.LaneResult) {
		return func(r *rtloop.LaneResult) {
			r.Outcome, r.Trip = rtloop.Diverged, &rtloop.Trip{Limit: limit, Channel: "brace-low", Value: value, Allowed: 1000, Time: 0.73}
			r.Channels[0].NRMSE, r.Channels[0].PeakError, r.Channels[0].PeakCommand, r.Channels[0].PeakForce = 12345.6, 999.9, 999.9, 7.5e12
			r.Energy.MarginMin, r.Energy.Kinetic, r.Energy.Input, r.ResponseError = -1e6, 2.5e13, 1e9, nan
		}
	}
	interrupt := func(r *rtloop.LaneResult) { r.Outcome = rtloop.Interrupted }
	still := func(r *rtloop.LaneResult) {
		for i := range r.Channels {
			r.Channels[i] = rtloop.ChannelResult{Name: r.Channels[i].Name, Compensator: "none", NRMSE: nan, Delay: nan, AmplitudeRatio: nan, PeakErrorRatio: nan}
		}
		r.Energy = rtloop.EnergyResult{Window: 2.5, MarginMin: nan, MarginFinal: nan, AddedDamping: nan}
		r.ResponseError = nan
	}
	tracking := func(delay rtloop.Figure) func(*rtloop.LaneResult) {
		return func(r *rtloop.LaneResult) {
			r.Channels = r.Channels[:1]
			r.Channels[0].Delay = delay
			r.Energy = rtloop.EnergyResult{Window: 5, MarginMin: nan, MarginFinal: nan, Injected: nan, Damped: nan, Specimen: nan, Input: nan,
				Kinetic: nan, Strain: nan, BalanceError: nan, AddedDamping: nan}
			r.ResponseError = nan
		}
	}
	return map[string]*Verdict{
		"pass": verdictOf(1, allLimits, result("configured", nil, "polynomial"),
			result("high-adaptive", func(r *rtloop.LaneResult) { r.ResponseError = 0.00482 }, "polynomial", "adaptive-inverse")),
		"fail": verdictOf(1, allLimits, result("configured", uncompensated, "none"),
			result("least-squares", nil, "adaptive-time-series", "least-squares-polynomial"),
			result("gone", diverge("target", 2e7), "none", "adaptive-time-series"),
			result("cut", trip("velocity", 1.017, 1), "polynomial")),
		"trip":        verdictOf(1, allLimits, result("configured", trip("force", 255.1e3, 250e3), "polynomial")),
		"trip-stroke": verdictOf(4, kind.Values{"delay": kind.Num(0.0005)}, result("configured", trip("stroke", 0.07512, 0.075), "inverse")),
		"diverged":    verdictOf(1, allLimits, result("configured", diverge("command or measured displacement", 1234.5), "none")),
		"diverged-level": verdictOf(1, allLimits, result("configured", func(r *rtloop.LaneResult) {
			diverge("displacement of level 1", 1001)(r)
			r.Trip.Channel = "" // a level is no channel's
		}, "none")),
		"diverged-nan":  verdictOf(1, allLimits, result("configured", diverge("target", nan), "none")),
		"interrupted":   verdictOf(1, allLimits, result("configured", interrupt, "polynomial"), result("other", func(r *rtloop.LaneResult) { uncompensated(r); interrupt(r) }, "none")),
		"nothing-moved": verdictOf(1, allLimits, result("configured", still, "none")),
		"no-limits":     verdictOf(1, nil, result("configured", nil, "polynomial")),
		"tracking": verdictOf(1, kind.Values{"nrmse": kind.Num(0.1), "delay": kind.Num(0.0015)}, result("configured", tracking(0.000644), "inverse"),
			result("polynomial", tracking(-0.001515), "polynomial"), result("late", tracking(nan), "none")),
	}
}

// The texts are kept in testdata; go test ./scenarios/accept -update writes
// them anew, for a person to read before they are believed.
func TestWriteText(t *testing.T) {
	for name, v := range verdicts() {
		t.Run(name, func(t *testing.T) {
			var out strings.Builder
			if err := v.WriteText(&out, false); err != nil {
				t.Fatal(err)
			}
			path := filepath.Join("testdata", name+".txt")
			if *update {
				if err := os.WriteFile(path, []byte(out.String()), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if out.String() != string(want) {
				t.Errorf("got\n%s\nwant\n%s", out.String(), want)
			}
			layout(t, out.String())
			inColour(t, v, out.String())
		})
	}
}

// bare is a number that no unit follows.
var bare = regexp.MustCompile(`[0-9][0-9.e+]*( [^ ]+)?`)

// counts are numbers that need no unit.
var counts = regexp.MustCompile(`limits (met|failed): \d+ of \d+|  \d+ of \d+ limits|  \d+\. | \+\d | level \d`)

var unitsSeen = regexp.MustCompile(`^[-+0-9.e]+ (%|times|m|mm|km|µm|s|ms|mm/s|m/s|N|kN|MN|J|kJ|MJ|ticks|of)$`)

// layout checks what every text must keep: at most 120 columns, no blank at a
// line's end, nothing that is no number, and a unit behind every number.
func layout(t *testing.T, text string) {
	t.Helper()
	for _, line := range strings.Split(text, "\n") {
		if n := utf8.RuneCountInString(line); n > 120 {
			t.Errorf("%d columns: %s", n, line)
		}
		if strings.TrimRight(line, " \t") != line || strings.Contains(line, "\t") {
			t.Errorf("blanks at the end, or tabs: %q", line)
		}
		for _, bad := range []string{"NaN", "Inf", "%!", "-0.0 ", "-0 "} {
			if strings.Contains(line, bad) {
				t.Errorf("%s in %q", bad, line)
			}
		}
		for _, number := range bare.FindAllString(counts.ReplaceAllString(line, ""), -1) {
			if !unitsSeen.MatchString(strings.TrimRight(number, ",;)")) {
				t.Errorf("%q has no unit in %q", number, line)
			}
		}
	}
}

// inColour checks that colour adds escapes around the verdicts and nothing
// else: the columns stay where they are.
func inColour(t *testing.T, v *Verdict, plain string) {
	t.Helper()
	var out strings.Builder
	if err := v.WriteText(&out, true); err != nil {
		t.Fatal(err)
	}
	words := regexp.MustCompile(`\x1b\[3(1;1mFAIL|2;1mPASS)\x1b\[0m`)
	if n, all := len(words.FindAllString(out.String(), -1)), strings.Count(plain, "PASS")+strings.Count(plain, "FAIL"); n != all {
		t.Errorf("%d coloured words of %d", n, all)
	}
	if got := regexp.MustCompile(`\x1b\[[0-9;]*m`).ReplaceAllString(out.String(), ""); got != plain {
		t.Errorf("without its colours:\n%s\nplain:\n%s", got, plain)
	}
}

// The columns of a table start where their headings do, whatever letters
// stand before them.
func TestColumnsLineUp(t *testing.T) {
	p := &page{}
	p.table([][]string{{"limit", "found"}, {"µ − ζ ≤ é", "1 mm"}, {"x", "2 mm"}}, []string{"PASS", "FAIL"})
	want := "\n        limit      found\n  PASS  µ − ζ ≤ é  1 mm\n  FAIL  x          2 mm\n"
	if p.String() != want {
		t.Errorf("got\n%s\nwant\n%s", p.String(), want)
	}
}

func TestFigures(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{Share(0.00935), "0.935 %"}, {Share(0.1356), "13.6 %"}, {Share(2.71), "271 %"}, {Share(-0.000464), "-0.0464 %"},
		{Share(0), "0 %"}, {Share(1.6e-14), "< 0.001 %"}, {Share(-1.6e-14), "< 0.001 %"}, {Share(12345), "1.23e+06 %"}, {Share(nan), "–"},
		{Share(0.05), "5.00 %"}, {Share(1), "100 %"},
		{Amplitude(0.99798), "99.80 %"}, {Amplitude(1.02), "102.00 %"}, {Amplitude(nan), "–"}, {Amplitude(12345), "1.23e+06 %"},
		{Margin(0.9731), "97.3 %"}, {Margin(-1.2), "-120.0 %"}, {Margin(-1e6), "< -1000 %"}, {Margin(50), "> 1000 %"}, {Margin(nan), "–"},
		{Late(0.013988), "13.988 ms late"}, {Late(-0.00007946), "0.079 ms early"}, {Late(4e-6), "0.004 ms late"},
		{Late(4e-7), "0.000 ms"}, {Late(-4e-7), "0.000 ms"}, {Late(0), "0.000 ms"}, {Late(0.4058), "405.800 ms late"}, {Late(nan), "–"},
		{within(0.02439, quantity.Length, &kind.Value{Num: 0.15}), "24.39 mm of 150 mm"}, {within(1.5e5, quantity.Force, nil), "150.0 kN"},
		{strings.Join(sameUnit(64120, 0.0001, -1, nan), " "), "64.12 kJ 0.00 kJ 0.00 kJ –"},
		{strings.Join(sameUnit(890.04, -2.166), " "), "890.0 J -2.2 J"}, {strings.Join(sameUnit(0, 0), " "), "0.000 J 0.000 J"},
		{strings.Join(sameUnit(2.5e13, 1), " "), "2.500e+07 MJ 0 MJ"}, {strings.Join(sameUnit(0.0012), " "), "0.001200 J"},
	} {
		if c.got != c.want {
			t.Errorf("got %q, want %q", c.got, c.want)
		}
	}
}

// The room agrees with the verdict even where found and limit look alike.
func TestRoom(t *testing.T) {
	for _, c := range []struct {
		limit string
		want  float64
		got   rtloop.Figure
		text  string
	}{
		{"nrmse", 0.05, 0.00935, "81 % left"},
		{"nrmse", 0.05, 0.05, "0 % left"},
		{"nrmse", 0.05, 0.04999, "0.02 % left"},
		{"nrmse", 0.05, 0.05001, "0.02 % over"},
		{"nrmse", 0.05, 0.0662, "32 % over"},
		{"nrmse", 0.05, 0.1356, "2.71 times the limit"},
		{"nrmse", 0.05, 12345.6, "246912 times the limit"},
		{"nrmse", 0.05, 12345678, "2.47e+08 times the limit"},
		{"nrmse", 0.05, nan, "not defined"},
		{"nrmse", 0, 0, "none"},
		{"nrmse", 0, 0.1, "over"},
		{"delay", 0.001, -0.0004, "60 % left"},
		{"delay", 0.001, -0.0014, "40 % over"},
		{"energy_margin", 0.3, 0.9731, "67 % above"},
		{"energy_margin", 0.3, 0.3, "0 % above"},
		{"energy_margin", 0.3, 0.2996, "0.04 % below"},
		{"energy_margin", 0.3, -0.122, "42 % below"},
		{"energy_margin", 0.3, -1e6, "far below"},
		{"energy_margin", 0.3, nan, "not defined"},
	} {
		lane := judge(rtloop.LaneResult{Channels: []rtloop.ChannelResult{{NRMSE: c.got, Delay: c.got}}, Energy: rtloop.EnergyResult{MarginMin: c.got}},
			kind.Values{c.limit: kind.Num(c.want)})
		if got := lane.Accept[0].room(); got != c.text {
			t.Errorf("%s %v against %v: got %q, want %q", c.limit, c.got, c.want, got, c.text)
		}
		if bad := regexp.MustCompile("over|times|below|not").MatchString(c.text); bad == lane.Accept[0].Pass {
			t.Errorf("%s %v against %v passes: %v", c.limit, c.got, c.want, lane.Accept[0].Pass)
		}
	}
}

type brokenPipe struct{}

func (brokenPipe) Write([]byte) (int, error) { return 0, os.ErrClosed }

func TestWriteTextSaysItsError(t *testing.T) {
	if err := verdicts()["pass"].WriteText(brokenPipe{}, false); err != os.ErrClosed {
		t.Errorf("got %v", err)
	}
}
