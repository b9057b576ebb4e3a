// Package study runs one scenario many times with some settings changed: on a
// grid, over draws from its [spread], or both. Which run has which values
// follows from the run's number alone, so that runs can be shared out among
// cores, machines and days and still come to the same table, byte for byte.
//
// It knows scenarios and how to judge them; it knows no screen and no command.
package study

import (
	"errors"
	"fmt"
	"math"
	"reflect"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Request is what a study is asked to do, as people say it.
type Request struct {
	Lane     string   // the lane that is judged; "" is the configured one
	Sets     []string // what the scenario was changed by beforehand, PATH=VALUE; to be said again where a run is named
	Over     []string // the grid: ParseAxis
	Draws    int64    // draws from [spread] at every point of the grid; 0: none
	Law      Law
	Sampling Sampling
	Seed     int64
}

// Study is a request, checked against its scenario. It does not change and may
// be used from several goroutines.
type Study struct {
	Scenario *scenarios.Scenario
	Request
	Grid   []Axis
	Spread []Spread // what is drawn, in the order of the paths; nil without draws

	columns []Column
	points  int64 // of the grid
}

// Spread is one setting that is drawn.
type Spread struct {
	scenarios.Spread
	Setting kind.Setting
}

// maxRuns bounds a study: at a thousand runs a second it is a fortnight.
const maxRuns = 1e9

// New checks a request against a scenario.
func New(s *scenarios.Scenario, r Request) (*Study, error) {
	if r.Lane == "" {
		r.Lane = scenarios.Configured
	}
	if err := s.CheckLane(r.Lane); err != nil {
		return nil, err
	}
	st := &Study{Scenario: s, Request: r, points: 1}
	var err error
	if st.Grid, err = axes(s, r.Over); err != nil {
		return nil, err
	}
	for _, a := range st.Grid {
		st.points *= int64(a.N)
		if st.points > maxRuns {
			return nil, fmt.Errorf("the grid has more than %.0e points", maxRuns)
		}
	}
	if err := st.draws(); err != nil {
		return nil, err
	}
	st.columns = columns(s)
	return st, nil
}

// axes parses a grid, in which no setting may stand twice.
func axes(s *scenarios.Scenario, texts []string) ([]Axis, error) {
	var out []Axis
	for _, text := range texts {
		a, err := ParseAxis(s, text)
		if err != nil {
			return nil, fmt.Errorf("--over: %w", err)
		}
		for _, other := range out {
			if Same(s, a.Path, other.Path) {
				return nil, fmt.Errorf("%s is varied twice", a.Path)
			}
		}
		out = append(out, a)
	}
	return out, nil
}

// draws checks what is asked of [spread].
func (st *Study) draws() error {
	switch {
	case st.Draws < 0:
		return fmt.Errorf("%d draws are none; ask for at least 1", st.Draws)
	case st.Draws == 0 && len(st.Grid) == 0:
		return errors.New("nothing varies; give settings to go over, or a number of draws")
	case st.Draws == 0:
		return nil
	case float64(st.points)*float64(st.Draws) > maxRuns:
		return fmt.Errorf("%d draws at %d points are more than %.0e runs", st.Draws, st.points, maxRuns)
	case len(st.Scenario.Spread) == 0:
		return fmt.Errorf("%s has no [spread] to draw from; say how far settings may be from their values, like \"damper.actuator.delay\" = 0.2",
			st.Scenario.Name)
	}
	for _, sp := range st.Scenario.Spread {
		for _, a := range st.Grid {
			if Same(st.Scenario, sp.Path, a.Path) {
				return fmt.Errorf("%s stands in [spread] too; it can be drawn or gone over, not both", a.Path)
			}
		}
		at, err := st.Scenario.Locate(sp.Path)
		if err != nil {
			return err
		}
		st.Spread = append(st.Spread, Spread{sp, at.Setting})
	}
	return nil
}

// Same reports whether two paths lead to one setting; a channel, for one, can
// be called by name or by number.
func Same(s *scenarios.Scenario, a, b string) bool {
	x, err := s.Locate(a)
	if err != nil {
		return false
	}
	y, err := s.Locate(b)
	return err == nil && x.Setting.Name == y.Setting.Name && reflect.ValueOf(x.Values).UnsafePointer() == reflect.ValueOf(y.Values).UnsafePointer()
}

// Runs returns how many runs the study has, numbered from 0. At each point of
// the grid, whose last axis goes fastest, all draws are made, the same at every
// point.
func (st *Study) Runs() int64 { return st.points * max(1, st.Draws) }

// Points returns how many points the grid has, 1 without one.
func (st *Study) Points() int64 { return st.points }

// Paths returns the paths of all settings that vary: those of the grid first,
// then those that are drawn.
func (st *Study) Paths() []string {
	var out []string
	for _, a := range st.Grid {
		out = append(out, a.Path)
	}
	for _, sp := range st.Spread {
		out = append(out, sp.Path)
	}
	return out
}

// Settings describes what varies, in the order of Paths.
func (st *Study) Settings() []kind.Setting {
	var out []kind.Setting
	for _, a := range st.Grid {
		out = append(out, a.Setting)
	}
	for _, sp := range st.Spread {
		out = append(out, sp.Setting)
	}
	return out
}

// Values appends the values of run i, in the order of Paths, SI.
func (st *Study) Values(dst []float64, i int64) []float64 {
	draws := max(1, st.Draws)
	return st.draw(st.gridValues(dst, i/draws), i%draws)
}

// gridValues appends the values at one point of the grid.
func (st *Study) gridValues(dst []float64, point int64) []float64 {
	from := len(dst)
	for range st.Grid {
		dst = append(dst, 0)
	}
	for k := len(st.Grid) - 1; k >= 0; k-- {
		n := int64(st.Grid[k].N)
		dst[from+k] = st.Grid[k].At(int(point % n))
		point /= n
	}
	return dst
}

// Changes are what makes the scenario into that of run i.
func (st *Study) Changes(i int64) []scenarios.Change {
	values := st.Values(nil, i)
	settings := st.Settings()
	var out []scenarios.Change
	for k, path := range st.Paths() {
		out = append(out, scenarios.Change{Path: path, Value: Exact(&settings[k], values[k])})
	}
	return out
}

// Exact writes a value so that it reads back to the same bits.
func Exact(s *kind.Setting, v float64) string {
	if s.Type == kind.IntegerType {
		return fmt.Sprintf("%.0f", math.Round(v))
	}
	return quantity.Exact(v, s.Dim)
}
