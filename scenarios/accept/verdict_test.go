package accept

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var nan = rtloop.Figure(math.NaN())

// one is a completed lane of one channel, good in every respect.
func one() rtloop.LaneResult {
	return rtloop.LaneResult{
		Name: "configured", Outcome: rtloop.Completed, ResponseError: 0.02,
		Channels: []rtloop.ChannelResult{{Name: "a", Compensator: "none", NRMSE: 0.01, Delay: 0.0002, PeakError: 0.001}},
		Energy:   rtloop.EnergyResult{MarginMin: 0.8},
	}
}

func TestJudge(t *testing.T) {
	inf := rtloop.Figure(math.Inf(1))
	for _, c := range []struct {
		name   string
		change func(*rtloop.LaneResult)
		limit  string
		want   float64
		pass   bool
	}{
		{"nrmse below", func(*rtloop.LaneResult) {}, "nrmse", 0.05, true},
		{"nrmse at the limit", func(*rtloop.LaneResult) {}, "nrmse", 0.01, true},
		{"nrmse above", func(*rtloop.LaneResult) {}, "nrmse", 0.0099, false},
		{"nrmse undefined", func(r *rtloop.LaneResult) { r.Channels[0].NRMSE = nan }, "nrmse", 10, false},
		{"nrmse infinite", func(r *rtloop.LaneResult) { r.Channels[0].NRMSE = inf }, "nrmse", 10, false},
		{"delay late", func(*rtloop.LaneResult) {}, "delay", 0.001, true},
		{"delay too late", func(*rtloop.LaneResult) {}, "delay", 0.0001, false},
		{"delay early", func(r *rtloop.LaneResult) { r.Channels[0].Delay = -0.0005 }, "delay", 0.001, true},
		{"delay too early", func(r *rtloop.LaneResult) { r.Channels[0].Delay = -0.002 }, "delay", 0.001, false},
		{"delay at the limit, early", func(r *rtloop.LaneResult) { r.Channels[0].Delay = -0.001 }, "delay", 0.001, true},
		{"delay undefined", func(r *rtloop.LaneResult) { r.Channels[0].Delay = nan }, "delay", 1, false},
		{"peak error below", func(*rtloop.LaneResult) {}, "peak_error", 0.003, true},
		{"peak error above", func(*rtloop.LaneResult) {}, "peak_error", 0.0003, false},
		{"margin above", func(*rtloop.LaneResult) {}, "energy_margin", 0.3, true},
		{"margin at the limit", func(*rtloop.LaneResult) {}, "energy_margin", 0.8, true},
		{"margin below", func(*rtloop.LaneResult) {}, "energy_margin", 0.9, false},
		{"margin negative", func(r *rtloop.LaneResult) { r.Energy.MarginMin = -0.5 }, "energy_margin", 0.3, false},
		{"margin negative but wanted", func(r *rtloop.LaneResult) { r.Energy.MarginMin = -0.5 }, "energy_margin", -1, true},
		{"margin more than all", func(r *rtloop.LaneResult) { r.Energy.MarginMin = 1.2 }, "energy_margin", 1, true},
		{"margin undefined", func(r *rtloop.LaneResult) { r.Energy.MarginMin = nan }, "energy_margin", -10, false},
		{"response below", func(*rtloop.LaneResult) {}, "response_error", 0.1, true},
		{"response above", func(*rtloop.LaneResult) {}, "response_error", 0.01, false},
		{"response undefined", func(r *rtloop.LaneResult) { r.ResponseError = nan }, "response_error", 10, false},
		{"spectrum below", func(r *rtloop.LaneResult) { r.Channels[0].SpectrumError = 0.04 }, "spectrum_error", 0.05, true},
		{"spectrum above", func(r *rtloop.LaneResult) { r.Channels[0].SpectrumError = 0.06 }, "spectrum_error", 0.05, false},
		{"spectrum undefined", func(r *rtloop.LaneResult) { r.Channels[0].SpectrumError = nan }, "spectrum_error", 10, false},
		{"good figures of a tripped lane", func(r *rtloop.LaneResult) { r.Outcome = rtloop.Tripped }, "nrmse", 0.05, true},
		{"good figures of an interrupted lane", func(r *rtloop.LaneResult) { r.Outcome = rtloop.Interrupted }, "nrmse", 0.05, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := one()
			c.change(&r)
			lane := judge(r, kind.Values{c.limit: kind.Num(c.want)})
			if len(lane.Accept) != 1 {
				t.Fatalf("%d judgements", len(lane.Accept))
			}
			j := lane.Accept[0]
			if j.Limit != c.limit || j.Want != c.want || j.Pass != c.pass {
				t.Errorf("%+v", j)
			}
			if want := c.pass && r.Outcome == rtloop.Completed; lane.Pass != want {
				t.Errorf("the lane passes: %v", lane.Pass)
			}
		})
	}
}

