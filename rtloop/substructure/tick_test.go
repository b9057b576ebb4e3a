package substructure

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sync"
	"testing"

	"antelag/plant"

	"gonum.org/v1/gonum/mat"
)

// The scalar paths for one level give the very bits of the general ones.
func TestOneLevelIsBitwiseTheGeneralPath(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	for range 20 {
		s := mustStoreys(t, []Storey{{Mass: 1e5 * random.Float64(), Stiffness: 1e8 * random.Float64()}},
			Damping{Ratios: []float64{0.1 * random.Float64()}}, Attachment{0, 1, 1e7 * random.Float64()})
		dt := 0.5 / s.Frequencies()[0] * random.Float64()
		newmark, err := generalNewmarkExplicit(s, dt)
		if err != nil {
			t.Fatal(err)
		}
		chenRicles, err := generalCR(s, dt)
		if err != nil {
			t.Fatal(err)
		}
		rho, alpha := random.Float64(), -random.Float64()/3
		kolayRicles, err := generalKRAlpha(s, dt, rho)
		if err != nil {
			t.Fatal(err)
		}
		splitting, err := generalAlphaOS(s, dt, alpha)
		if err != nil {
			t.Fatal(err)
		}
		for m, general := range map[method]Integrator{
			{"newmark-explicit", 0}: newmark, {"CR", 0}: chenRicles, {"KR-alpha", rho}: kolayRicles, {"alpha-OS", alpha}: splitting,
		} {
			single, name := m.build(t, s, dt), m.String()
			switch single.(type) {
			case *newmarkExplicit1, *cr1, *krAlpha1, *alphaOS1:
			default:
				t.Fatalf("%s of one level is a %T, not the scalar path", name, single)
			}
			p, x0 := []float64{0}, []float64{0.01 * random.Float64()}
			single.Start(x0, p)
			general.Start(x0, p)
			for k := range 1000 {
				same(t, name, k, single, general, s)
				single.Predict()
				general.Predict()
				same(t, name, k, single, general, s)
				s.GroundLoad(p, random.NormFloat64())
				s.AddForce(p, 0, 1e6*s.Project(single.X(), 0))
				single.Correct(p)
				general.Correct(p)
			}
			x, v, a := []float64{0.01}, []float64{-0.2}, []float64{random.NormFloat64()}
			for k := range 10 { // set to one state, both go on alike
				if k == 0 {
					single.SetState(x, v, a)
					general.SetState(x, v, a)
				}
				same(t, name+" set", k, single, general, s)
				single.Predict()
				general.Predict()
				single.Correct(p)
				general.Correct(p)
			}
		}
	}
}

func same(t *testing.T, name string, k int, a, b Integrator, s *Structure) {
	t.Helper()
	if !slices.Equal(a.Memory(), b.Memory()) {
		t.Fatalf("%s step %d: memory %v and %v", name, k, a.Memory(), b.Memory())
	}
	for i, pair := range [][2]float64{
		{a.X()[0], b.X()[0]}, {a.V()[0], b.V()[0]}, {a.A()[0], b.A()[0]}, {a.Centred()[0], b.Centred()[0]}, {a.Strain(), b.Strain()},
		{s.VMV(a.V()), s.massBlocks.quadratic(b.V())}, {s.VCV(a.V()), s.dampingBlocks.quadratic(b.V())},
	} {
		if math.Float64bits(pair[0]) != math.Float64bits(pair[1]) {
			t.Fatalf("%s step %d, value %d: %x and %x", name, k, i, pair[0], pair[1])
		}
	}
}

// One level whose storey yields takes the general path; with hardening 1 it
// is the linear storey.
func TestHardeningOneIsLinear(t *testing.T) {
	linear := mustStoreys(t, []Storey{{Mass: 60e3, Stiffness: 18e6, Damping: 1e5}}, Damping{})
	yields := mustStoreys(t, []Storey{{Mass: 60e3, Stiffness: 18e6, Damping: 1e5, YieldDisplacement: 0.001, Hardening: 1}}, Damping{})
	for _, name := range Names() {
		a := newLoaded(linear, mustNew(t, name, linear, 0.01), 0)
		b := newLoaded(yields, mustNew(t, name, yields, 0.01), 0)
		for k := range 500 {
			ug := math.Sin(0.1 * float64(k))
			a.step(ug)
			b.step(ug)
			near(t, name, b.in.X()[0], a.in.X()[0], 1e-14)
			near(t, name+" strain", b.in.Strain(), a.in.Strain(), 1e-9)
			near(t, name+" hysteresis", b.in.Hysteresis(), 0, 1e-9) // of some hundreds of J
		}
	}
}

