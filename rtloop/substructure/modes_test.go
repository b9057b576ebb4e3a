package substructure

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Chopra, Dynamics of Structures, two-storey shear frame with masses 2m, m and
// storey stiffnesses 2k, k (from memory): ω₁ = √(k/2m), ω₂ = √(2k/m), shapes
// (½, 1) and (−1, 1).
func TestModesOfChoprasTwoStoreys(t *testing.T) {
	const m, k = 30e3, 9e6
	s := mustStoreys(t, []Storey{{Mass: 2 * m, Stiffness: 2 * k}, {Mass: m, Stiffness: k}}, Damping{})
	w := s.Frequencies()
	// The eigenvalues carry rounding of the largest, 1e-15, and are near it.
	near(t, "ω₁", w[0], math.Sqrt(k/(2*m)), 1e-13*w[0])
	near(t, "ω₂", w[1], math.Sqrt(2*k/m), 1e-13*w[1])
	near(t, "shape 1", s.Shapes().At(0, 0)/s.Shapes().At(1, 0), 0.5, 1e-13)
	near(t, "shape 2", s.Shapes().At(0, 1)/s.Shapes().At(1, 1), -1, 1e-13)
}

// Blevins: n equal storeys have ω_r = 2√(k/m)·sin((2r−1)π/(2(2n+1))).
func TestModesOfEqualStoreys(t *testing.T) {
	const m, k = 60e3, 18e6
	for _, n := range []int{1, 2, 3, 4, 5, 10, 20, 60} {
		storeys := make([]Storey, n)
		for i := range storeys {
			storeys[i] = Storey{Mass: m, Stiffness: k}
		}
		s := mustStoreys(t, storeys, Damping{})
		for r, w := range s.Frequencies() {
			want := 2 * math.Sqrt(k/m) * math.Sin(float64(2*r+1)*math.Pi/float64(2*(2*n+1)))
			// Rounding of the largest eigenvalue, some n·1e-16, spoils a small
			// ω² absolutely, hence ω in the ratio of the two.
			largest := s.Frequencies()[n-1]
			near(t, fmt.Sprintf("n=%d ω%d", n, r+1), w, want, 1e-15*float64(n+4)*largest*largest/want)
		}
	}
}

func TestShapesAreMassNormalised(t *testing.T) {
	s, _ := threeStoreys(t)
	var m, k mat.Dense
	m.Product(s.Shapes().T(), s.Mass(), s.Shapes())
	k.Product(s.Shapes().T(), s.TotalStiffness(), s.Shapes())
	for i := range 3 {
		for j := range 3 {
			wantM, wantK := 0.0, 0.0
			if i == j {
				wantM, wantK = 1, s.Frequencies()[i]*s.Frequencies()[i]
			}
			near(t, "φᵀMφ", m.At(i, j), wantM, 1e-13)
			near(t, "φᵀKφ", k.At(i, j), wantK, 1e-13*k.At(2, 2))
		}
	}
}

func TestShapesPointUp(t *testing.T) {
	for n := 1; n <= 10; n++ {
		s := equalStoreys(t, n)
		for j := range n {
			column := mat.Col(nil, j, s.Shapes())
			if slices.Max(column) < peak(column)*(1-1e-9) {
				t.Errorf("%d storeys: the largest element of shape %d is negative: %v", n, j+1, column)
			}
		}
	}
}

