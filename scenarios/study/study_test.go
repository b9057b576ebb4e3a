package study

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"strings"
	"testing"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

func TestRequestsThatCannotBe(t *testing.T) {
	none := strings.Split(short, "[spread]")[0]
	for _, c := range []struct {
		name, scenario string
		r              Request
		want           string
	}{
		{"nothing varies", short, Request{}, "nothing varies"},
		{"no spread", none, Request{Draws: 3}, "has no [spread] to draw from"},
		{"draws below none", short, Request{Draws: -3}, "-3 draws are none"},
		{"too many draws", short, Request{Draws: 2e9}, "more than 1e+09 runs"},
		{"too many points", short, Request{Over: []string{"loop.seed=1:100000:100000", "spring.actuator.gain=0.9:1.1:100000"}}, "more than 1e+09 points"},
		{"twice", short, Request{Over: []string{"spring.actuator.gain=0.9:1.1:2", "channel[0].actuator.gain=0.9:1.1:2"}}, "is varied twice"},
		{"drawn and gone over", short, Request{Draws: 2, Over: []string{"channel[0].actuator.delay=1 ms:2 ms:2"}}, "stands in [spread] too"},
		{"unknown lane", short, Request{Draws: 2, Lane: "bear"}, `unknown lane "bear"; did you mean "bare"?`},
		{"gone over though in spread", short, Request{Over: []string{"spring.actuator.delay=1 ms:2 ms:2"}}, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := New(scene(t, c.scenario), c.r)
			says(t, err, c.want)
		})
	}
}

// The last axis of a grid goes fastest, draws faster still, the same ones at
// every point.
func TestOrderOfRuns(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Over: []string{"spring.compensator.order=1:2:2", "spring.actuator.gain=0.9:1.1:3"}, Draws: 2})
	if st.Runs() != 12 || st.Points() != 6 {
		t.Fatalf("%d runs at %d points", st.Runs(), st.Points())
	}
	for i := range st.Runs() {
		v := st.Values(nil, i)
		point := i / 2
		want := []float64{float64(1 + point/3), st.Grid[1].At(int(point % 3))}
		draw := st.Values(nil, i%2)[2:]
		if v[0] != want[0] || v[1] != want[1] || v[2] != draw[0] || v[3] != draw[1] {
			t.Errorf("run %d: %v", i, v)
		}
	}
}

// Rows are the same to the bit for any number of workers, and each is what run
// comes to with the settings that the study names.
func TestRowsAreThoseOfSingleRuns(t *testing.T) {
	for _, lane := range []string{scenarios.Configured, "bare"} {
		st := studyOf(t, scene(t, short), Request{Lane: lane, Over: []string{"spring.compensator.delay=4 ms:20 ms:3"}, Draws: 9, Seed: 5})
		rows := all(t, st, 1)
		for workers := 2; workers < 6; workers++ {
			if other := all(t, st, workers); table(st, other) != table(st, rows) {
				t.Fatalf("rows differ with %d workers", workers)
			}
		}
		for i, r := range rows {
			v, err := accept.Run(context.Background(), scene(t, short, st.Changes(int64(i))...), accept.Options{})
			if err != nil {
				t.Fatal(err)
			}
			l := &v.Lanes[0]
			if lane != scenarios.Configured {
				l = &v.Lanes[1]
			}
			alone := st.row(int64(i), &Judged{Lane: *l})
			if table(st, []Row{alone}) != table(st, []Row{r}) {
				t.Fatalf("lane %s, run %d\nin the study %v\nalone        %v", lane, i, r, alone)
			}
		}
	}
}

func table(st *Study, rows []Row) string {
	var b []byte
	for i := range rows {
		b = st.appendRow(b, &rows[i])
	}
	return string(b)
}

