package substructure

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"testing"

	"antelag/scenarios/kind"

	"gonum.org/v1/gonum/mat"
)

func TestStoreysRefused(t *testing.T) {
	good := Storey{Mass: 60e3, Stiffness: 18e6}
	one := func(s Storey) []Storey { return []Storey{good, s} }
	for _, c := range []struct {
		name    string
		storeys []Storey
		ratios  []float64
		at      []Attachment
		want    string
	}{
		{"no storeys", nil, nil, nil, "storeys: there must be 1 to 60, there are 0"},
		{"too many", make([]Storey, 61), nil, nil, "storeys: there must be 1 to 60, there are 61"},
		{"no mass", one(Storey{Stiffness: 1}), nil, nil, "storey 2: mass: must be above 0 kg, is 0"},
		{"NaN mass", one(Storey{Mass: math.NaN(), Stiffness: 1}), nil, nil, "storey 2: mass: must be above 0 kg, is NaN"},
		{"negative stiffness", one(Storey{Mass: 1, Stiffness: -1}), nil, nil, "storey 2: stiffness: must be at least 0 N/m, is -1"},
		{"infinite stiffness", one(Storey{Mass: 1, Stiffness: math.Inf(1)}), nil, nil, "storey 2: stiffness: must be at least 0 N/m, is +Inf"},
		{"negative dashpot", one(Storey{Mass: 1, Stiffness: 1, Damping: -1}), nil, nil, "storey 2: damping: must be at least 0 N·s/m, is -1"},
		{"dashpot and ratio", one(Storey{Mass: 1, Stiffness: 1, Damping: 1}), []float64{0.03}, nil, "storey 2: damping: cannot be given together with a damping ratio"},
		{"negative yield", one(Storey{Mass: 1, Stiffness: 1, YieldDisplacement: -1}), nil, nil, "storey 2: yield_displacement: must be at least 0 m, is -1"},
		{"hardening above 1", one(Storey{Mass: 1, Stiffness: 1, YieldDisplacement: 1, Hardening: 2}), nil, nil, "storey 2: hardening: must be 0 to 1, is 2"},
		{"hardening alone", one(Storey{Mass: 1, Stiffness: 1, Hardening: 0.1}), nil, nil, "storey 2: hardening: needs a yield_displacement"},
		{"yields without stiffness", one(Storey{Mass: 1, YieldDisplacement: 1}), nil, nil, "storey 2: yield_displacement: a storey without stiffness cannot yield"},
		{"negative ratio", one(good), []float64{-0.1}, nil, "damping_ratio: must be at least 0, is -0.1"},
		{"three ratios", one(good), []float64{0.1, 0.1, 0.1}, nil, "damping_ratio: must be one ratio or two, are 3"},
		{"two ratios, one mode", []Storey{good}, []float64{0.1, 0.2}, nil, "damping_ratio: two ratios need two modes of different frequency"},
		{"level above the top", one(good), nil, []Attachment{{0, 3, 1}}, "channel 1: between: levels must be 0 to 2, are 0 and 3"},
		{"level below the ground", one(good), nil, []Attachment{{0, 1, 1}, {-1, 1, 1}}, "channel 2: between: levels must be 0 to 2, are -1 and 1"},
		{"twice the same level", one(good), nil, []Attachment{{1, 1, 1}}, "channel 1: between: the two levels must differ, both are 1"},
		{"NaN specimen", one(good), nil, []Attachment{{0, 1, math.NaN()}}, "channel 1: the specimen's initial stiffness is NaN"},
		{"mechanism", []Storey{good, good, {Mass: 1}, good}, nil, nil, "stiffness: level 3 is a free mechanism: neither a storey nor a specimen holds it at rest (an open gap, a damper and a mass do not)"},
		{"mechanism with a specimen elsewhere", one(Storey{Mass: 1}), nil, []Attachment{{0, 1, 1e6}}, "stiffness: level 2 is a free mechanism: neither a storey nor a specimen holds it at rest (an open gap, a damper and a mass do not)"},
		{"nothing at all", []Storey{{Mass: 1}}, nil, nil, "stiffness: level 1 is a free mechanism: neither a storey nor a specimen holds it at rest (an open gap, a damper and a mass do not)"},
		{"specimen that pushes over", one(good), nil, []Attachment{{0, 2, -18e6}}, "stiffness: the whole structure, specimens included, is not positive definite; it gives way at level 1"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := FromStoreys(c.storeys, Damping{Ratios: c.ratios}, c.at)
			refused(t, err, ""+c.want)
		})
	}
}

// A storey without stiffness is sound where a specimen holds the level: the
// hybrid test whose specimen is the whole storey.
func TestSpecimenHoldsALevel(t *testing.T) {
	mustStoreys(t, []Storey{{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3}}, Damping{Ratios: []float64{0.03}},
		Attachment{From: 1, To: 2, Stiffness: 15e6})
}

