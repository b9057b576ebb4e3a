//go:build unix

package tune

import (
	"context"
	"fmt"
	"math"
	"strings"
	"syscall"
	"testing"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study"
	"antelag/scenarios/study/margin"
)

// off is a scenario whose compensators' delays are off by half, with the ranges in
// which they are looked for; ok is false where there are none.
func off(b *testing.B, name string) (s *scenarios.Scenario, o Options, ok bool) {
	b.Helper()
	s, err := scenarios.Load(name)
	if err != nil {
		b.Fatal(err)
	}
	var wrong []scenarios.Change
	for i, c := range s.Channels {
		v, has := c.Compensator.Values["delay"]
		if !has {
			continue
		}
		delay := kind.Number("delay", quantity.Time, "").Range(0, 1)
		path := c.Name + ".compensator.delay"
		factor := []float64{0.5, 1.5}[i%2]
		wrong = append(wrong, scenarios.Change{Path: path, Value: study.Exact(&delay, factor*v.Num)})
		o.Over = append(o.Over, fmt.Sprintf("%s=%s:%s", path, study.Exact(&delay, v.Num/4), study.Exact(&delay, 3*v.Num)))
	}
	if wrong == nil {
		return nil, o, false
	}
	if s, err = s.With(wrong...); err != nil {
		b.Fatal(err)
	}
	o.Draws, o.Seed, o.Limits = 20, 1, NoLimits
	if s.Substructure != nil {
		o.Limits.DelayMargin = 0
		o.Delay = func(ctx context.Context, s *scenarios.Scenario) (float64, error) {
			r, err := margin.Of(ctx, s, margin.Options{Quick: true})
			if err != nil {
				return 0, err
			}
			return r.LeastDelay(), nil
		}
	}
	return s, o, true
}

// BenchmarkEmbedded tunes every embedded scenario that has a delay to tune, from
// one that is off by half, and compares with the best of a grid. The time is that of
// the search alone; it also tells the seconds that all processors spent on it, and
// the ratio of the two figures.
func BenchmarkEmbedded(b *testing.B) {
	for _, name := range scenarios.Names() {
		b.Run(name, func(b *testing.B) {
			s, o, ok := off(b, name)
			if !ok {
				b.Log("nothing to tune")
				return
			}
			p, err := New(s, o)
			if err != nil {
				b.Fatal(err)
			}
			var r *Result
			before := spent()
			for b.Loop() {
				if r, err = p.Search(context.Background(), nil); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric((spent()-before)/float64(b.N), "cpu-s/op")
			n := 41
			if len(p.Ranges) > 1 {
				n = 12
			}
			b.StopTimer()
			grid := brute(b, p, n)
			ratio := p.Column.Bad(r.Best.Figure) / grid
			b.ReportMetric(ratio, "grid-ratio")
			var values []string
			for i := range p.Ranges {
				values = append(values, say(&p.Ranges[i], p.start[i])+" → "+say(&p.Ranges[i], r.Best.Values[i]))
			}
			b.Logf("%s: %s, %s → %s, grid %s, pass %v", strings.Join(values, ", "), p.figureLabel(),
				p.Column.Format(r.Before.Figure), p.Column.Format(r.Best.Figure), p.Column.Format(grid), r.Pass())
			if !r.Pass() || !(ratio <= 1.05) || math.IsInf(grid, 0) {
				b.Errorf("not within 5 %% of the grid's best, or no pass: %+v", r.Stands)
			}
		})
	}
}

// spent is what all processors have spent on this program, s.
func spent() float64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return math.NaN()
	}
	return float64(u.Utime.Nano()+u.Stime.Nano()) * 1e-9
}
