package tune

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"antelag/scenarios"
	"antelag/scenarios/study"
)

// frame is a one-storey test of two seconds with two settings of its compensator
// far from where they should be.
const frame = `
title = "one storey, a spring as specimen (invented)"
[loop]
rate = "256 Hz"
duration = "1 s"
[substructure]
damping_ratio = 0.05
[[substructure.storey]]
mass = "50 t"
stiffness = "4 kN/mm"
[excitation]
kind = "sine"
drives = "ground"
amplitude = "0.05 g"
frequency = "1.2 Hz"
[[channel]]
name = "spring"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "4 ms"
gain = 0.95
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "model-inverse"
delay = "4 ms"
lag = "4 ms"
gain = 1.0
[channel.limits]
velocity = "1 m/s"
[[lane]]
name = "fit"
[lane.compensator]
kind = "polynomial"
order = 2
delay = "6 ms"
[accept]
nrmse = 0.08
energy_margin = 0.2
[spread]
"spring.actuator.delay" = 0.3
"spring.actuator.gain" = [0.92, 0.98]
`

func scene(t testing.TB, changes ...scenarios.Change) *scenarios.Scenario {
	t.Helper()
	s, err := scenarios.Parse("frame.toml", []byte(frame), ".", changes...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

const (
	delays = "spring.compensator.delay=1 ms:30 ms"
	gains  = "spring.compensator.gain=0.6:1.4"
	orders = "lane.fit.compensator.order=1:4"
)

func problem(t testing.TB, s *scenarios.Scenario, o Options) *Problem {
	t.Helper()
	if o.Limits == (Limits{}) {
		o.Limits = NoLimits
	}
	p, err := New(s, o)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func search(t testing.TB, p *Problem, r *Record) *Result {
	t.Helper()
	res, err := p.Search(context.Background(), r)
	if err != nil {
		t.Fatal(err)
	}
	return res
}

func TestOptionsThatCannotBe(t *testing.T) {
	for _, c := range []struct {
		name string
		o    Options
		want string
	}{
		{"nothing", Options{}, "nothing is tuned; say which settings and how far, like --over 'spring.compensator.gain"},
		{"unknown setting", Options{Over: []string{"spring.compensator.dely=1 ms:2 ms"}}, `did you mean "delay"?`},
		{"twice", Options{Over: []string{delays, "channel[0].compensator.delay=1 ms:2 ms"}}, "is tuned twice"},
		{"drawn", Options{Over: []string{"spring.actuator.delay=1 ms:2 ms"}}, "stands in [spread]: it is not known"},
		{"a word", Options{Over: []string{"loop.hold=1:2"}}, "is not a single number"},
		{"not set", Options{Over: []string{"loop.energy_window=1 s:2 s"}}, "is not set in the scenario"},
		{"figure", Options{Over: []string{delays}, Figure: "nrsme"}, `did you mean "nrmse"?`},
		{"quantile", Options{Over: []string{delays}, Quantile: 0.2}, "a quantile of 0.2; allowed is 0.5 to 1"},
		{"draws", Options{Over: []string{delays}, Draws: -1}, "-1 draws; allowed is 0 to 10000"},
		{"runs", Options{Over: []string{delays}, Draws: 4, Runs: 20}, "20 runs are too few; with 9 variations of each setting it takes at least 28"},
		{"lane", Options{Over: []string{delays}, Lane: "fat"}, `did you mean "fit"?`},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := New(scene(t), c.o); err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%v", err)
			}
		})
	}
}

// brute is the best figure on a grid of all settings, of candidates that pass.
func brute(t testing.TB, p *Problem, n int) float64 {
	t.Helper()
	best := math.Inf(1)
	places := make(chan struct{}, 2)
	total := 1
	for range p.Ranges {
		total *= n
	}
	for i := range total {
		values, k := make([]float64, len(p.Ranges)), i
		for d := range values {
			values[d] = p.Ranges[d].At(float64(k%n) / float64(n-1))
			k /= n
		}
		c, err := (&job{p, values, p.variations}).evaluate(context.Background(), places, 2)
		if err != nil {
			t.Fatal(err)
		}
		if p.Pass(c) {
			best = min(best, p.Column.Bad(c.Figure))
		}
	}
	return best
}

