package margin

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"antelag/rtloop/stability"
	"antelag/scenarios"
)

// Measure is what a map is drawn of.
type Measure int

const (
	Damping Measure = iota // damping ratio of the least damped mode
	Radius                 // spectral radius
)

// Grid is a map over two settings, SI. Values are NaN where the settings make no
// test.
type Grid struct {
	Scenario, Lane string

	X, Y    Range
	Radius  [][]float64 // spectral radius, [iy][ix]
	Damping [][]float64 // damping ratio of the least damped mode
	// AtX and AtY are the settings of the scenario itself, NaN where it leaves one
	// out.
	AtX, AtY float64
	Measure  Measure
	// Refused is how many cells make no test, and Reason why the first does not.
	Refused int
	Reason  error
	// Whole is how many cells were worked out; fewer than all after a break.
	Whole int
}

// Values returns what the map is drawn of.
func (g *Grid) Values() [][]float64 {
	if g.Measure == Radius {
		return g.Radius
	}
	return g.Damping
}

// Stable reports whether the loop of a cell is stable; ok is false where there is
// none.
func (g *Grid) Stable(ix, iy int) (stable, ok bool) {
	r := g.Radius[iy][ix]
	return r <= 1+Neutral, !math.IsNaN(r)
}

// Map judges a scenario over two settings. Rows are worked out side by side, each by
// itself, so the result is the same for any number of workers. After ctx has ended
// it returns what there is, with ctx's error.
func Map(ctx context.Context, s *scenarios.Scenario, x, y Range, o Options) (*Grid, error) {
	if err := s.CheckLane(o.lane()); err != nil {
		return nil, err
	}
	if err := checkRanges(s, &x, &y); err != nil {
		return nil, err
	}
	s, err := s.Plain()
	if err != nil {
		return nil, err
	}
	c := &chart{s: s, o: o, grid: &Grid{Scenario: s.Name, Lane: o.lane(), X: x, Y: y, AtX: current(s, x.Path), AtY: current(s, y.Path), Measure: o.Measure}}
	g := c.grid
	for range y.N {
		g.Radius = append(g.Radius, unknown(x.N))
		g.Damping = append(g.Damping, unknown(x.N))
	}
	// A scenario that has no margin at all is an error, not an empty map.
	if _, _, err := (&analyst{s: s, o: Options{Lane: o.Lane}}).model(s); err != nil {
		return nil, err
	}
	if err := c.prepare(); err != nil {
		return nil, err
	}
	c.run(ctx)
	if err := ctx.Err(); err != nil {
		return g, err
	}
	if g.Refused == x.N*y.N {
		return nil, fmt.Errorf("%w: %w", errNothing, g.Reason)
	}
	return g, nil
}

func unknown(n int) []float64 {
	row := make([]float64, n)
	for i := range row {
		row[i] = math.NaN()
	}
	return row
}

// current is the value of a setting of the scenario.
func current(s *scenarios.Scenario, path string) float64 {
	at, err := s.Locate(path)
	if err != nil {
		return math.NaN()
	}
	name := at.Setting.Name
	if v, ok := at.Values[name]; ok {
		return v.Num
	}
	return math.NaN()
}

// chart works a map out.
type chart struct {
	s    *scenarios.Scenario
	o    Options
	grid *Grid

	// Where the two settings are of different parts, cells are put together from
	// the models along the axes.
	apart    bool
	ofX, ofY stability.Blocks
	alongX   []*stability.Model
	alongY   []*stability.Model

	lock sync.Mutex
	done atomic.Int64
}

// prepare looks at which parts the settings change.
func (c *chart) prepare() error {
	var okX, okY bool
	c.ofX, okX = touched(c.s, c.o.lane(), c.grid.X.Path)
	c.ofY, okY = touched(c.s, c.o.lane(), c.grid.Y.Path)
	if !okX || !okY || c.o.AfterRun || c.ofX.Overlap(c.ofY) {
		return nil
	}
	c.apart = true
	a := &analyst{s: c.s, o: c.o}
	along := func(r *Range) []*stability.Model {
		models := make([]*stability.Model, r.N)
		for i := range models {
			s, err := c.s.With(change(r, i))
			if err == nil {
				models[i], _, err = a.model(s)
			}
			c.refuse(err, 0)
		}
		return models
	}
	c.alongX, c.alongY = along(&c.grid.X), along(&c.grid.Y)
	return nil
}

// errNoTest stands for the reason that is known already.
var errNoTest = errors.New("the settings make no test")

// refuse counts cells that make no test.
func (c *chart) refuse(err error, cells int) {
	if err == nil {
		return
	}
	c.lock.Lock()
	defer c.lock.Unlock()
	c.grid.Refused += cells
	if c.grid.Reason == nil {
		c.grid.Reason = err
	}
}

// run works the rows out.
func (c *chart) run(ctx context.Context) {
	workers := c.o.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	rows := make(chan int)
	var wg sync.WaitGroup
	for range min(workers, c.grid.Y.N) {
		wg.Go(func() {
			for iy := range rows {
				c.row(ctx, iy)
			}
		})
	}
	for iy := range c.grid.Y.N {
		if ctx.Err() != nil {
			break
		}
		rows <- iy
	}
	close(rows)
	wg.Wait()
	c.grid.Whole = int(c.done.Load())
}

func (c *chart) row(ctx context.Context, iy int) {
	g := c.grid
	var near []complex128
	for ix := range g.X.N {
		if ctx.Err() != nil {
			return
		}
		m, err := c.model(ctx, ix, iy)
		var poles []complex128
		if err == nil {
			poles, err = m.Poles(near...)
		}
		switch {
		case ctx.Err() != nil:
			return
		case err == nil:
			g.Radius[iy][ix], g.Damping[iy][ix] = size(poles), m.LeastDamping(poles)
			near = poles
		default:
			c.refuse(err, 1)
			near = nil
		}
		c.advance()
	}
}

// advance counts a cell.
func (c *chart) advance() {
	done := c.done.Add(1)
	if c.o.Progress != nil {
		c.lock.Lock()
		defer c.lock.Unlock()
		c.o.Progress(done, int64(c.grid.X.N)*int64(c.grid.Y.N))
	}
}

// model is that of one cell.
func (c *chart) model(ctx context.Context, ix, iy int) (*stability.Model, error) {
	if c.apart {
		if c.alongX[ix] == nil || c.alongY[iy] == nil {
			return nil, errNoTest
		}
		return c.alongX[ix].Take(c.alongY[iy], c.ofY), nil
	}
	s, err := c.s.With(change(&c.grid.X, ix), change(&c.grid.Y, iy))
	if err != nil {
		return nil, err
	}
	learned, err := learn(ctx, s, c.o, nil)
	if err != nil {
		return nil, err
	}
	m, _, err := (&analyst{s: s, o: c.o, learned: learned}).model(s)
	return m, err
}