// Integrators share a structure and nothing else: runs side by side, each
// with yielding storeys of its own, are the run alone. Also a run restarted.
func TestIntegratorsAreIndependent(t *testing.T) {
	s := twoYielding(t)
	run := func(in Integrator) [2]float64 {
		l := newLoaded(s, in, 0)
		l.start(0)
		for k := range 2000 {
			l.step(3 * math.Sin(0.05*float64(k)))
		}
		return [2]float64{in.X()[1], in.Hysteresis()}
	}
	for _, name := range Names() {
		once := mustNew(t, name, s, 0.005)
		alone := run(once)
		if again := run(once); again != alone {
			t.Errorf("%s started again gives %v, at first %v", name, again, alone)
		}
		var results [4][2]float64
		var wait sync.WaitGroup
		for i := range results {
			in := mustNew(t, name, s, 0.005)
			wait.Go(func() { results[i] = run(in) })
		}
		wait.Wait()
		for _, r := range results {
			if r != alone {
				t.Errorf("%s side by side gives %v, alone %v", name, r, alone)
			}
		}
	}
}

// A run taken up by another integrator in the middle goes on to the last bit.
func TestSetStateGoesOn(t *testing.T) {
	three, _ := threeStoreys(t)
	for _, s := range []*Structure{equalStoreys(t, 1), three} {
		for _, name := range Names() {
			a := newLoaded(s, mustNew(t, name, s, 0.005), 6e6)
			a.start(1)
			for k := range 100 {
				a.step(math.Sin(0.1 * float64(k)))
			}
			b := newLoaded(s, mustNew(t, name, s, 0.005), 6e6)
			b.in.SetState(a.in.X(), a.in.V(), a.in.A())
			copy(b.in.Memory(), a.in.Memory())
			for k := range 100 {
				if !slices.Equal(a.in.X(), b.in.X()) || !slices.Equal(a.in.Centred(), b.in.Centred()) {
					t.Fatalf("%s, %d levels: %d steps on, x %v and %v", name, s.N(), k, a.in.X(), b.in.X())
				}
				a.step(1)
				b.step(1)
			}
		}
	}
}

// Without load and with specimens of their initial stiffness SetState alone
// takes up a run: hysteretic storeys (here elastic) and specimens are in the
// balance that it assumes, and nothing of an earlier run is left.
func TestSetStateOfAFreeStructure(t *testing.T) {
	s := mustStoreys(t, []Storey{
		{Mass: 60e3, Stiffness: 18e6, YieldDisplacement: 0.001, Hardening: 1}, {Mass: 50e3, Stiffness: 15e6}, {Mass: 40e3, Stiffness: 12e6},
	}, Damping{Ratios: []float64{0.03}}, Attachment{From: 1, To: 2, Stiffness: 6e6})
	for _, name := range Names() {
		a := newLoaded(s, mustNew(t, name, s, 0.005), 6e6)
		x0 := []float64{0.01, -0.02, 0.03}
		s.AddForce(a.p, 0, 6e6*s.Project(x0, 0))
		a.in.Start(x0, a.p)
		b := newLoaded(s, mustNew(t, name, s, 0.005), 6e6)
		b.start(1)
		for range 50 {
			a.step(0)
			b.step(1)
		}
		b.in.SetState(a.in.X(), a.in.V(), a.in.A())
		for k := range 50 {
			for i, x := range a.in.X() {
				near(t, fmt.Sprintf("%s, %d steps on, level %d", name, k, i+1), b.in.X()[i], x, 1e-15) // rounding of 0.01 m
			}
			near(t, name+" strain", b.in.Strain(), a.in.Strain(), 1e-9) // of some hundred J
			a.step(0)
			b.step(0)
		}
		b.in.Start(x0, a.p)
		strain := 18e6/2*0.01*0.01 + 15e6/2*0.03*0.03 + 12e6/2*0.05*0.05
		near(t, name+" strain at the start", b.in.Strain(), strain, 1e-9)
	}
}

