package substructure

import (
	"errors"
	"fmt"
	"math"
)

// Damping says where C comes from: without Ratios from the storeys' dashpots
// or the given matrix; with one ratio from Rayleigh damping of which modes 1
// and last have that ratio; with two, modes 1 and last have each its own. The
// modes are those of the whole structure, initial stiffness of specimens and
// hysteretic storeys included.
type Damping struct{ Ratios []float64 }

// damp sets C to Rayleigh damping C = a₀M + a₁K_total where ratios are given,
// which gives a mode of frequency ω the ratio a₀/(2ω) + a₁ω/2. One mode alone
// has C = 2ζωM.
func (s *Structure) damp(d Damping) error {
	for _, z := range d.Ratios {
		if !finite(z) || z < 0 {
			return fmt.Errorf("damping_ratio: must be at least 0, is %v", z)
		}
	}
	var z1, zn float64
	switch len(d.Ratios) {
	case 0:
		return nil
	case 1:
		z1, zn = d.Ratios[0], d.Ratios[0]
	case 2:
		z1, zn = d.Ratios[0], d.Ratios[1]
	default:
		return fmt.Errorf("damping_ratio: must be one ratio or two, are %d", len(d.Ratios))
	}
	a0, a1, err := rayleigh(s.frequencies[0], s.frequencies[s.n-1], z1, zn)
	if err != nil {
		return err
	}
	for i := range s.n {
		for j := i; j < s.n; j++ {
			s.damping.SetSym(i, j, a0*s.mass.At(i, j)+a1*s.total.At(i, j))
		}
	}
	return nil
}

// rayleigh returns a₀, 1/s, and a₁, s, for ratios z1 at w1 and zn at wn.
func rayleigh(w1, wn, z1, zn float64) (a0, a1 float64, err error) {
	if wn-w1 <= symmetryTolerance*wn { // one mode, or all the same
		if math.Abs(zn-z1) > symmetryTolerance*z1 {
			return 0, 0, errors.New("damping_ratio: two ratios need two modes of different frequency")
		}
		return 2 * z1 * w1, 0, nil
	}
	spread := wn*wn - w1*w1
	a0 = 2 * w1 * wn * (z1*wn - zn*w1) / spread
	a1 = 2 * (zn*wn - z1*w1) / spread
	return a0, a1, nil
}
