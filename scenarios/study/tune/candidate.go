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
// place among the workers, and so does each measure that needs no run.
func (j *job) evaluate(ctx context.Context, places chan struct{}, parts int) (*Candidate, error) {
	changes := [][]scenarios.Change{j.p.changes(j.values)}
	for _, v := range j.variations {
		changes = append(changes, append(j.p.changes(j.values), v...))
	}
	c := &Candidate{Values: j.values, Judged: len(j.variations), Figure: math.NaN(), Measured: make([]float64, len(j.p.Measures))}
	s, err := j.p.Scenario.With(changes[0]...)
	if err == nil {
		_, err = s.BuildLoop(j.p.Lane)
	}
	if err != nil {
		return c.refuse(err)
	}
	judged := make([]study.Judged, len(changes))
	parts = min(max(parts, 1), len(changes))
	errs := make([]error, parts+len(j.p.Measures))
	var group sync.WaitGroup
	work := func(err *error, do func() error) {
		group.Go(func() {
			places <- struct{}{}
			defer func() { <-places }()
			*err = do()
		})
	}
	for i := range parts {
		from, end := i*len(changes)/parts, (i+1)*len(changes)/parts
		work(&errs[i], func() error {
			some, err := study.Judge(ctx, j.p.Scenario, j.p.Lane, changes[from:end])
			copy(judged[from:], some)
			return err
		})
	}
	for i := range j.p.Measures {
		if m := &j.p.Measures[i]; m.alone != nil {
			work(&errs[parts+i], func() (err error) {
				c.Measured[i], err = m.alone(ctx, s)
				return err
			})
		}
	}
	group.Wait()
	if i := slices.IndexFunc(errs, func(e error) bool { return e != nil }); i >= 0 {
		return nil, errs[i]
	}
	if judged[0].Refused != nil {
		return c.refuse(judged[0].Refused)
	}
	j.p.sumUp(c, judged)
	return c, nil
}

// refuse makes a candidate of settings of which no test can be built; another
// error stays one.
func (c *Candidate) refuse(err error) (*Candidate, error) {
	var bad *scenarios.Error
	if !errors.As(err, &bad) {
		return nil, err
	}
	c.Refused = err.Error()
	for i := range c.Measured {
		c.Measured[i] = math.NaN()
	}
	return c, nil
}

// sumUp completes a candidate by its runs, of which the first is the scenario as
// it is.
func (p *Problem) sumUp(c *Candidate, judged []study.Judged) {
	var bad []float64
	for i := range judged {
		bad = append(bad, p.Column.Bad(p.value(&p.Column, &judged[i])))
	}
	slices.Sort(bad)
	c.Figure = p.Column.Good(bad[max(0, int(math.Ceil(p.Quantile*float64(len(bad))))-1)])
	for i := range p.Measures {
		if m := &p.Measures[i]; m.of != nil {
			c.Measured[i] = m.of(judged)
		}
	}
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
