package tune

import (
	"context"
	"math"
	"slices"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/study"
)

// Result is what a search came to.
type Result struct {
	Problem *Problem
	Before  *Candidate // the settings that the scenario has; nil if there was no time even for them
	Best    *Candidate // by all variations
	Tried   int        // candidates, those in the record included
	Runs    int64      // made now
	Cut     bool       // time ran out, or the search was broken off
	Front   []*Candidate
	All     []*Candidate   // judged by all variations, best first
	Stands  []Obstacle     // where no candidate passes: what stands in the way
	Check   *study.Summary // the best over other draws; nil without draws
	Wall    float64        // s
	Workers int
}

// Obstacle is a limit that the best candidate misses.
type Obstacle struct {
	Measure int
	Got     float64
	Nearest float64 // the best that any candidate had of it
	Ever    bool    // some candidate met it, if not together with the others
}

// result gathers what there is.
func (s *searcher) result() (*Result, error) {
	r := &Result{Problem: s.Problem, Before: s.known[s.name(s.start, s.all())], Tried: len(s.known), Runs: s.runs, Cut: s.ctx.Err() != nil}
	if s.err != nil {
		return r, s.err
	}
	all := s.rank(s.known, s.all())
	if len(all) == 0 {
		return r, ErrNothingRan
	}
	r.Best, r.All = s.choose(all), all
	r.Front = s.front(all)
	if !s.Pass(r.Best) {
		r.Stands = s.obstacles(all)
	}
	return r, nil
}

// Pass reports whether there is a candidate that meets all limits.
func (r *Result) Pass() bool { return r.Best != nil && r.Problem.Pass(r.Best) }

// alike is how near two figures are that count as equally good.
const alike = 0.01

// choose takes the best of all candidates; of those that pass and are as good but
// for 1 %, the gentlest, the one with the least noise gain: accuracy that cannot be
// told apart is not worth any.
func (s *searcher) choose(all []*Candidate) *Candidate {
	best := all[0]
	m := slices.IndexFunc(s.Measures, func(m Measure) bool { return m.Name == "noise_gain" })
	if !s.Pass(best) {
		return best
	}
	least := s.Column.Bad(best.Figure)
	for _, c := range all {
		if s.Pass(c) && s.Column.Bad(c.Figure) <= least+alike*math.Abs(least) && c.Measured[m] < best.Measured[m] {
			best = c
		}
	}
	return best
}

// obstacles are the limits that the best of all candidates misses, the worst
// missed first.
func (s *searcher) obstacles(all []*Candidate) []Obstacle {
	var out []Obstacle
	best := all[0]
	for i := range s.Measures {
		m := &s.Measures[i]
		if m.Pass(best.Measured[i]) {
			continue
		}
		o := Obstacle{Measure: i, Got: best.Measured[i], Nearest: math.NaN()}
		for _, c := range all {
			if v := c.Measured[i]; !(m.Missed(v) >= m.Missed(o.Nearest)) {
				o.Nearest = v
			}
		}
		o.Ever = m.Pass(o.Nearest)
		out = append(out, o)
	}
	slices.SortStableFunc(out, func(a, b Obstacle) int {
		switch x, y := s.Measures[a.Measure].Missed(a.Got), s.Measures[b.Measure].Missed(b.Got); {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	return out
}

// margin finds the measure that accuracy is traded against: the delay margin, or
// the energy margin, or the noise gain where there is no loop.
func (p *Problem) margin() int {
	for _, name := range []string{"delay_margin_s", "energy_margin", "noise_gain"} {
		if i := slices.IndexFunc(p.Measures, func(m Measure) bool { return m.Name == name }); i >= 0 {
			return i
		}
	}
	return 0
}

// front are the candidates of which none is better in both the figure and the
// margin, the most accurate first.
func (s *searcher) front(of []*Candidate) []*Candidate {
	i := s.margin()
	bad := func(c *Candidate) (figure, margin float64) {
		figure, margin = s.Column.Bad(c.Figure), c.Measured[i]
		if s.Measures[i].AtLeast {
			margin = -margin
		}
		return figure, margin
	}
	var out []*Candidate
	all := slices.DeleteFunc(slices.Clone(of), func(c *Candidate) bool {
		f, m := bad(c)
		return math.IsInf(f, 0) || math.IsNaN(m)
	})
	slices.SortStableFunc(all, func(a, b *Candidate) int {
		fa, ma := bad(a)
		fb, mb := bad(b)
		switch {
		case fa < fb, fa == fb && ma < mb:
			return -1
		case fa > fb, ma > mb:
			return 1
		}
		return 0
	})
	least := math.Inf(1)
	for _, c := range all {
		if _, m := bad(c); m < least {
			out, least = append(out, c), m
		}
	}
	return out
}

// Again judges the best candidate by other draws than it was tuned on, four times
// as many but at least a hundred: whether it was tuned to the spread or to the
// draws.
func (r *Result) Again(ctx context.Context) error {
	p := r.Problem
	if p.Draws == 0 || r.Best == nil {
		return nil
	}
	s, err := p.Tuned(r.Best)
	if err != nil {
		return err
	}
	st, err := study.New(s, study.Request{Lane: p.Lane, Sets: p.sets(r.Best), Draws: min(max(4*int64(p.Draws), 100), mostDraws), Law: p.Law, Sampling: study.Latin, Seed: p.Seed + 1})
	if err != nil {
		return err
	}
	sum := study.NewSummary(st)
	err = st.Run(ctx, 0, st.Runs(), study.Options{Workers: p.Workers}, func(rows []study.Row) error {
		for _, row := range rows {
			sum.Add(row)
		}
		return nil
	})
	if sum.Runs > 0 {
		r.Check = sum
	}
	return err
}

// sets are what makes the scenario as it was loaded into that of a candidate,
// PATH=VALUE.
func (p *Problem) sets(c *Candidate) []string {
	changes := p.changes(c.Values)
	var out []string
	for _, set := range p.Sets {
		path, _, _ := strings.Cut(set, "=")
		if !slices.ContainsFunc(changes, func(c scenarios.Change) bool { return study.Same(p.Scenario, c.Path, strings.TrimSpace(path)) }) {
			out = append(out, set)
		}
	}
	for _, change := range changes {
		out = append(out, change.Path+"="+change.Value)
	}
	return out
}