// The best is within 5 % of the best on a fine grid, in the worst case, in a
// quantile and without draws, of one setting and of two.
func TestSearchFindsWhatAGridFinds(t *testing.T) {
	for _, c := range []struct {
		name string
		o    Options
		grid int
	}{
		{"one setting, no draws", Options{Over: []string{delays}}, 59},
		{"one setting, worst case", Options{Over: []string{delays}, Draws: 4}, 30},
		{"one setting, quantile, normal", Options{Over: []string{delays + ":log"}, Draws: 12, Quantile: 0.9, Law: study.Normal}, 30},
		{"two settings, worst case", Options{Over: []string{delays, gains}, Draws: 2}, 15},
		{"of a lane", Options{Over: []string{"lane.fit.compensator.delay=1 ms:30 ms"}, Lane: "fit", Draws: 3}, 30},
		{"another figure", Options{Over: []string{delays}, Draws: 4, Figure: "peak_error"}, 30},
		{"a margin", Options{Over: []string{delays}, Draws: 4, Figure: "energy_margin"}, 30},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			p := problem(t, scene(t), c.o)
			r := search(t, p, nil)
			grid := brute(t, p, c.grid)
			if !r.Pass() || p.Column.Bad(r.Best.Figure) > grid+0.05*math.Abs(grid) {
				t.Errorf("found %v at %v, pass %v; the grid %v", r.Best.Figure, r.Best.Values, r.Pass(), grid)
			}
			if r.Cut || r.Stands != nil {
				t.Errorf("cut %v, %v stands in the way", r.Cut, r.Stands)
			}
		})
	}
}

// Whole numbers, if few, are all tried.
func TestWholeNumbersAreAllTried(t *testing.T) {
	p := problem(t, scene(t), Options{Over: []string{orders}, Lane: "fit", Draws: 3})
	r := search(t, p, nil)
	if len(r.All) != 4 || r.Best.Figure > 1.01*r.All[0].Figure {
		t.Errorf("%d tried", len(r.All))
	}
	mixed := problem(t, scene(t), Options{Over: []string{orders, "lane.fit.compensator.delay=1 ms:30 ms"}, Lane: "fit", Draws: 3})
	for _, c := range search(t, mixed, nil).All {
		if c.Values[0] != math.Trunc(c.Values[0]) {
			t.Errorf("order %v", c.Values[0])
		}
	}
}

func said(t *testing.T, r *Result) string {
	t.Helper()
	r.Wall = 0
	var b strings.Builder
	if err := r.WriteText(&b, false); err != nil {
		t.Fatal(err)
	}
	text, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	return b.String() + string(text)
}

// For a seed the result is the same to the last digit with any number of workers;
// another seed searches otherwise.
func TestSearchIsTheSameForAnyWorkers(t *testing.T) {
	var first string
	for i, workers := range []int{1, 2, 7} {
		p := problem(t, scene(t), Options{Over: []string{delays, gains}, Draws: 5, Seed: 3, Workers: workers})
		if r := said(t, search(t, p, nil)); i == 0 {
			first = r
		} else if r != first {
			t.Errorf("%d workers\n%s\none\n%s", workers, r, first)
		}
	}
	if other := said(t, search(t, problem(t, scene(t), Options{Over: []string{delays, gains}, Draws: 5, Seed: 4}), nil)); other == first {
		t.Error("another seed comes to the same")
	}
}

// The runs of the best are those of study: the worst case is found again by the
// draws and the corners, to the bit.
func TestTheWorstCaseIsThatOfStudy(t *testing.T) {
	p := problem(t, scene(t), Options{Over: []string{delays}, Draws: 9, Seed: 2})
	r := search(t, p, nil)
	tuned, err := p.Tuned(r.Best)
	if err != nil {
		t.Fatal(err)
	}
	worst := math.Inf(-1)
	for _, q := range []study.Request{p.Study.Request, p.Corners.Request, {Over: []string{"loop.seed=1:1:1"}}} {
		st, err := study.New(tuned, q)
		if err != nil {
			t.Fatal(err)
		}
		sum := study.NewSummary(st)
		if err := st.Run(context.Background(), 0, st.Runs(), study.Options{}, func(rows []study.Row) error {
			for _, row := range rows {
				sum.Add(row)
			}
			return nil
		}); err != nil {
			t.Fatal(err)
		}
		worst = max(worst, sum.Main().Worst.Value)
	}
	if worst != r.Best.Figure {
		t.Errorf("tuned to %v, study finds %v", r.Best.Figure, worst)
	}
}