// A spread of gain about an actuator without lag: y = g·x, so that over the
// amplitude A peak error is |g−1|·A and nrmse |g−1|. Of n draws of a Latin
// hypercube, uniform on [1, 1.2], the k-th smallest lies in the k-th nth of the
// spread, so quantiles are those of the law to 1/n of the spread; bins of the
// summary add 1/8000 of the value.
func TestSpreadOfALinearCase(t *testing.T) {
	const n = 400
	for _, law := range Laws {
		st := studyOf(t, scene(t, tracking), Request{Draws: n, Law: law, Seed: 11})
		s := summed(st, all(t, st, 2))
		if s.Runs != n || s.Outcomes[completed] != n {
			t.Fatalf("%d runs, %v", s.Runs, s.Outcomes)
		}
		for _, f := range s.Figures {
			scale, ok := map[string]float64{"nrmse": 1, "peak_error": 0.01}[f.Column.Figure]
			if !ok {
				continue
			}
			for _, q := range []float64{0.05, 0.5, 0.9, 0.95, 0.99} {
				// Between the quantiles of the part's two ends.
				low := scale * (law.quantile(1, 1.2, q-1./n) - 1)
				high := scale * (law.quantile(1, 1.2, q+1e-12) - 1)
				if got := f.Quantile(q); got < low*(1-1./8000) || got > high*(1+1./8000) {
					t.Errorf("%s, %s: quantile %v is %v, want %v to %v", law, f.Column.Figure, q, got, low, high)
				}
			}
			if worst := f.Worst.Value; worst > 0.2*scale*(1+1e-12) || worst < scale*(law.quantile(1, 1.2, 1-1./n)-1) {
				t.Errorf("%s, %s: worst %v", law, f.Column.Figure, worst)
			}
		}
		// peak_error ≤ 1 mm is g ≤ 1.1: half of all, to one draw.
		if math.Abs(float64(s.Passed)-n/2) > 1 {
			t.Errorf("%s: %d of %d pass", law, s.Passed, n)
		}
	}
}

// A grid finds where a limit is met: |g−1|·10 mm ≤ 1 mm for g from 0.9 to 1.1.
func TestGridFindsWhereAllPass(t *testing.T) {
	s := scene(t, tracking, scenarios.Change{Path: "accept.peak_error", Value: "1.001 mm"})
	st := studyOf(t, s, Request{Over: []string{"actuator.actuator.gain=0.8:1.2:41"}})
	sum := summed(st, all(t, st, 2))
	if len(sum.Spans) != 1 || math.Abs(sum.Spans[0].Low-0.9) > 1e-12 || math.Abs(sum.Spans[0].High-1.1) > 1e-12 {
		t.Errorf("all pass at %v", sum.Spans)
	}
	if best := st.Values(nil, sum.Main().Best.Run); math.Abs(best[0]-1) > 1e-12 {
		t.Errorf("best at gain %v", best[0])
	}
}

// Runs that trip, diverge or are refused are worse than any figure, are counted,
// and end nothing.
func TestRunsThatDoNotComplete(t *testing.T) {
	s := scene(t, short, scenarios.Change{Path: "substructure.integrator", Value: "newmark-explicit"})
	st := studyOf(t, s, Request{Over: []string{"substructure.storey[0].stiffness=4 kN/mm:1000 kN/mm:2", "spring.actuator.gain=1:9:3"}})
	rows := all(t, st, 2)
	sum := summed(st, rows)
	if sum.Outcomes[completed] == 0 || sum.Outcomes["tripped"] == 0 || sum.Outcomes["completed"]+sum.Outcomes["tripped"]+sum.Outcomes["diverged"]+sum.Outcomes[Refused] != 6 {
		t.Fatalf("%v", sum.Outcomes)
	}
	if sum.Pass() || !math.IsNaN(sum.Figures[0].Worst.Value) || sum.Figures[0].Worst.Outcome == completed {
		t.Errorf("worst %+v", sum.Figures[0].Worst)
	}
	for _, f := range sum.Figures {
		if !math.IsNaN(f.Quantile(1)) {
			t.Errorf("%s: the largest of runs that tripped is %v", f.Column.Figure, f.Quantile(1))
		}
	}
}

