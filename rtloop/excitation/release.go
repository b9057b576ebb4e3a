package excitation

import (
	"fmt"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var releaseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "release",
		Doc:      "free vibration: a level is held displaced and let go at the first instant",
		Equation: "x_level(0) = A held statically, v(0) = 0, no ground motion",
		Source:   "common practice (snap-back test)",
		Settings: []kind.Setting{
			kind.Number("amplitude", quantity.Length, "displacement A at which the level is held").Range(-10, 10),
			kind.Integer("level", "the level that is held, 1 the lowest, 0 the topmost").Default(0).Range(0, 1000),
		},
	},
	New: newRelease,
}

// release is a ground at rest under a structure whose given level is held at
// the displacement A, m, by one static force and let go at t = 0. Every sample
// is zero; Initial says the rest. It means something only where there is a
// numerical structure on a ground, so it refuses to drive a force or a target.
type release struct {
	displacement float64
	level        int
}

var _ Release = (*release)(nil)

func newRelease(c Context, v kind.Values) (Source, error) {
	if _, err := c.clock(); err != nil {
		return nil, err
	}
	if c.Drives != Ground {
		return nil, fmt.Errorf("drives: release holds a level and lets it go, with drives = %q only, not %q",
			Words[Ground], Words[c.Drives])
	}
	return &release{v.Num("amplitude"), v.Int("level")}, nil
}

func (s *release) Fill(dst []float64) { clear(dst) }

func (s *release) Initial() (displacement float64, level int) { return s.displacement, s.level }
