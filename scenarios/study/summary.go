package study

import (
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/mathext"
)

// Summary is what the runs of a study came to together. It takes rows in order
// and keeps as much as there are figures and points of a grid, not runs.
type Summary struct {
	Study    *Study
	Runs     int64 // seen so far
	Passed   int64
	Outcomes map[string]int64
	Limits   map[string]int64 // how many runs each trip limit ended
	Why      error            // why the first refused run was refused
	Figures  []Tally          // of all columns that are no single channel's
	Points   []Point          // where there are a grid and draws
	Spans    []Span           // of a grid of one setting: where all runs pass
	Compute  Compute          // what it cost, for who fills it in
}

// Tally is one figure over all runs. A run that did not come to its end, and one
// whose figure is undefined, is worse than any that has a figure.
type Tally struct {
	Column *Column
	Limit  float64 // the acceptance limit, NaN where there is none
	Failed int64   // runs that did not meet it
	Worst  Extreme
	Best   Extreme

	sketch *sketch
	column int
}

// Extreme is the first run with the largest or smallest badness.
type Extreme struct {
	Run     int64
	Value   float64 // NaN where the run has none
	Outcome string
	bad     float64
}

// Point is one point of a grid over all its draws.
type Point struct {
	Values []float64 // of the grid's settings
	Runs   int64
	Passed int64
	// Worst of each figure, in the order of Figures, and what 95 % of the runs
	// are no worse than; NaN where a run that counts has none.
	Worst, Most []float64

	sketches []*sketch // nil when all draws have been seen
}

// Span is a stretch of neighbouring values of a grid at which all runs pass.
type Span struct{ Low, High float64 }

// Kept is how many points of a grid a summary keeps at most.
const Kept = 10000

// NewSummary returns the summary of no runs.
func NewSummary(st *Study) *Summary {
	s := &Summary{Study: st, Outcomes: map[string]int64{}, Limits: map[string]int64{}}
	for i := range st.columns {
		c := &st.columns[i]
		if c.Channel != "" {
			continue
		}
		t := Tally{Column: c, Limit: math.NaN(), sketch: newSketch(), column: i}
		t.Worst.bad, t.Best.bad = math.Inf(-1), math.Inf(1)
		if c.judged && st.Scenario.Accept.Has(c.Figure) {
			t.Limit = st.Scenario.Accept.Num(c.Figure)
		}
		s.Figures = append(s.Figures, t)
	}
	return s
}

// Main is the figure that a study is about unless another is named: how wrong the
// test's answer is, or, where there is no structure to answer, its tracking.
func (s *Summary) Main() *Tally { return &s.Figures[s.main()] }

func (s *Summary) main() int {
	return max(0, slices.IndexFunc(s.Figures, func(t Tally) bool { return t.Column.Figure == "response_error" }))
}

// Add takes the row of the next run.
func (s *Summary) Add(r Row) {
	s.Runs++
	s.Outcomes[r.Outcome]++
	if r.Pass {
		s.Passed++
	}
	if r.Limit != "" {
		s.Limits[strings.TrimPrefix(r.Channel+": "+r.Limit, ": ")]++
	}
	if s.Why == nil {
		s.Why = r.Why
	}
	for i := range s.Figures {
		s.Figures[i].add(&r)
	}
	s.addPoint(&r)
}

// value is the figure of a run, NaN where that did not come to its end.
func (t *Tally) value(r *Row) float64 {
	if !r.Completed() {
		return math.NaN()
	}
	return r.Figures[t.column]
}

func (t *Tally) bad(r *Row) float64 { return t.Column.Bad(t.value(r)) }

func (t *Tally) add(r *Row) {
	v, bad := t.value(r), t.bad(r)
	t.sketch.add(bad)
	if !math.IsNaN(t.Limit) && !(bad <= t.Column.Bad(t.Limit)) {
		t.Failed++
	}
	at := Extreme{Run: r.Run, Value: v, Outcome: r.Outcome, bad: bad}
	if t.Worst.Outcome == "" || bad > t.Worst.bad {
		t.Worst = at
	}
	if t.Best.Outcome == "" || bad < t.Best.bad {
		t.Best = at
	}
}

