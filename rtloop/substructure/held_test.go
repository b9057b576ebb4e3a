package substructure

import (
	"math"
	"strings"
	"testing"
)

// A structure held by one force on a level and let go: at the first instant only
// that level accelerates. With the initial stiffness instead of what yielded the
// others would too.
func TestHeldIsInBalance(t *testing.T) {
	storeys := []Storey{
		{Mass: 10e3, Stiffness: 8e6, YieldDisplacement: 0.005, Hardening: 0.05},
		{Mass: 10e3, Stiffness: 6e6},
		{Mass: 8e3, Stiffness: 5e6, YieldDisplacement: 0.004, Hardening: 0.02},
	}
	at := []Attachment{{From: 0, To: 2, Stiffness: 2e6}, {From: 3, To: 1, Stiffness: 1e6}}
	s, err := FromStoreys(storeys, Damping{Ratios: []float64{0.02}}, at)
	if err != nil {
		t.Fatal(err)
	}
	soft := func(j int, e float64) float64 { return at[j].Stiffness * 0.01 * math.Tanh(e/0.01) }
	for level := 1; level <= 3; level++ {
		x, err := s.Held(level, 0.06, soft)
		if err != nil {
			t.Fatal(err)
		}
		if x[level-1] != 0.06 {
			t.Errorf("level %d is held at %g m", level, x[level-1])
		}
		elastic, err := s.Static(level, 0.06)
		if err != nil {
			t.Fatal(err)
		}
		if within(x, elastic, 1e-3) {
			t.Errorf("held at level %d: nothing yielded, %v", level, x)
		}
		in, err := New("CR", s, 1.0/2048)
		if err != nil {
			t.Fatal(err)
		}
		p := make([]float64, 3)
		for j := range at {
			s.AddForce(p, j, soft(j, s.Project(x, j)))
		}
		in.Start(x, p)
		for i, a := range in.A() {
			// The correction stops at 1e-13 of 60 mm; with 8e6 N/m on 8 t that
			// is 6e-12 m/s², summed over a few storeys.
			if i != level-1 && math.Abs(a) > 1e-10 {
				t.Errorf("held at level %d: level %d starts with %g m/s²", level, i+1, a)
			}
		}
		if math.Abs(in.A()[level-1]) < 1 {
			t.Errorf("level %d is not let go: %g m/s²", level, in.A()[level-1])
		}
	}
}

// Specimens that stiffen far beyond their initial stiffness: a gap that closes and
// a cubic spring.
func TestHeldStiffening(t *testing.T) {
	storeys := []Storey{{Mass: 40e3, Stiffness: 2e6}, {Mass: 40e3, Stiffness: 10e6}, {Mass: 40e3, Stiffness: 10e6}}
	for name, force := range map[string]func(float64) float64{
		"gap":   func(e float64) float64 { return 20e6 * math.Copysign(max(0, math.Abs(e)-0.001), e) },
		"cubic": func(e float64) float64 { return 1e12 * e * e * e },
	} {
		s, err := FromStoreys(storeys, Damping{}, []Attachment{{From: 1, To: 2, Stiffness: 0}})
		if err != nil {
			t.Fatal(err)
		}
		x, err := s.Held(3, 0.03, func(_ int, e float64) float64 { return force(e) })
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		// Level 1 is pulled by its storey and by storey and specimen above.
		up := 10e6*(x[1]-x[0]) + force(x[1]-x[0])
		if d := up - 2e6*x[0]; math.Abs(d) > 1e-6*2e6*x[0] {
			t.Errorf("%s: level 1 lacks %g N of %g N", name, d, up)
		}
	}
}

// A part that has yielded to a ten-thousandth of its stiffness or to nothing
// holds up neither the search for the balance nor the finding that there is none.
func TestHeldIsFoundSoon(t *testing.T) {
	storeys := []Storey{
		{Mass: 40e3, Stiffness: 2e6, YieldDisplacement: 1e-6, Hardening: 1e-4},
		{Mass: 40e3, Stiffness: 10e6, YieldDisplacement: 1e-6, Hardening: 1e-4},
		{Mass: 40e3, Stiffness: 10e6, YieldDisplacement: 1e-6, Hardening: 1e-4},
	}
	s, err := FromStoreys(storeys, Damping{}, []Attachment{{From: 0, To: 1, Stiffness: 5e9}})
	if err != nil {
		t.Fatal(err)
	}
	tried := 0
	x, err := s.Held(3, 0.03, func(_ int, e float64) float64 {
		tried++
		return 5e9 * 1e-6 * math.Tanh(e/1e-6)
	})
	if err != nil || tried > 500 {
		t.Errorf("balance %v, %v after %d tries", x, err, tried)
	}
	// The specimen pulls with more than the storeys can hold.
	for i := range storeys {
		storeys[i].Hardening = 0
	}
	if s, err = FromStoreys(storeys, Damping{}, []Attachment{{From: 0, To: 1}}); err != nil {
		t.Fatal(err)
	}
	tried = 0
	x, err = s.Held(3, 0.03, func(int, float64) float64 { tried++; return 1e6 })
	if err == nil || !strings.HasPrefix(err.Error(), "level: ") || tried > 50*balanceCorrections {
		t.Errorf("balance %v, %v after %d tries", x, err, tried)
	}
}

func within(a, b []float64, tolerance float64) bool {
	for i := range a {
		if math.Abs(a[i]-b[i]) > tolerance {
			return false
		}
	}
	return true
}

// Without anything that yields it is the elastic shape.
func TestHeldElastic(t *testing.T) {
	at := []Attachment{{From: 0, To: 2, Stiffness: 2e6}}
	s, err := FromStoreys([]Storey{{Mass: 1e3, Stiffness: 8e6}, {Mass: 1e3, Stiffness: 6e6}, {Mass: 1e3, Stiffness: 5e6}}, Damping{}, at)
	if err != nil {
		t.Fatal(err)
	}
	want, err := s.Static(3, 0.05)
	if err != nil {
		t.Fatal(err)
	}
	got, err := s.Held(3, 0.05, func(_ int, e float64) float64 { return 2e6 * e })
	if err != nil || !within(got, want, 1e-16) {
		t.Errorf("%v, %v, want %v", got, err, want)
	}
	if _, err := s.Held(4, 0.05, nil); err == nil || !strings.Contains(err.Error(), "level: must be 1 to 3") {
		t.Errorf("level 4: %v", err)
	}
}
