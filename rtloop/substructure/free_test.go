package substructure

import (
	"fmt"
	"math"
	"testing"
)

// A free undamped mode, released at rest from φ, is at
//
//	newmark-explicit: φ·cos(kθ),                θ = 2 asin(ω·dt/2)
//	CR:               φ·cos((k+½)θ)/cos(θ/2),   θ = 2 atan(ω·dt/2)
//	KR-alpha, ρ∞ = 1: the same
//	alpha-OS, α = 0:  φ·cos(kθ),                θ = 2 atan(ω·dt/2)
//
// after k steps: the solution of x₊ − 2cosθ·x + x₋ = 0 that the first step of
// each method begins. Both frequencies are closed forms of these methods.
func newmarkFree(w, dt float64, k int) float64 {
	return math.Cos(float64(k) * 2 * math.Asin(w*dt/2))
}

func crFree(w, dt float64, k int) float64 {
	theta := 2 * math.Atan(w*dt/2)
	return math.Cos((float64(k)+0.5)*theta) / math.Cos(theta/2)
}

func averageFree(w, dt float64, k int) float64 {
	return math.Cos(float64(k) * 2 * math.Atan(w*dt/2))
}

var free = map[method]func(w, dt float64, k int) float64{
	{"newmark-explicit", 0}: newmarkFree, {"CR", 0}: crFree, {"KR-alpha", 1}: crFree, {"alpha-OS", 0}: averageFree,
}

// release follows level 1 of a free structure without damping.
func release(t *testing.T, m method, s *Structure, dt float64, x0 []float64, steps int) []float64 {
	in := m.build(t, s, dt)
	p := make([]float64, s.N())
	in.Start(x0, p)
	x := []float64{in.X()[0]}
	for range steps {
		in.Predict()
		in.Correct(p)
		x = append(x, in.X()[0])
	}
	return x
}

func TestFreeVibrationFrequency(t *testing.T) {
	const period = 0.5
	const w = 2 * math.Pi / period
	s := mustStoreys(t, []Storey{{Mass: 50e3, Stiffness: 50e3 * w * w}}, Damping{})
	for m, closed := range free {
		steps := []float64{0.001, 0.01, 0.1, 0.3, 1, 3, 10} // dt/T
		if m.name == "newmark-explicit" {
			steps = []float64{0.001, 0.01, 0.1, 0.2, 0.3, 0.999 / math.Pi}
		}
		for _, ratio := range steps {
			dt := ratio * period
			x := release(t, m, s, dt, []float64{0.02}, 5000)
			for k, got := range x {
				// Rounding of each step turns into drift: some k·1e-16 in
				// phase, more where θ is small, over the swing of the mode,
				// which for CR and KR-alpha is √(1+(ω·dt/2)²) of the start.
				swing := 0.02 * math.Hypot(1, w*dt/2)
				want := 0.02 * closed(w, dt, k)
				if math.Abs(got-want) > 1e-9*swing {
					t.Errorf("%s, dt = %.4g T, step %d: x = %.12g, want %.12g", m, ratio, k, got, want)
					break
				}
			}
		}
	}
}

// Beyond dt = T/π explicit Newmark grows as (−1)^k·cosh(kμ), cosh μ = ω²dt²/2 − 1.
func TestNewmarkExplicitGrowsBeyondItsLimit(t *testing.T) {
	const w = 4 * math.Pi
	dt := 1.001 * 2 / w
	s := mustStoreys(t, []Storey{{Mass: 50e3, Stiffness: 50e3 * w * w}}, Damping{})
	x := release(t, method{name: "newmark-explicit"}, s, dt, []float64{1}, 200)
	mu := math.Acosh(w*w*dt*dt/2 - 1)
	for k, got := range x {
		want := math.Cosh(float64(k) * mu)
		if k%2 == 1 {
			want = -want
		}
		near(t, fmt.Sprintf("step %d", k), got, want, 1e-10*math.Abs(want)) // rounding, growing along
	}
	if x[200] < 1000 {
		t.Errorf("after 200 steps just above the limit x = %v; it should have grown a thousandfold", x[200])
	}
}

// Every mode of a building swings alone, as one mass of its frequency; with a
// perfect spring in place of part of a storey too, as α of CR counts it.
func TestModesOfABuildingSwingAlone(t *testing.T) {
	s := mustStoreys(t, []Storey{
		{Mass: 60e3, Stiffness: 18e6}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 50e3, Stiffness: 15e6},
		{Mass: 40e3, Stiffness: 12e6}, {Mass: 30e3, Stiffness: 12e6},
	}, Damping{}, Attachment{From: 1, To: 2, Stiffness: 6e6})
	const dt = 0.01
	for m, want := range free {
		for mode, w := range s.Frequencies() {
			x0 := make([]float64, s.N())
			for i := range x0 {
				x0[i] = s.Shapes().At(i, mode)
			}
			in := m.build(t, s, dt)
			l := newLoaded(s, in, 6e6)
			s.AddForce(l.p, 0, 6e6*s.Project(x0, 0))
			in.Start(x0, l.p)
			for k := range 500 {
				for i, x := range in.X() {
					near(t, fmt.Sprintf("%s mode %d step %d level %d", m, mode+1, k, i+1),
						x, x0[i]*want(w, dt, k), 1e-10*peak(x0)) // rounding over 500 steps
				}
				if t.Failed() {
					return
				}
				l.step(0)
			}
		}
	}
}

// At 10 periods a step, and with damping, CR stays within its overshoot.
func TestCRHasNoLimit(t *testing.T) {
	s := equalStoreys(t, 4)
	dt := 10 * 2 * math.Pi / s.Frequencies()[0]
	x0 := []float64{0.01, 0.02, 0.03, 0.035}
	in := mustNew(t, "CR", s, dt)
	l := newLoaded(s, in, 6e6)
	s.AddForce(l.p, 0, 6e6*x0[0])
	in.Start(x0, l.p)
	swing := math.Hypot(1, s.Frequencies()[3]*dt/2) * peak(x0) * 2
	for k := range 20000 {
		l.step(0)
		if x := peak(in.X()); !(x < swing) {
			t.Fatalf("step %d: peak %v m, beyond any overshoot", k, x)
		}
	}
}