func TestMatricesRefused(t *testing.T) {
	sym := func(v ...float64) *mat.SymDense { return mat.NewSymDense(int(math.Sqrt(float64(len(v)))), v) }
	m, k := sym(2, 0, 0, 1), sym(3, -1, -1, 1)
	for _, c := range []struct {
		name                     string
		mass, stiffness, damping *mat.SymDense
		influence, ratios        []float64
		want                     string
	}{
		{"no mass", nil, k, nil, nil, nil, "mass: is missing"},
		{"no stiffness", m, nil, nil, nil, nil, "stiffness: is missing"},
		{"stiffness of other size", m, sym(1), nil, nil, nil, "stiffness: must have 2 rows like the mass, has 1"},
		{"damping of other size", m, k, sym(1), nil, nil, "damping: must have 2 rows like the mass, has 1"},
		{"too large", mat.NewSymDense(61, nil), k, nil, nil, nil, "mass: must have 1 to 60 rows, has 61"},
		{"influence of other size", m, k, nil, []float64{1}, nil, "influence: must have 2 elements like the mass, has 1"},
		{"NaN influence", m, k, nil, []float64{1, math.NaN()}, nil, "influence: an element is NaN"},
		{"NaN stiffness", m, sym(1, math.NaN(), math.NaN(), 1), nil, nil, nil, "stiffness: element (1, 2) is NaN"},
		{"indefinite mass", sym(1, 2, 2, 1), k, nil, nil, nil, "mass: the matrix is not positive definite"},
		{"massless level", sym(1, 0, 0, 0), k, nil, nil, nil, "mass: the matrix is not positive definite"},
		{"damping that feeds", m, k, sym(-1, 0, 0, 1), nil, nil, "damping: the matrix has the negative eigenvalue -1"},
		{"damping and ratio", m, k, sym(1, 0, 0, 1), nil, []float64{0.03}, "damping: cannot be given together with a damping ratio"},
		{"indefinite stiffness", m, sym(1, 0, 0, -1), nil, nil, nil, "stiffness: the whole structure, specimens included, is not positive definite; it gives way at level 2"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := FromMatrices(c.mass, c.stiffness, c.damping, c.influence, Damping{Ratios: c.ratios}, nil)
			refused(t, err, ""+c.want)
		})
	}
}

func TestSymmetric(t *testing.T) {
	m, err := Symmetric(2, []float64{2, -1, -1 - 1e-9, 1})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "mean of the two", m.At(0, 1), -1-0.5e-9, 1e-16)
	for _, c := range []struct {
		rows     int
		elements []float64
		want     string
	}{
		{0, nil, "must have 1 to 60 rows, has 0"},
		{2, []float64{1, 2, 3}, "must be square: 2 rows take 4 elements, there are 3"},
		{2, []float64{1, 2, math.Inf(1), 3}, "element (2, 1) is +Inf"},
		{2, []float64{2, -1, -1.00000001, 1}, "is not symmetric: element (1, 2) is -1, (2, 1) is -1.00000001"},
	} {
		_, err := Symmetric(c.rows, c.elements)
		refused(t, err, c.want)
	}
}

func TestIntegratorsRefused(t *testing.T) {
	s, _ := threeStoreys(t)
	for _, dt := range []float64{0, -0.01, math.NaN(), math.Inf(1)} {
		_, err := New("CR", s, dt)
		refused(t, err, fmt.Sprintf("integrator: the step must be above 0 s, is %v", dt))
	}
	for _, c := range []struct {
		name, setting string
		value         float64
		want          string
	}{
		{"KR-alpha", "rho_infinity", 1.1, "rho_infinity: 1.1 is above 1; allowed is a plain number, 0 to 1"},
		{"KR-alpha", "rho_infinity", math.NaN(), "rho_infinity: NaN is no finite number; allowed is a plain number, 0 to 1"},
		{"alpha-OS", "alpha", 0.05, "alpha: 0.05 is above 0; allowed is a plain number, -0.333333 to 0"},
		{"alpha-OS", "alpha", -0.5, "alpha: -0.5 is below -0.333333; allowed is a plain number, -0.333333 to 0"},
		{"CR", "alpha", 0, `unknown setting of CR "alpha" (none exists)`},
	} {
		_, err := NewWith(c.name, s, 0.01, kind.Values{c.setting: kind.Num(c.value)})
		refused(t, err, "integrator: "+c.name+": "+c.want)
	}
	_, err := New("newmark", s, 0.01)
	var unknown *kind.UnknownError
	if !errors.As(err, &unknown) || unknown.Got != "newmark" || !slices.Equal(unknown.Known, Names()) {
		t.Errorf("error for an unknown integrator is %v", err)
	}
}

func refused(t *testing.T, err error, want string) {
	t.Helper()
	switch {
	case err == nil:
		t.Errorf("was taken; want the error %q", want)
	case err.Error() != want:
		t.Errorf("error\n%s\nwant\n%s", err, want)
	}
}