// At rest under a load from a displacement beyond yield: the storey follows
// its loading path, and a₀ = M⁻¹(p − K x₀ − h₀).
func TestStartIsInBalance(t *testing.T) {
	s := twoYielding(t)
	x0, p := []float64{0.02, 0.025}, []float64{1e5, -2e5}
	storey := plant.NewBoucWen(18e6, 0.006, 0.05, 1, 0.5)
	h := storey.Advance(x0[0], 0, 0)
	near(t, "first loading", h, 18e6*(0.05*0.02+0.95*0.006*(1-math.Exp(-0.02/0.006))), 1e-8) // of 1e5 N
	want := []float64{(p[0] - h + 15e6*0.005) / 60e3, (p[1] - 15e6*0.005) / 50e3}
	for _, name := range Names() {
		in := mustNew(t, name, s, 0.005)
		view := in.A()
		in.Start(x0, p)
		for i := range want {
			near(t, name, in.A()[i], want[i], 1e-13)
			near(t, name+" view", view[i], want[i], 1e-13)
		}
		if v := peak(in.V()); v != 0 || in.X()[0] != x0[0] || in.X()[1] != x0[1] || in.Hysteresis() != 0 {
			t.Errorf("%s: not at rest at x0: x %v, v %v, dissipated %v", name, in.X(), in.V(), in.Hysteresis())
		}
	}
}

func TestProjectAndAddForce(t *testing.T) {
	s := mustStoreys(t, []Storey{{Mass: 1, Stiffness: 1}, {Mass: 1, Stiffness: 1}, {Mass: 1, Stiffness: 1}}, Damping{},
		Attachment{0, 2, 1}, Attachment{1, 3, 1}, Attachment{3, 0, 1})
	x := []float64{1, 10, 100}
	for i, want := range []float64{10, 99, -100} {
		if got := s.Project(x, i); got != want {
			t.Errorf("extension of attachment %d is %v, want %v", i, got, want)
		}
		// The force acts along the same b: p·x falls by r times the extension.
		p := make([]float64, 3)
		s.AddForce(p, i, 2)
		if work := p[0]*x[0] + p[1]*x[1] + p[2]*x[2]; work != -2*want {
			t.Errorf("attachment %d does the work %v, want %v", i, work, -2*want)
		}
	}
	p := []float64{9, 9, 9}
	s.GroundLoad(p, 3)
	if !slices.Equal(p, []float64{-3, -3, -3}) {
		t.Errorf("load of the ground is %v, want −3 each", p)
	}
}

// Blocks of four rows with their zeros left out multiply like the matrix.
func TestMatrixBlocks(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for n := 1; n <= 13; n++ {
		for band := range n {
			m := mat.NewDense(n, n, nil)
			x, d := make([]float64, n), make([]float64, n)
			for i := range n {
				x[i], d[i] = random.NormFloat64(), random.NormFloat64()
				for j := max(0, i-band); j <= min(n-1, i+band/2); j++ {
					m.Set(i, j, random.NormFloat64())
				}
			}
			var want mat.VecDense
			want.MulVec(m, mat.NewVecDense(n, x))
			a := newMatrix(m)
			got := make([]float64, n)
			a.mul(got, x)
			less := append([]float64(nil), d...)
			a.subtract(less, x)
			for i := range n {
				near(t, "A x", got[i], want.AtVec(i), 1e-14)
				near(t, "d − A x", less[i], d[i]-want.AtVec(i), 1e-14)
			}
			near(t, "xᵀA x", a.quadratic(x), mat.Dot(mat.NewVecDense(n, x), &want), 1e-13)
		}
	}
}

func TestTickDoesNotAllocate(t *testing.T) {
	three, _ := threeStoreys(t)
	for _, s := range []*Structure{equalStoreys(t, 1), three, twoYielding(t)} {
		for _, name := range Names() {
			in := mustNew(t, name, s, 0.001)
			p, total := make([]float64, s.N()), 0.0
			if n := testing.AllocsPerRun(100, func() {
				in.Predict()
				s.GroundLoad(p, 1)
				for j := range s.attachments {
					s.AddForce(p, j, 6e6*s.Project(in.X(), j))
				}
				in.Correct(p)
				total += s.VMV(in.V()) + s.VCV(in.V()) + s.AMA(in.A()) + in.Strain() + in.Hysteresis()
			}); n != 0 {
				t.Errorf("%s, %d levels: %v allocations a tick", name, s.N(), n)
			}
			if n := testing.AllocsPerRun(10, func() { in.Start(nil, p) }); n != 0 {
				t.Errorf("%s, %d levels: Start allocates %v times", name, s.N(), n)
			}
			if !(total > 0) {
				t.Errorf("%s, %d levels: no energy", name, s.N())
			}
		}
	}
}
