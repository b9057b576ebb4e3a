package tune

import (
	"context"
	"errors"
	"math"
	"slices"
	"sync"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/study"
)

// Candidate is one choice of settings and what came of it.
type Candidate struct {
	Values   []float64 // in the order of Ranges, SI
	Judged   int       // by how many variations, beside the scenario as it is
	Figure   float64   // the figure's quantile over all runs; NaN where runs that count have none
	Measured []float64 // in the order of Measures
	Refused  string    // why there is no such test, "" if there is
}

// job is one evaluation: the settings on the scenario as it is and on some
// variations.
type job struct {
	p          *Problem
	values     []float64
	variations [][]scenarios.Change
}

// evaluate runs a job. Its runs are dealt out in parts, each of which takes a
// place among the workers.
func (j *job) evaluate(ctx context.Context, places chan struct{}, parts int) (*Candidate, error) {
	changes := [][]scenarios.Change{j.p.changes(j.values)}
	for _, v := range j.variations {
		changes = append(changes, append(j.p.changes(j.values), v...))
	}
	judged := make([]study.Judged, len(changes))
	parts = min(max(parts, 1), len(changes))
	errs := make([]error, parts)
	var group sync.WaitGroup
	for i := range parts {
		group.Go(func() {
			places <- struct{}{}
			defer func() { <-places }()
			from, end := i*len(changes)/parts, (i+1)*len(changes)/parts
			var some []study.Judged
			if some, errs[i] = study.Judge(ctx, j.p.Scenario, j.p.Lane, changes[from:end]); errs[i] == nil {
				copy(judged[from:], some)
			}
		})
	}
	group.Wait()
	if err := errors.Join(errs...); err != nil {
		return nil, firstError(errs)
	}
	return j.p.sumUp(ctx, j.values, judged)
}

func firstError(errs []error) error {
	return errs[slices.IndexFunc(errs, func(e error) bool { return e != nil })]
}

// sumUp makes a candidate of its runs, of which the first is the scenario as it
// is.
func (p *Problem) sumUp(ctx context.Context, values []float64, judged []study.Judged) (*Candidate, error) {
	c := &Candidate{Values: values, Judged: len(judged) - 1, Figure: math.NaN(), Measured: make([]float64, len(p.Measures))}
	for i := range c.Measured {
		c.Measured[i] = math.NaN()
	}
	if why := judged[0].Refused; why != nil {
		c.Refused = why.Error()
		return c, nil
	}
	var bad []float64
	for i := range judged {
		bad = append(bad, p.Column.Bad(p.value(&p.Column, &judged[i])))
	}
	slices.Sort(bad)
	c.Figure = p.Column.Good(bad[max(0, int(math.Ceil(p.Quantile*float64(len(bad))))-1)])
	s, err := p.Scenario.With(p.changes(values)...)
	if err != nil {
		return nil, err
	}
	for i := range p.Measures {
		if c.Measured[i], err = p.Measures[i].get(ctx, s, judged); err != nil {
			return nil, err
		}
	}
	return c, nil
}

// value is a figure of a run, NaN where that did not come to its end.
func (p *Problem) value(c *study.Column, j *study.Judged) float64 {
	if j.Refused != nil || j.Outcome != rtloop.Completed {
		return math.NaN()
	}
	return c.Of(&j.Lane)
}

// merit is what the search makes small: below 1 for candidates that meet all
// limits, in the order of their figures; above 2 for the others, in the order of
// by how much they miss them.
func (p *Problem) merit(c *Candidate) float64 {
	if c.Refused != "" {
		return 1e6
	}
	figure := 1.0
	if !math.IsNaN(c.Figure) {
		figure = 0.5 + math.Atan(p.Column.Bad(c.Figure))/math.Pi
	}
	missed := 0.0
	for i := range p.Measures {
		missed += p.Measures[i].Missed(c.Measured[i])
	}
	if missed > 0 || math.IsNaN(c.Figure) {
		return 2 + missed + figure/1000
	}
	return figure
}

// Pass reports whether a candidate meets all limits.
func (p *Problem) Pass(c *Candidate) bool { return p.merit(c) < 1 }
