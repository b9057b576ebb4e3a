// Package tune looks for the settings of compensators with which a figure is
// best in the worst case, or in all but a small share of cases, over the [spread]
// of a scenario, and with which limits hold: of acceptance, energy margin, delay
// margin, trips, command velocity and noise.
//
// It searches wide first (a Latin hypercube, then CMA-ES) on those draws that lie
// farthest out, then closely (Nelder–Mead) on all draws. For a seed the result is
// the same with any number of workers.
package tune

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"time"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/study"
)

// Options say what is tuned and what it must meet. Numbers are SI.
type Options struct {
	Lane string   // whose result counts; "": the configured lane
	Sets []string // what the scenario was changed by beforehand, PATH=VALUE
	Over []string // study.ParseRange, one for each setting

	Figure   string  // "": response_error, or nrmse where there is no structure
	Quantile float64 // the share of runs that the figure stands for; 1 is the worst case
	Draws    int     // from [spread], beside the scenario as it is
	Law      study.Law
	Seed     int64

	Limits Limits
	Runs   int64         // about how many runs may be made; 0: as many as it takes
	Time   time.Duration // how long it may take; 0: as long as it takes

	Workers int // goroutines; 0: one a core
	// Delay returns the delay margin of a scenario's lane, s, +Inf where there is
	// none to find; nil leaves it out.
	Delay    func(ctx context.Context, s *scenarios.Scenario) (float64, error)
	Progress func(done, of int64) // in runs; may be nil
}

// Limits are what a setting must meet beside the acceptance limits, which must
// hold for the scenario as it is. NaN: no such limit.
type Limits struct {
	EnergyMargin    float64 // least, over all runs
	DelayMargin     float64 // least, s, of the scenario as it is
	CommandVelocity float64 // largest change of the command in a tick over the tick, m/s, over all runs
	NoiseGain       float64 // largest gain of the command over a target of up to NoiseBand
}

// NoLimits are no limits but those of acceptance and that no run may end early.
var NoLimits = Limits{math.NaN(), math.NaN(), math.NaN(), math.NaN()}

// Problem is what is to be solved, checked against its scenario.
type Problem struct {
	Options
	Scenario *scenarios.Scenario
	Study    *study.Study // of the draws; nil without
	Corners  *study.Study // of the corners of [spread]; nil where they do not count
	Ranges   []study.Range
	Column   study.Column // the figure
	Measures []Measure

	columns []study.Column
	start   []float64 // the settings that the scenario has
	// variations are what a candidate is judged by beside the scenario as it is,
	// those where the worst case mostly is first.
	variations [][]scenarios.Change
}

// most is how many draws a candidate is judged by, and settings there may be.
const (
	mostDraws    = 10000
	mostSettings = 20
)

// New checks the options against a scenario.
func New(s *scenarios.Scenario, o Options) (*Problem, error) {
	if o.Lane == "" {
		o.Lane = scenarios.Configured
	}
	p := &Problem{Options: o, Scenario: s, columns: study.ColumnsOf(s)}
	for _, check := range []func() error{p.readRanges, p.readFigure, p.readDraws} {
		if err := check(); err != nil {
			return nil, err
		}
	}
	p.Measures = p.measures()
	if least := leastPlan.runs(p); o.Runs != 0 && o.Runs < least {
		return nil, fmt.Errorf("%d runs are too few; with %d variations of each setting it takes at least %d", o.Runs, p.all()+1, least)
	}
	return p, s.CheckLane(o.Lane)
}

func (p *Problem) readRanges() error {
	if len(p.Over) == 0 {
		return fmt.Errorf("nothing is tuned; say which settings and how far, like --over %s", p.suggestion())
	}
	if len(p.Over) > mostSettings {
		return fmt.Errorf("%d settings are tuned; at most %d", len(p.Over), mostSettings)
	}
	for _, text := range p.Over {
		r, err := study.ParseRange(p.Scenario, text)
		if err != nil {
			return fmt.Errorf("--over: %w", err)
		}
		for _, other := range p.Ranges {
			if study.Same(p.Scenario, r.Path, other.Path) {
				return fmt.Errorf("%s is tuned twice", r.Path)
			}
		}
		for _, sp := range p.Scenario.Spread {
			if study.Same(p.Scenario, r.Path, sp.Path) {
				return fmt.Errorf("%s stands in [spread]: it is not known, so it cannot be tuned", r.Path)
			}
		}
		at, err := p.Scenario.Locate(r.Path)
		if err != nil {
			return err
		}
		now, ok := at.Values[at.Setting.Name]
		if !ok {
			return fmt.Errorf("%s is not set in the scenario; set it first, so that there is something to start from", r.Path)
		}
		p.Ranges, p.start = append(p.Ranges, r), append(p.start, now.Num)
	}
	return nil
}