func TestRefusedRunsSayWhy(t *testing.T) {
	s := scene(t, short, scenarios.Change{Path: "substructure.integrator", Value: "newmark-explicit"})
	st := studyOf(t, s, Request{Over: []string{"substructure.storey[0].mass=0.01 t:50 t:2"}})
	sum := summed(st, all(t, st, 1))
	if sum.Outcomes[Refused] != 1 || sum.Why == nil || !strings.Contains(sum.Why.Error(), "newmark-explicit becomes unstable") {
		t.Errorf("%v, %v", sum.Outcomes, sum.Why)
	}
	if text := wordy(t, sum); !strings.Contains(text, "1 refused") || !strings.Contains(text, "newmark-explicit becomes unstable") {
		t.Errorf("printed\n%s", text)
	}
}

func wordy(t *testing.T, s *Summary) string {
	t.Helper()
	var b strings.Builder
	if err := s.WriteText(&b, false); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestRunEndsWithItsContextAndErrors(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 500})
	ctx, cancel := context.WithCancel(context.Background())
	seen := int64(0)
	err := st.Run(ctx, 0, 500, Options{Workers: 2}, func(rows []Row) error {
		for _, r := range rows {
			if r.Run != seen {
				t.Fatalf("run %d came where %d was due", r.Run, seen)
			}
			seen++
		}
		cancel()
		return nil
	})
	if !errors.Is(err, context.Canceled) || seen == 0 || seen == 500 {
		t.Errorf("%v after %d runs", err, seen)
	}
	full := errors.New("full")
	if err := st.Run(context.Background(), 0, 500, Options{Workers: 2}, func([]Row) error { return full }); err != full {
		t.Errorf("%v", err)
	}
}

// The lower limit of confidence is that of SciPy's beta.ppf, to 1e-9.
func TestAtLeastIsThatOfSciPy(t *testing.T) {
	for _, c := range readVectors(t).Shares {
		s := &Summary{Passed: int64(c[0]), Runs: int64(c[1])}
		if got := s.AtLeast(); math.Abs(got-c[2]) > 1e-9 {
			t.Errorf("%v of %v: %v, SciPy %v", c[0], c[1], got, c[2])
		}
	}
}

// Every number of a summary's JSON is a number or null, and it names a command
// for each worst run.
func TestSummaryJSON(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Sets: []string{"loop.seed=3"}, Draws: 20})
	text, err := json.Marshal(summed(st, all(t, st, 2)))
	if err != nil {
		t.Fatal(err)
	}
	var back summaryJSON
	if err := json.Unmarshal(text, &back); err != nil {
		t.Fatal(err)
	}
	if back.Runs != 20 || back.Of != 20 || len(back.Figures) != 10 || len(back.Settings) != 2 {
		t.Errorf("%s", text)
	}
	if c := back.Figures[0].Worst.Command; !strings.HasPrefix(c, "antelag run test.toml --set loop.seed=3 --set 'spring.actuator.delay=") {
		t.Errorf("command %s", c)
	}
}

func TestUndefinedFiguresAreWorst(t *testing.T) {
	for _, c := range columns(scene(t, short)) {
		if bad := c.Bad(math.NaN()); !math.IsInf(bad, 1) {
			t.Errorf("%s: %v", c.Figure, bad)
		}
	}
	if rtloop.Completed.String() != completed {
		t.Error(completed)
	}
}

func TestQuote(t *testing.T) {
	for word, want := range map[string]string{
		"archive": "archive", "a b": "'a b'", "it's": `'it'\''s'`, "": "''", "specimen[0]": "'specimen[0]'", "$(x)": "'$(x)'",
	} {
		if got := Quote(word); got != want {
			t.Errorf("%q: %s", word, got)
		}
	}
}
