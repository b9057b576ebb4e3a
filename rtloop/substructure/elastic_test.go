package substructure

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Elastic is the structure that would have been built had its storeys not been able
// to yield, and small motions are those of it.
func TestElastic(t *testing.T) {
	storeys := []Storey{{Mass: 60e3, Stiffness: 2e7, YieldDisplacement: 0.01, Hardening: 0.1}, {Mass: 50e3, Stiffness: 1.5e7}, {Mass: 40e3, Stiffness: 1e7, YieldDisplacement: 0.02}}
	at := []Attachment{{From: 0, To: 1, Stiffness: 3e6}}
	damping := Damping{Ratios: []float64{0.03}}
	yielding, err := FromStoreys(storeys, damping, at)
	if err != nil {
		t.Fatal(err)
	}
	for i := range storeys {
		storeys[i].YieldDisplacement, storeys[i].Hardening = 0, 0
	}
	linear, err := FromStoreys(storeys, damping, at)
	if err != nil {
		t.Fatal(err)
	}
	elastic := yielding.Elastic()
	for name, pair := range map[string][2]mat.Symmetric{
		"K": {elastic.Stiffness(), linear.Stiffness()}, "C": {elastic.Damping(), linear.Damping()}, "total K": {elastic.TotalStiffness(), linear.TotalStiffness()},
	} {
		if !mat.EqualApprox(pair[0], pair[1], 1e-6) {
			t.Errorf("%s differs", name)
		}
	}
	if elastic.Yields() || !yielding.Yields() || linear.Elastic() != linear {
		t.Error("what yields and what does not")
	}
	for _, name := range Names() {
		a, err := New(name, yielding, 1.0/512)
		if err != nil {
			t.Fatal(err)
		}
		b, err := New(name, elastic, 1.0/512)
		if err != nil {
			t.Fatal(err)
		}
		p := make([]float64, 3)
		largest, worst := 0.0, 0.0
		for k := range 1000 {
			p[0] = 1e-3 * math.Sin(0.1*float64(k)) // some 1e-8 of what makes it yield
			for _, in := range []Integrator{a, b} {
				in.Predict()
				in.Correct(p)
			}
			for i := range p {
				largest, worst = max(largest, math.Abs(b.X()[i])), max(worst, math.Abs(a.X()[i]-b.X()[i]))
			}
		}
		if !(worst < 1e-6*largest) {
			t.Errorf("%s: displacements differ by %g of the largest", name, worst/largest)
		}
	}
}