// A search that is broken off and gone on with comes to what it would have come to
// and tries nothing twice.
func TestSearchIsGoneOnWith(t *testing.T) {
	o := Options{Over: []string{delays, gains}, Draws: 4, Seed: 1, Workers: 2}
	whole := search(t, problem(t, scene(t), o), nil)
	path := filepath.Join(t.TempDir(), "r.csv")
	made := int64(0)
	for rounds := 0; ; rounds++ {
		p := problem(t, scene(t), o)
		record, err := p.OpenRecord(path, "test", false)
		if err != nil {
			t.Fatal(err)
		}
		ctx, cancel := context.WithCancel(context.Background())
		p.Progress = func(done, of int64) {
			if done > 120 {
				cancel()
			}
		}
		r, err := p.Search(ctx, record)
		cancel()
		if err != nil && !errors.Is(err, ErrNothingRan) {
			t.Fatal(err)
		}
		if err := record.Close(); err != nil {
			t.Fatal(err)
		}
		made += r.Runs
		if !r.Cut {
			r.Runs, r.Wall = whole.Runs, whole.Wall
			if a, b := said(t, r), said(t, whole); a != b {
				t.Errorf("gone on with\n%s\nwhole\n%s", a, b)
			}
			if made != whole.Runs || rounds == 0 {
				t.Errorf("%d runs in %d rounds, %d at once", made, rounds+1, whole.Runs)
			}
			return
		}
		// As if it had been killed within a row.
		if rounds == 0 {
			text, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(path, text[:len(text)-3], 0o644); err != nil {
				t.Fatal(err)
			}
			made -= lastRuns(t, p, string(text))
		}
		if rounds > 50 {
			t.Fatal("it does not get on")
		}
	}
}

// lastRuns is how many runs the last row of a record took.
func lastRuns(t *testing.T, p *Problem, text string) int64 {
	t.Helper()
	lines := strings.Split(strings.TrimSpace(text), "\n")
	c, err := p.parse(lines[len(lines)-1])
	if err != nil {
		t.Fatal(err)
	}
	return int64(c.Judged + 1)
}

func TestRecordsOfOtherProblemsAreRefused(t *testing.T) {
	path := filepath.Join(t.TempDir(), "r.csv")
	good := Options{Over: []string{delays}, Draws: 4, Runs: 60}
	p := problem(t, scene(t), good)
	record, err := p.OpenRecord(path, "test", false)
	if err != nil {
		t.Fatal(err)
	}
	search(t, p, record)
	record.Close() //nolint:errcheck // every row is out
	for name, o := range map[string]Options{
		"draws = 5":        {Over: []string{delays}, Draws: 5},
		"figure = 'nrmse'": {Over: []string{delays}, Draws: 4, Figure: "nrmse"},
		"quantile = 0.9":   {Over: []string{delays}, Draws: 4, Quantile: 0.9},
		"seed = 2":         {Over: []string{delays}, Draws: 4, Seed: 2},
	} {
		if _, err := problem(t, scene(t), o).OpenRecord(path, "test", false); !errors.Is(err, study.ErrMismatch) || !strings.Contains(err.Error(), "here "+name) {
			t.Errorf("%s: %v", name, err)
		}
	}
	// Limits and budget change nothing of what was measured.
	o := good
	o.Runs, o.Limits = 0, NoLimits
	o.Limits.NoiseGain = 3
	again, err := problem(t, scene(t), o).OpenRecord(path, "test", false)
	if err != nil {
		t.Fatal(err)
	}
	again.Close() //nolint:errcheck // nothing was written
}

