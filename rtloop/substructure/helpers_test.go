package substructure

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"

	"antelag/scenarios/kind"
)

func mustStoreys(tb testing.TB, storeys []Storey, d Damping, at ...Attachment) *Structure {
	tb.Helper()
	s, err := FromStoreys(storeys, d, at)
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

func mustNew(tb testing.TB, name string, s *Structure, dt float64) Integrator {
	tb.Helper()
	in, err := New(name, s, dt)
	if err != nil {
		tb.Fatal(err)
	}
	return in
}

// method is an integrator with its own setting, if it has one.
type method struct {
	name    string
	setting float64
}

func (m method) String() string {
	if s := m.settings(); s != nil {
		return m.name + " " + strconv.FormatFloat(m.setting, 'g', 3, 64)
	}
	return m.name
}

func (m method) settings() kind.Values {
	switch m.name {
	case "KR-alpha":
		return kind.Values{"rho_infinity": kind.Num(m.setting)}
	case "alpha-OS":
		return kind.Values{"alpha": kind.Num(m.setting)}
	}
	return nil
}

func (m method) build(tb testing.TB, s *Structure, dt float64) Integrator {
	tb.Helper()
	in, err := NewWith(m.name, s, dt, m.settings())
	if err != nil {
		tb.Fatal(err)
	}
	return in
}

// undissipative are all methods, set to no numerical damping.
var undissipative = []method{{"newmark-explicit", 0}, {"CR", 0}, {"KR-alpha", 1}, {"alpha-OS", 0}}

// columns reads a CSV of numbers into its columns by name.
func columns(tb testing.TB, file string) map[string][]float64 {
	tb.Helper()
	f, err := os.Open(file)
	if err != nil {
		tb.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		tb.Fatal(err)
	}
	out := map[string][]float64{}
	for j, name := range rows[0] {
		for _, row := range rows[1:] {
			v, err := strconv.ParseFloat(row[j], 64)
			if err != nil {
				tb.Fatal(err)
			}
			out[name] = append(out[name], v)
		}
	}
	return out
}

// near reports an error unless got is within tol of want.
func near(tb testing.TB, what string, got, want, tol float64) {
	tb.Helper()
	if !(math.Abs(got-want) <= tol) {
		tb.Errorf("%s = %.15g, want %.15g ± %.2g (off by %.2g)", what, got, want, tol, got-want)
	}
}

func peak(v []float64) float64 {
	p := 0.0
	for _, x := range v {
		p = math.Max(p, math.Abs(x))
	}
	return p
}

// loaded drives an integrator with a ground motion and, at attachment 0 if
// there is one, with a perfect spring specimen that answers without delay.
type loaded struct {
	s      *Structure
	in     Integrator
	spring float64
	p      []float64
}

func newLoaded(s *Structure, in Integrator, spring float64) *loaded {
	return &loaded{s, in, spring, make([]float64, s.N())}
}

func (l *loaded) load(ug float64) []float64 {
	l.s.GroundLoad(l.p, ug)
	if l.spring != 0 {
		l.s.AddForce(l.p, 0, l.spring*l.s.Project(l.in.X(), 0))
	}
	return l.p
}

func (l *loaded) start(ug float64) { l.in.Start(nil, l.load(ug)) }

func (l *loaded) step(ug float64) {
	l.in.Predict()
	l.in.Correct(l.load(ug))
}

// threeStoreys is the structure of testdata/vectors.py.
func threeStoreys(tb testing.TB) (s *Structure, spring float64) {
	spring = 6e6
	return mustStoreys(tb, []Storey{
		{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6},
	}, Damping{Ratios: []float64{0.02, 0.05}}, Attachment{From: 0, To: 1, Stiffness: spring}), spring
}

// twoYielding is the other structure of testdata/vectors.py.
func twoYielding(tb testing.TB) *Structure {
	return mustStoreys(tb, []Storey{
		{Mass: 60e3, Stiffness: 18e6, Damping: 100e3, YieldDisplacement: 0.006, Hardening: 0.05},
		{Mass: 50e3, Stiffness: 15e6, Damping: 80e3},
	}, Damping{})
}

// The motions of the vectors are linear between knots.
const knot = 1.0 / 64

// interpolated returns the samples of a motion given at knots, several to a
// knot.
func interpolated(knots []float64, several int) []float64 {
	out := make([]float64, 0, (len(knots)-1)*several+1)
	for i := range len(knots) - 1 {
		for j := range several {
			f := float64(j) / float64(several)
			out = append(out, knots[i]*(1-f)+knots[i+1]*f)
		}
	}
	return append(out, knots[len(knots)-1])
}