// Limits are judged in a fixed order, all of them; one that fails is enough.
func TestJudgeAll(t *testing.T) {
	limits := kind.Values{"response_error": kind.Num(0.1), "nrmse": kind.Num(0.05), "energy_margin": kind.Num(0.3), "peak_error": kind.Num(0.003), "delay": kind.Num(0.0001)}
	lane := judge(one(), limits)
	var names []string
	for _, j := range lane.Accept {
		names = append(names, j.Limit)
		if j.Pass == (j.Limit == "delay") {
			t.Errorf("%+v", j)
		}
	}
	if got := strings.Join(names, " "); got != "nrmse delay peak_error energy_margin response_error" || lane.Pass {
		t.Errorf("%s; pass %v", got, lane.Pass)
	}
	if lane := judge(one(), nil); !lane.Pass || lane.Accept == nil || len(lane.Accept) != 0 {
		t.Errorf("without limits: %+v", lane)
	}
}

// No limit that a scenario can set goes unjudged or unnamed.
func TestEveryLimitIsJudged(t *testing.T) {
	for _, section := range scenarios.Sections() {
		if section.Name != "accept" {
			continue
		}
		for _, s := range section.Settings {
			lane := judge(one(), kind.Values{s.Name: kind.Num(0)})
			if len(lane.Accept) != 1 || lane.Accept[0].Limit != s.Name || labels[s.Name] == "" || lane.Accept[0].Dim != s.Dim {
				t.Errorf("%s: %+v, label %q", s.Name, lane.Accept, labels[s.Name])
			}
		}
		if len(section.Settings) != len(limitNames) || len(labels) != len(limitNames) {
			t.Errorf("%d settings, %d limits, %d labels", len(section.Settings), len(limitNames), len(labels))
		}
	}
}

func TestWorstChannel(t *testing.T) {
	channel := func(name string, delay rtloop.Figure) rtloop.ChannelResult {
		return rtloop.ChannelResult{Name: name, Delay: delay}
	}
	for _, c := range []struct {
		name     string
		channels []rtloop.ChannelResult
		channel  string
		got      rtloop.Figure
	}{
		{"the latest", []rtloop.ChannelResult{channel("a", 0.001), channel("b", 0.003), channel("c", 0.002)}, "b", 0.003},
		{"early counts like late, with its sign", []rtloop.ChannelResult{channel("a", 0.001), channel("b", -0.003)}, "b", -0.003},
		{"first of equals", []rtloop.ChannelResult{channel("a", -0.001), channel("b", 0.001)}, "a", -0.001},
		{"undefined is worst, last", []rtloop.ChannelResult{channel("a", 0.9), channel("b", nan)}, "b", nan},
		{"undefined is worst, first", []rtloop.ChannelResult{channel("a", nan), channel("b", 0.9)}, "a", nan},
		{"none", nil, "", 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			j := measure(rtloop.LaneResult{Channels: c.channels}, "delay")
			if j.Channel != c.channel || j.Got != c.got && (j.Got.Defined() || c.got.Defined()) || j.Dim != quantity.Time {
				t.Errorf("%+v", j)
			}
		})
	}
}

func TestRank(t *testing.T) {
	lane := func(name string, change func(*Lane)) Lane {
		l := Lane{LaneResult: one(), Pass: true}
		l.Name = name
		change(&l)
		return l
	}
	trip := func(at float64) func(*Lane) {
		return func(l *Lane) {
			l.Outcome, l.Trip, l.Pass, l.ResponseError = rtloop.Tripped, &rtloop.Trip{Time: at}, false, 0.0001
		}
	}
	lanes := []Lane{
		lane("tripped early", trip(2)),
		lane("fails, worse", func(l *Lane) { l.Pass, l.ResponseError = false, 0.3 }),
		lane("passes", func(*Lane) {}),
		lane("tripped late", trip(9)),
		lane("fails, response undefined, tracks well", func(l *Lane) { l.Pass, l.ResponseError, l.Channels[0].NRMSE = false, nan, 0.0001 }),
		lane("passes as well", func(*Lane) {}),
		lane("fails, nothing defined", func(l *Lane) {
			l.Pass, l.ResponseError = false, nan
			l.Channels = []rtloop.ChannelResult{{NRMSE: nan}}
		}),
		lane("passes best", func(l *Lane) { l.ResponseError = 0.001 }),
		lane("fails, better", func(l *Lane) { l.Pass, l.ResponseError = false, 0.2 }),
	}
	var got []string
	for _, l := range Rank(lanes) {
		got = append(got, l.Name)
	}
	want := []string{"passes best", "passes", "passes as well", "fails, response undefined, tracks well", "fails, better", "fails, worse",
		"fails, nothing defined", "tripped late", "tripped early"}
	if strings.Join(got, "; ") != strings.Join(want, "; ") {
		t.Errorf("got  %s\nwant %s", strings.Join(got, "; "), strings.Join(want, "; "))
	}
	if lanes[0].Name != "tripped early" {
		t.Error("Rank has sorted what it was given")
	}
}