// suggestion is a setting of the first compensator that could be tuned.
func (p *Problem) suggestion() string {
	for _, c := range p.Scenario.Channels {
		for i := range c.Compensator.Kind.Settings {
			s := &c.Compensator.Kind.Settings[i]
			if v, ok := c.Compensator.Values[s.Name]; ok && s.Type == kind.NumberType && v.Num > 0 {
				return fmt.Sprintf(`'%s.compensator.%s=%s:%s'`, c.Name, s.Name, s.Format(max(v.Num/2, s.Min)), s.Format(min(2*v.Num, s.Max)))
			}
		}
	}
	return `'damper.compensator.delay=5 ms:20 ms'`
}

func (p *Problem) readFigure() error {
	if p.Quantile == 0 {
		p.Quantile = 1
	}
	if !(p.Quantile >= 0.5 && p.Quantile <= 1) {
		return fmt.Errorf("a quantile of %v; allowed is 0.5 to 1, the worst case", p.Quantile)
	}
	var known []string
	for _, c := range p.columns {
		if c.Channel != "" {
			continue
		}
		known = append(known, c.Figure)
	}
	if p.Figure == "" {
		p.Figure = "nrmse"
		if slices.Contains(known, "response_error") {
			p.Figure = "response_error"
		}
	}
	at := slices.IndexFunc(p.columns, func(c study.Column) bool { return c.Figure == p.Figure && c.Channel == "" })
	if at < 0 {
		return &kind.UnknownError{What: "figure", Got: p.Figure, Known: known}
	}
	p.Column = p.columns[at]
	return nil
}

func (p *Problem) readDraws() error {
	switch {
	case p.Draws < 0 || p.Draws > mostDraws:
		return fmt.Errorf("%d draws; allowed is 0 to %d", p.Draws, mostDraws)
	case len(p.Scenario.Spread) == 0:
		p.Draws = 0
	}
	if p.Draws == 0 {
		return nil
	}
	if p.Law == "" {
		p.Law = study.Uniform
	}
	st, err := study.New(p.Scenario, study.Request{Lane: p.Lane, Sets: p.Sets, Draws: int64(p.Draws), Law: p.Law, Sampling: study.Latin, Seed: p.Seed})
	if err != nil {
		return err
	}
	p.Study = st
	if err := p.addCorners(); err != nil {
		return err
	}
	for _, i := range farthest(st) {
		p.variations = append(p.variations, st.Changes(i))
	}
	return nil
}

// mostCorners is up to how many corners of the spread all count.
const mostCorners = 32

// addCorners makes the corners of the spread count where the worst case does: no
// draw quite reaches them, and there it mostly lies. Under the normal law they
// are no more likely than anything beyond.
func (p *Problem) addCorners() error {
	if p.Quantile < 1 || p.Law != study.Uniform || 1<<len(p.Scenario.Spread) > mostCorners {
		return nil
	}
	var over []string
	for _, sp := range p.Study.Spread {
		if sp.Low == sp.High {
			continue
		}
		a := study.Axis{Range: study.Range{Path: sp.Path, Setting: sp.Setting, Low: sp.Low, High: sp.High}, N: 2}
		over = append(over, a.String())
	}
	if over == nil {
		return nil
	}
	st, err := study.New(p.Scenario, study.Request{Lane: p.Lane, Sets: p.Sets, Over: over})
	if err != nil {
		return err
	}
	p.Corners = st
	for i := range st.Runs() {
		p.variations = append(p.variations, st.Changes(i))
	}
	return nil
}

// farthest numbers the draws of a study, those first that are farthest from the
// middle of the spread: there the worst case mostly is.
func farthest(st *study.Study) []int64 {
	reach := func(i int64) float64 {
		sum := 0.0
		for k, v := range st.Values(nil, i) {
			sp := st.Spread[k]
			if half := (sp.High - sp.Low) / 2; half > 0 {
				z := (v - sp.Low - half) / half
				sum += z * z
			}
		}
		return sum
	}
	order := make([]int64, st.Runs())
	for i := range order {
		order[i] = int64(i)
	}
	slices.SortStableFunc(order, func(a, b int64) int {
		switch x, y := reach(a), reach(b); {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	return order
}

// changes set the tuned settings.
func (p *Problem) changes(values []float64) []scenarios.Change {
	out := make([]scenarios.Change, len(values))
	for i := range values {
		out[i] = scenarios.Change{Path: p.Ranges[i].Path, Value: study.Exact(&p.Ranges[i].Setting, values[i])}
	}
	return out
}

// Tuned returns the scenario with the settings of a candidate.
func (p *Problem) Tuned(c *Candidate) (*scenarios.Scenario, error) {
	return p.Scenario.With(p.changes(c.Values)...)
}

// ErrNothingRan is the error of a search that ended before it had a candidate.
var ErrNothingRan = errors.New("the search ended before a single setting was tried")