// A mode of frequency ω has the ratio a₀/2ω + a₁ω/2; the ratios asked for
// come out at modes 1 and last.
func TestRayleighRatiosComeOut(t *testing.T) {
	storeys := []Storey{
		{Mass: 60e3, Stiffness: 18e6}, {Mass: 55e3, Stiffness: 16e6}, {Mass: 50e3, Stiffness: 14e6},
		{Mass: 45e3, Stiffness: 12e6, YieldDisplacement: 0.01}, {Mass: 40e3, Stiffness: 10e6},
	}
	for _, c := range []struct {
		name        string
		storeys     []Storey
		ratios      []float64
		first, last float64
	}{
		{"one ratio", storeys, []float64{0.03}, 0.03, 0.03},
		{"two ratios", storeys, []float64{0.02, 0.05}, 0.02, 0.05},
		{"falling ratios", storeys, []float64{0.05, 0.01}, 0.05, 0.01},
		{"none at mode 1", storeys, []float64{0, 0.05}, 0, 0.05},
		{"one mode", storeys[:1], []float64{0.03}, 0.03, 0.03},
		{"one mode, the same ratio twice", storeys[:1], []float64{0.03, 0.03}, 0.03, 0.03},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := mustStoreys(t, c.storeys, Damping{Ratios: c.ratios}, Attachment{From: 0, To: 1, Stiffness: 6e6})
			n := s.N()
			ratio := func(i, j int) float64 {
				a, b := mat.Col(nil, i, s.Shapes()), mat.Col(nil, j, s.Shapes())
				w := math.Sqrt(s.Frequencies()[i] * s.Frequencies()[j])
				return mat.Inner(mat.NewVecDense(n, a), s.Damping(), mat.NewVecDense(n, b)) / (2 * w)
			}
			near(t, "ζ₁", ratio(0, 0), c.first, 1e-12)
			near(t, "ζ_n", ratio(n-1, n-1), c.last, 1e-12)
			for i := range n {
				if z := ratio(i, i); z < 0 || z > math.Max(c.first, c.last)+1e-12 {
					t.Errorf("mode %d has ratio %v, outside 0 to the larger one asked for", i+1, z)
				}
				for j := range i {
					near(t, "coupling of modes", ratio(i, j), 0, 1e-12)
				}
			}
		})
	}
}

// One storey, 100 t at 1.5 Hz: c = 2ζωm with ω of storey and specimen
// together, however the stiffness is split.
func TestRatioIsOfTheWholeStructure(t *testing.T) {
	w := 2 * math.Pi * 1.5
	k := 100e3 * w * w
	for _, share := range []float64{0, 0.2, 0.5, 1} {
		s := mustStoreys(t, []Storey{{Mass: 100e3, Stiffness: (1 - share) * k}}, Damping{Ratios: []float64{0.03}},
			Attachment{From: 0, To: 1, Stiffness: share * k})
		near(t, "ω₁", s.Frequencies()[0], w, 1e-14*w)
		near(t, "c", s.Damping().At(0, 0), 2*0.03*w*100e3, 1e-14*s.Damping().At(0, 0))
	}
}

func TestAttachmentCountsLikeASpring(t *testing.T) {
	plain := []Storey{{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6}}
	braced := []Storey{{Mass: 60e3, Stiffness: 24e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 15e6}}
	with := mustStoreys(t, plain, Damping{}, Attachment{0, 1, 6e6}, Attachment{3, 2, 3e6})
	as := mustStoreys(t, braced, Damping{})
	if !mat.Equal(with.TotalStiffness(), as.TotalStiffness()) {
		t.Errorf("total stiffness with attachments\n%v\nwith springs\n%v",
			mat.Formatted(with.TotalStiffness()), mat.Formatted(as.TotalStiffness()))
	}
	if !mat.Equal(with.Stiffness(), mustStoreys(t, plain, Damping{}).Stiffness()) {
		t.Error("an attachment changed the stiffness of the equation of motion")
	}
}

// Springs in series: under a force F at level 2 of three, x₁ = F/k₁,
// x₂ = x₃ = F/k₁ + F/k₂; yielding storeys and specimens count as they start.
func TestStaticShape(t *testing.T) {
	s := mustStoreys(t, []Storey{
		{Mass: 60e3, Stiffness: 12e6, YieldDisplacement: 0.01}, {Mass: 50e3, Stiffness: 9e6}, {Mass: 40e3, Stiffness: 12e6},
	}, Damping{}, Attachment{From: 0, To: 1, Stiffness: 6e6})
	x, err := s.Static(2, 0.03)
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{0.01, 0.03, 0.03} {
		near(t, fmt.Sprintf("x%d", i+1), x[i], want, 1e-16)
	}
	for i := range 100 { // the level asked for stands there to the last bit
		d := 0.001 * float64(i)
		if x, err := s.Static(3, d); err != nil || x[2] != d {
			t.Errorf("level 3 stands at %v (%v), want %v", x, err, d)
		}
	}
	for _, level := range []int{0, 4} {
		if _, err := s.Static(level, 0.03); err == nil {
			t.Errorf("level %d of three was taken", level)
		}
	}
}
