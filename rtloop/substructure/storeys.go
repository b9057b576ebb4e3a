package substructure

import (
	"errors"
	"fmt"

	"gonum.org/v1/gonum/mat"
)

// Storey is one storey of a shear building: a mass on a storey that resists
// its drift, the displacement of its level less that of the level below.
type Storey struct {
	Mass      float64 // of the level on top of the storey, kg, > 0
	Stiffness float64 // against drift, N/m, ≥ 0; the initial one where the storey yields
	Damping   float64 // dashpot against drift, N·s/m, ≥ 0; only where no damping ratio is given

	// YieldDisplacement is the drift, m, at which the storey yields; 0 means
	// that it stays linear. A storey that yields has the force
	//
	//	k (H d + (1−H) d_y z),  d_y ż = ḋ (1 − |z| (½ sgn(ḋ z) + ½))
	//
	// of drift d (Bouc-Wen with exponent 1), with k the Stiffness, d_y the
	// YieldDisplacement and H the Hardening.
	YieldDisplacement float64
	Hardening         float64 // stiffness after yielding over the initial one, 0 to 1
}

// FromStoreys builds a shear building from its storeys, the lowest first.
// Storey i joins level i−1 to level i. Damping comes from the ratios, or,
// where there are none, from the storeys' dashpots; to give both is an error.
// Errors name the storey and its setting.
func FromStoreys(storeys []Storey, d Damping, at []Attachment) (*Structure, error) {
	s, err := assemble(storeys, d)
	if err == nil {
		err = s.finish(d, at)
	}
	if err != nil {
		return nil, err
	}
	return s, nil
}

func assemble(storeys []Storey, d Damping) (*Structure, error) {
	n := len(storeys)
	if n < 1 || n > MaxLevels {
		return nil, fmt.Errorf("storeys: there must be 1 to %d, there are %d", MaxLevels, n)
	}
	s := &Structure{
		n:         n,
		mass:      mat.NewSymDense(n, nil),
		damping:   mat.NewSymDense(n, nil),
		stiffness: mat.NewSymDense(n, nil),
		influence: ones(n),
	}
	for i, st := range storeys {
		if err := st.check(d); err != nil {
			return nil, fmt.Errorf("storey %d: %w", i+1, err)
		}
		j := joint{from: i - 1, to: i}
		s.mass.SetSym(i, i, st.Mass)
		j.addStiffness(s.damping, st.Damping)
		if st.YieldDisplacement > 0 {
			s.storeys = append(s.storeys, hystereticStorey{
				joint: j, stiffness: st.Stiffness, yield: st.YieldDisplacement, hardening: st.Hardening,
			})
		} else {
			j.addStiffness(s.stiffness, st.Stiffness)
		}
	}
	return s, nil
}

func (st Storey) check(d Damping) error {
	switch {
	case !finite(st.Mass) || st.Mass <= 0:
		return fmt.Errorf("mass: must be above 0 kg, is %v", st.Mass)
	case !finite(st.Stiffness) || st.Stiffness < 0:
		return fmt.Errorf("stiffness: must be at least 0 N/m, is %v", st.Stiffness)
	case !finite(st.Damping) || st.Damping < 0:
		return fmt.Errorf("damping: must be at least 0 N·s/m, is %v", st.Damping)
	case st.Damping != 0 && len(d.Ratios) > 0:
		return errors.New("damping: cannot be given together with a damping ratio")
	case !finite(st.YieldDisplacement) || st.YieldDisplacement < 0:
		return fmt.Errorf("yield_displacement: must be at least 0 m, is %v", st.YieldDisplacement)
	case !(st.Hardening >= 0 && st.Hardening <= 1):
		return fmt.Errorf("hardening: must be 0 to 1, is %v", st.Hardening)
	case st.YieldDisplacement > 0 && st.Stiffness == 0:
		return errors.New("yield_displacement: a storey without stiffness cannot yield")
	case st.YieldDisplacement == 0 && st.Hardening != 0:
		return errors.New("hardening: needs a yield_displacement")
	}
	return nil
}

func ones(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = 1
	}
	return v
}