// Where no setting passes, the limit that cannot be met is named, and so are
// limits of which each can be met, but not all.
func TestWhatStandsInTheWay(t *testing.T) {
	limits := NoLimits
	limits.CommandVelocity = 0.01
	r := search(t, problem(t, scene(t), Options{Over: []string{delays}, Draws: 2, Limits: limits}), nil)
	if r.Pass() || len(r.Stands) != 1 || r.Stands[0].Ever || r.Problem.Measures[r.Stands[0].Measure].Name != "command_velocity_m_s" {
		t.Errorf("%+v", r.Stands)
	}
	if text := said(t, r); !strings.Contains(text, "no setting passes") || !strings.Contains(text, "command velocity, all runs: ") || !strings.Contains(text, "no setting tried does better than") {
		t.Errorf("printed\n%s", text)
	}
	limits = NoLimits
	limits.NoiseGain = 1.05 // as with no compensation at all; then tracking fails
	s := scene(t, scenarios.Change{Path: "accept.nrmse", Value: "0.06"})
	r = search(t, problem(t, s, Options{Over: []string{"spring.compensator.delay=0 ms:30 ms", "spring.compensator.lag=0 ms:10 ms"}, Limits: limits}), nil)
	if r.Pass() || len(r.Stands) == 0 || !slices.ContainsFunc(r.Stands, func(o Obstacle) bool { return o.Ever }) {
		t.Errorf("%+v", r.Stands)
	}
}

// A budget of runs is kept, one of time ends the search, and what there is is told.
func TestBudgets(t *testing.T) {
	for _, runs := range []int64{60, 150, 300} {
		r := search(t, problem(t, scene(t), Options{Over: []string{delays, gains}, Draws: 6, Runs: runs}), nil)
		if r.Runs > runs || r.Cut || r.Best == nil {
			t.Errorf("%d runs of %d", r.Runs, runs)
		}
	}
	p := problem(t, scene(t, scenarios.Change{Path: "loop.duration", Value: "1 d"}), Options{Over: []string{delays}, Time: 20 * time.Millisecond})
	if r, err := p.Search(context.Background(), nil); !errors.Is(err, ErrNothingRan) || !r.Cut {
		t.Errorf("%v", err)
	}
}

// A candidate that cannot be built is the worst there is, and no error.
func TestCandidatesThatCannotBeBuilt(t *testing.T) {
	s := scene(t, scenarios.Change{Path: "spring.compensator.kind", Value: "adaptive-inverse"})
	p := problem(t, s, Options{Over: []string{"spring.compensator.delay_min=0 ms:100 ms"}, Draws: 2})
	r := search(t, p, nil)
	if r.Best.Refused != "" {
		t.Errorf("best: %s", r.Best.Refused)
	}
	refused := 0
	for _, c := range r.All {
		if c.Refused != "" {
			refused++
			if back, err := p.parse(p.line(c)); err != nil || back.Refused == "" {
				t.Errorf("%v", err)
			}
		}
	}
	t.Logf("%d refused", refused)
}

// The written scenario reads as the tuned one.
func TestTunedReadsBack(t *testing.T) {
	p := problem(t, scene(t), Options{Over: []string{delays}, Draws: 2, Runs: 60})
	r := search(t, p, nil)
	s, err := p.Tuned(r.Best)
	if err != nil {
		t.Fatal(err)
	}
	back, err := scenarios.Parse("back.toml", []byte(s.Resolved()), ".")
	if err != nil {
		t.Fatal(err)
	}
	at, err := back.Locate("spring.compensator.delay")
	if err != nil || at.Values.Num("delay") != r.Best.Values[0] {
		t.Errorf("%v, %v", at.Values, err)
	}
}

func FuzzRecordLine(f *testing.F) {
	p := problem(f, scene(f), Options{Over: []string{delays}, Draws: 2})
	f.Add("0.007,2,0.05,1,0.9,0.27,10.4,0.06,")
	f.Add("0.007,2,,0.5,,,inf,,no such test")
	f.Fuzz(func(t *testing.T, line string) {
		c, err := p.parse(line)
		if err == nil && (p.line(c) != line || len(c.Values) != 1 || len(c.Measured) != len(p.Measures)) {
			t.Errorf("%q reads as %+v", line, c)
		}
	})
}
