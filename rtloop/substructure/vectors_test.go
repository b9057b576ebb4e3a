package substructure

import (
	"fmt"
	"maps"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// The textbook forms of all methods, written in NumPy, under the same
// motion, with a spring specimen fed back.
func TestAgainstNumPy(t *testing.T) {
	c := columns(t, "testdata/three_storeys.csv")
	maps.Copy(c, columns(t, "testdata/three_storeys_weighted.csv"))
	const several = 4
	ground := interpolated(c["ground_m_s2"], several)
	s, spring := threeStoreys(t)
	for m, prefix := range map[method]string{
		{"newmark-explicit", 0}: "newmark", {"CR", 0}: "cr", {"KR-alpha", 0.5}: "kr50", {"KR-alpha", 1}: "kr100",
		{"alpha-OS", -0.05}: "os05", {"alpha-OS", -1.0 / 3}: "os33",
	} {
		l := newLoaded(s, m.build(t, s, knot/several), spring)
		sent := make([]float64, 3)
		for k, ug := range ground {
			if k == 0 {
				l.start(ug)
			} else {
				l.in.Predict()
				copy(sent, l.in.X())
				l.in.Correct(l.load(ug))
			}
			if k%several != 0 {
				continue
			}
			for i := range 3 {
				if want := c[fmt.Sprintf("%s.t%d", prefix, i+1)]; want != nil { // the predictor
					near(t, fmt.Sprintf("%s target %d step %d", m, i+1, k), sent[i], want[k/several], 1e-12*peak(want))
				}
				for letter, got := range map[string]float64{"x": l.in.X()[i], "v": l.in.V()[i], "a": l.in.A()[i]} {
					want := c[fmt.Sprintf("%s.%s%d", prefix, letter, i+1)]
					// Rounding of 512 steps in another order of operations.
					near(t, fmt.Sprintf("%s %s%d step %d", m, letter, i+1, k), got, want[k/several], 1e-12*peak(want))
				}
			}
		}
	}
}

// missed runs a motion with so many steps to a knot and returns the largest
// error of the displacements at knots, over their peak.
func missed(t *testing.T, name string, s *Structure, spring float64, motion []float64, c map[string][]float64, prefix string, several int) float64 {
	l := newLoaded(s, mustNew(t, name, s, knot/float64(several)), spring)
	worst, largest := 0.0, 0.0
	for k, ug := range interpolated(motion, several) {
		if k == 0 {
			l.start(ug)
		} else {
			l.step(ug)
		}
		if k%several == 0 {
			for i, x := range l.in.X() {
				want := c[fmt.Sprintf("%sx%d", prefix, i+1)][k/several]
				worst, largest = math.Max(worst, math.Abs(x-want)), math.Max(largest, math.Abs(want))
			}
		}
	}
	return worst / largest
}

// Against SciPy's lsim, which is exact for these motions, and against solve_ivp
// for a building whose lower storey yields (seven yield drifts at the peak).
// From 8 to 64 steps to a knot the error falls to 1/64: second order. Where
// the load jumps at t = 0, CR and KR-alpha are of first order, and fall to 1/8.
func TestOrderAgainstSciPy(t *testing.T) {
	linear, spring := threeStoreys(t)
	yielding := twoYielding(t)
	three, two := columns(t, "testdata/three_storeys.csv"), columns(t, "testdata/yielding.csv")
	quiet := append([]float64{0}, three["ground_m_s2"][1:]...)
	for _, c := range []struct {
		what       string
		method     string
		s          *Structure
		spring     float64
		motion     []float64
		vectors    map[string][]float64
		prefix     string
		fall       float64
		slack      float64 // of the fall, relative
		largestEnd float64 // error at 64 steps, over the peak
	}{
		// Terms of the next order leave the fall some hundredths off.
		{"linear", "newmark-explicit", linear, spring, quiet, three, "quiet.", 64, 0.03, 1e-5},
		{"linear", "CR", linear, spring, quiet, three, "quiet.", 64, 0.03, 1e-5},
		{"load jumps", "newmark-explicit", linear, spring, three["ground_m_s2"], three, "exact.", 64, 0.03, 1e-5},
		{"load jumps", "CR", linear, spring, three["ground_m_s2"], three, "exact.", 8, 0.03, 3e-4},
		// The kinks of a storey that yields come anywhere in a step.
		{"linear", "KR-alpha", linear, spring, quiet, three, "quiet.", 64, 0.03, 1e-5},
		{"linear", "alpha-OS", linear, spring, quiet, three, "quiet.", 64, 0.03, 2e-5},
		{"load jumps", "KR-alpha", linear, spring, three["ground_m_s2"], three, "exact.", 8, 0.03, 3e-4},
		{"load jumps", "alpha-OS", linear, spring, three["ground_m_s2"], three, "exact.", 64, 0.03, 2e-5},
		{"yielding", "KR-alpha", yielding, 0, two["ground_m_s2"], two, "", 64, 0.3, 1e-4},
		{"yielding", "alpha-OS", yielding, 0, two["ground_m_s2"], two, "", 64, 0.3, 1e-4},
		{"yielding", "newmark-explicit", yielding, 0, two["ground_m_s2"], two, "", 64, 0.3, 1e-5},
		{"yielding", "CR", yielding, 0, two["ground_m_s2"], two, "", 64, 0.3, 1e-4},
	} {
		coarse := missed(t, c.method, c.s, c.spring, c.motion, c.vectors, c.prefix, 8)
		fine := missed(t, c.method, c.s, c.spring, c.motion, c.vectors, c.prefix, 64)
		t.Logf("%s, %s: error %.3g of peak at 8 steps to a knot, %.3g at 64: fell to 1/%.4g", c.what, c.method, coarse, fine, coarse/fine)
		if math.Abs(coarse/fine/c.fall-1) > c.slack || fine > c.largestEnd {
			t.Errorf("%s, %s: error %.3g at 8 steps to a knot, %.3g at 64; want it to fall to 1/%v, below %v",
				c.what, c.method, coarse, fine, c.fall, c.largestEnd)
		}
	}
}

// The same building in drifts q instead of displacements x = T q has full
// matrices TᵀM T, TᵀK T and the influence T⁻¹ι = (1, 0, 0); its response must
// be the same building's.
func TestFullMatricesAreTheSameBuilding(t *testing.T) {
	storeys, spring := threeStoreys(t)
	transform := mat.NewDense(3, 3, []float64{1, 0, 0, 1, 1, 0, 1, 1, 1})
	congruent := func(m mat.Matrix) *mat.SymDense {
		var p mat.Dense
		p.Product(transform.T(), m, transform)
		s, err := Symmetric(3, p.RawMatrix().Data)
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	full, err := FromMatrices(congruent(storeys.Mass()), congruent(storeys.Stiffness()), congruent(storeys.Damping()),
		[]float64{1, 0, 0}, Damping{}, []Attachment{{From: 0, To: 1, Stiffness: spring}})
	if err != nil {
		t.Fatal(err)
	}
	for i, w := range storeys.Frequencies() {
		near(t, "ω", full.Frequencies()[i], w, 1e-13*w)
	}
	ground := interpolated(columns(t, "testdata/three_storeys.csv")["ground_m_s2"], 4)
	for _, name := range Names() {
		a := newLoaded(storeys, mustNew(t, name, storeys, knot/4), spring)
		b := newLoaded(full, mustNew(t, name, full, knot/4), spring)
		a.start(ground[0])
		b.start(ground[0])
		for k, ug := range ground[1:] {
			a.step(ug)
			b.step(ug)
			sum := 0.0
			for i, q := range b.in.X() {
				sum += q
				near(t, fmt.Sprintf("%s step %d level %d", name, k+1, i+1), sum, a.in.X()[i], 1e-12*0.06) // rounding of the peak, 0.06 m
			}
			for what, pair := range map[string][2]float64{
				"vᵀM v":  {full.VMV(b.in.V()), storeys.VMV(a.in.V())},
				"vᵀC v":  {full.VCV(b.in.V()), storeys.VCV(a.in.V())},
				"aᵀM a":  {full.AMA(b.in.A()), storeys.AMA(a.in.A())},
				"strain": {b.in.Strain(), a.in.Strain()},
			} {
				near(t, fmt.Sprintf("%s step %d %s", name, k+1, what), pair[0], pair[1], 1e-10*(pair[1]+1)) // energies run to 1e4 J
			}
		}
	}
}