// Quantile returns the value that the part q of the runs are no worse than, by
// size where the sign does not matter; NaN where that is no number.
func (t *Tally) Quantile(q float64) float64 {
	return t.Column.Good(t.sketch.quantile(q))
}

// addPoint sums the runs up by point of the grid.
func (s *Summary) addPoint(r *Row) {
	st := s.Study
	if len(st.Grid) == 0 || st.points > Kept {
		return
	}
	draws := max(1, st.Draws)
	if r.Run%draws == 0 {
		p := Point{Values: r.Values[:len(st.Grid):len(st.Grid)]}
		for range s.Figures {
			p.sketches = append(p.sketches, newSketch())
		}
		s.Points = append(s.Points, p)
	}
	if len(s.Points) == 0 { // a shard may begin within a point
		return
	}
	p := &s.Points[len(s.Points)-1]
	p.Runs++
	if r.Pass {
		p.Passed++
	}
	for i := range s.Figures {
		p.sketches[i].add(s.Figures[i].bad(r))
	}
	if r.Run%draws == draws-1 {
		s.closePoint(p)
	}
}

// closePoint sums up a point whose draws have all been seen.
func (s *Summary) closePoint(p *Point) {
	for i, sk := range p.sketches {
		c := s.Figures[i].Column
		p.Worst = append(p.Worst, c.Good(sk.most))
		p.Most = append(p.Most, c.Good(sk.quantile(0.95)))
	}
	p.sketches = nil
	if len(s.Study.Grid) == 1 {
		s.span(p)
	}
}

// span lengthens the last span by a point that passes, or begins one.
func (s *Summary) span(p *Point) {
	if p.Passed < p.Runs {
		return
	}
	v := p.Values[0]
	if n := len(s.Points); n > 1 && len(s.Spans) > 0 && s.Spans[len(s.Spans)-1].High == s.Points[n-2].Values[0] {
		s.Spans[len(s.Spans)-1].High = v
		return
	}
	s.Spans = append(s.Spans, Span{v, v})
}

// Pass reports whether every run passed.
func (s *Summary) Pass() bool { return s.Runs > 0 && s.Passed == s.Runs }

// Confidence is how sure AtLeast is.
const Confidence = 0.95

// AtLeast returns the share of all possible draws that pass, of which one can be
// sure to 95 %: the lower limit of Clopper & Pearson (1934), one-sided. It holds
// for independent draws; of a Latin hypercube it says rather too little.
func (s *Summary) AtLeast() float64 {
	k, n := float64(s.Passed), float64(s.Runs)
	if k == 0 {
		return 0
	}
	return mathext.InvRegIncBeta(k, n-k+1, 1-Confidence)
}

// Command is how run i is made again, by itself.
func (st *Study) Command(i int64) string {
	sets := slices.Clone(st.Sets)
	for _, c := range st.Changes(i) {
		sets = append(sets, c.Path+"="+c.Value)
	}
	return Command("run", st.Scenario.Name, sets)
}

// Command is a command line on a scenario with some settings changed.
func Command(verb, scenario string, sets []string) string {
	parts := []string{"antelag", verb, Quote(scenario)}
	for _, set := range sets {
		parts = append(parts, "--set", Quote(set))
	}
	return strings.Join(parts, " ")
}

// Quote quotes a word for a shell where it needs it.
func Quote(word string) string {
	plain := func(r rune) bool {
		return r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("_-./=:,+@%", r)
	}
	if word != "" && strings.IndexFunc(word, func(r rune) bool { return !plain(r) }) < 0 {
		return word
	}
	return "'" + strings.ReplaceAll(word, "'", `'\''`) + "'"
}
