package figure

import (
	"errors"
	"fmt"
	"math"
)

// check refuses what cannot be drawn: a mistake of the caller, named.
func (f Figure) check() error {
	if len(f.Panels) == 0 {
		return errors.New("a figure needs a panel")
	}
	for _, size := range []float64{f.Width, f.Height} {
		if size != 0 && !(size >= leastSize && size <= mostSize) {
			return fmt.Errorf("a figure is %g to %g mm wide and high, not %g", leastSize, mostSize, size)
		}
	}
	for i, p := range f.Panels {
		if err := p.check(); err != nil {
			return fmt.Errorf("panel %d: %w", i+1, err)
		}
	}
	return nil
}

func (p Panel) check() error {
	for _, l := range p.Lines {
		n := len(l.X)
		if len(l.Y) != n {
			return fmt.Errorf("line %q has %d values of X and %d of Y", l.Name, n, len(l.Y))
		}
		if len(l.Low) != len(l.High) || len(l.Low) != 0 && len(l.Low) != n {
			return fmt.Errorf("line %q has %d points and a band of %d and %d", l.Name, n, len(l.Low), len(l.High))
		}
	}
	if p.Map == nil {
		return nil
	}
	return p.Map.check()
}

func (m *Map) check() error {
	for _, axis := range [][]float64{m.X, m.Y} {
		if len(axis) < 2 {
			return fmt.Errorf("a map needs two values each way, not %d", len(axis))
		}
		for i, v := range axis {
			if !finite(v) || i > 0 && v <= axis[i-1] {
				return errors.New("a map's values along an axis must increase")
			}
		}
	}
	if len(m.Z) != len(m.Y) {
		return fmt.Errorf("a map has %d rows for %d values of Y", len(m.Z), len(m.Y))
	}
	for iy, row := range m.Z {
		if len(row) != len(m.X) {
			return fmt.Errorf("row %d of a map has %d cells for %d values of X", iy, len(row), len(m.X))
		}
	}
	return nil
}

// What can be placed: numbers so far from the largest and the smallest there are
// that sums, differences and ratios are numbers too.
const (
	largest  = 1e100
	smallest = 1e-100 // on a logarithmic axis
)

func finite(v float64) bool { return math.Abs(v) <= largest }

// placeable reports whether an axis can show a value.
func placeable(v float64, log bool) bool { return finite(v) && !(log && v < smallest) }