func load(t *testing.T, name string, changes ...scenarios.Change) *scenarios.Scenario {
	t.Helper()
	s, err := scenarios.Load(name, changes...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestRun(t *testing.T) {
	s := load(t, "archive", scenarios.Change{Path: "loop.duration", Value: "2 s"}, scenarios.Change{Path: "loop.slowdown", Value: "2"})
	rows, last := 0, int64(0)
	v, err := Run(context.Background(), s, Options{
		Observe: func(lane string) func(*rtloop.Loop) error {
			if lane != "inverse" {
				return nil
			}
			return func(*rtloop.Loop) error { rows++; return nil }
		},
		Progress: func(done, of int64) {
			if done <= last || done > of || of != 8192 {
				t.Errorf("progress %d of %d after %d", done, of, last)
			}
			last = done
		},
	})
	if err != nil {
		t.Fatal(err)
	}
	if rows != 8193 || last != 8192 {
		t.Errorf("%d rows, %d ticks", rows, last)
	}
	if v.Scenario != "archive" || v.Ticks != 8192 || v.Rate != 2048 || v.Slowdown != 2 || v.Step != 1.0/4096 || v.Time != 2 ||
		v.Scene != s || v.Drive != quantity.Acceleration || v.Compute.Wall <= 0 || v.Compute.NsPerTick != v.Compute.Wall*1e9/8192 {
		t.Errorf("%+v", v)
	}
	if len(v.Lanes) != 2 || v.Lanes[0].Name != "configured" || v.Lanes[1].Name != "inverse" || v.Lanes[0].Ran != 2 || len(v.Lanes[1].Accept) != 5 {
		t.Errorf("%+v", v.Lanes)
	}
}

func TestRunInterrupted(t *testing.T) {
	s := load(t, "archive")
	ctx, cancel := context.WithCancel(context.Background())
	v, err := Run(ctx, s, Options{Progress: func(done, _ int64) {
		if done > 4000 {
			cancel()
		}
	}})
	if err != nil {
		t.Fatal(err)
	}
	l := v.Lanes[0]
	if l.Outcome != rtloop.Interrupted || v.Pass() || l.Ran < 1.9 || l.Ran > 2.1 || v.Compute.NsPerTick < v.Compute.Wall*1e9/5000 {
		t.Errorf("outcome %v after %g s, %+v", l.Outcome, l.Ran, v.Compute)
	}
	if v, err = Run(ctx, s, Options{}); err != nil || v.Lanes[0].Outcome != rtloop.Interrupted || v.Lanes[0].Ran != 0 {
		t.Errorf("interrupted before it began: %v, %v", v, err)
	}
}

// A log that cannot be written ends its lane; there is a verdict and the error.
func TestRunObserverFails(t *testing.T) {
	full := errors.New("disk full")
	v, err := Run(context.Background(), load(t, "archive", scenarios.Change{Path: "loop.duration", Value: "1 s"}), Options{
		Observe: func(lane string) func(*rtloop.Loop) error {
			if lane != scenarios.Configured {
				return nil
			}
			return func(l *rtloop.Loop) error {
				if l.Ticks() == 100 {
					return full
				}
				return nil
			}
		},
	})
	if !errors.Is(err, full) || v == nil || v.Pass() || v.Lanes[0].Outcome != rtloop.Interrupted || v.Lanes[0].Ran != 100.0/2048 {
		t.Fatalf("%v, %+v", err, v)
	}
}

func TestRunBadScenario(t *testing.T) {
	text, err := scenarios.Text("archive")
	if err != nil {
		t.Fatal(err)
	}
	bad := strings.Replace(string(text), "kind = \"filtered-noise\"\n", "kind = \"record\"\nfile = \"nowhere.txt\"\n", 1)
	for _, line := range []string{"peak = \"0.3 g\"\n", "ground_frequency = \"2.5 Hz\"\n", "ground_damping = 0.6\n", "rise = \"3 s\"\n", "strong = \"10 s\"\n", "decay = \"9 s\"\n"} {
		bad = strings.Replace(bad, line, "", 1)
	}
	s, err := scenarios.Parse("x.toml", []byte(bad), t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	if v, err := Run(context.Background(), s, Options{}); v != nil || err == nil || !strings.Contains(err.Error(), "nowhere.txt") {
		t.Errorf("%v, %v", v, err)
	}
}
