package substructure

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Chopra, Dynamics of Structures, the worked example of chapter 5: one mass
// under p = 10·sin(πt/0.6) kip until 0.6 s, step 0.1 s. The numbers are in
// kip, inch and second; the equation does not mind.
const (
	chopraM  = 0.2533
	chopraK  = 10.0
	chopraDt = 0.1
)

func chopraP(t float64) float64 {
	if t > 0.6 {
		return 0
	}
	return 10 * math.Sin(math.Pi*t/0.6)
}

// chopra returns the displacements at steps of dt from t = 0 on, and c.
func chopra(t *testing.T, name string, dt float64, steps int) (u []float64, c float64) {
	s := mustStoreys(t, []Storey{{Mass: chopraM, Stiffness: chopraK}}, Damping{Ratios: []float64{0.05}})
	in := mustNew(t, name, s, dt)
	in.Start(nil, []float64{chopraP(0)})
	u = append(u, in.X()[0])
	for k := range steps {
		in.Predict()
		in.Correct([]float64{chopraP(float64(k+1) * dt)})
		u = append(u, in.X()[0])
	}
	return u, mat.Sum(s.Damping())
}

// published are values printed with four decimals from 0.1 s on; half a unit
// of the last, and as much for the book's own rounded m, k and c.
func published(t *testing.T, what string, u, want []float64) {
	t.Helper()
	for i, w := range want {
		near(t, fmt.Sprintf("%s: u(%.1f s)", what, 0.1*float64(i+1)), u[i+1], w, 1e-4)
	}
}

// The example by central differences (table from memory) and by their
// textbook recurrence: (m/dt² + c/2dt)·u₊ = p − (m/dt² − c/2dt)·u₋ − (k − 2m/dt²)·u,
// which starts from u₋ = u₀ − dt·v₀ + dt²/2·a₀ = 0.
func TestNewmarkExplicitIsCentralDifference(t *testing.T) {
	u, c := chopra(t, "newmark-explicit", chopraDt, 40)
	published(t, "central difference", u,
		[]float64{0, 0.1914, 0.6293, 1.1825, 1.5808, 1.5412, 0.9141, -0.0247, -0.8968, -1.3726})

	const dt, m, k = chopraDt, chopraM, chopraK
	before, now := 0.0, 0.0
	for i := range 40 {
		load := chopraP(float64(i) * dt)
		next := (load - (m/dt/dt-c/2/dt)*before - (k-2*m/dt/dt)*now) / (m/dt/dt + c/2/dt)
		before, now = now, next
		near(t, fmt.Sprintf("step %d", i+1), u[i+1], now, 1e-13) // rounding of values near 1
	}
}

// averageAcceleration is Newmark's method with γ = ½, β = ¼ in the textbook's
// incremental-free form, at rest at first.
func averageAcceleration(c float64, steps int) []float64 {
	const dt, m, k = chopraDt, chopraM, chopraK
	u, v := 0.0, 0.0
	a := (chopraP(0) - c*v - k*u) / m
	out := []float64{u}
	for i := range steps {
		load := chopraP(float64(i+1)*dt) + m*(4/dt/dt*u+4/dt*v+a) + c*(2/dt*u+v)
		next := load / (k + 2/dt*c + 4/dt/dt*m)
		vNext := 2/dt*(next-u) - v
		a = 4/dt/dt*(next-u) - 4/dt*v - a
		u, v = next, vNext
		out = append(out, u)
	}
	return out
}

// CR has the poles of average acceleration, but is another method: it
// satisfies
//
//	(m/dt² + c/2dt + k/4)·x₊ + (k/2 − 2m/dt²)·x + (m/dt² − c/2dt + k/4)·x₋ = p
//
// with p alone where average acceleration has (p₊ + 2p + p₋)/4. So the weighted
// mean (x₊ + 2x + x₋)/4 of what CR gives is what average acceleration gives;
// its displacements themselves differ by terms of dt².
func TestCRIsAverageAccelerationButForTheLoad(t *testing.T) {
	const steps = 40
	x, c := chopra(t, "CR", chopraDt, steps+1)
	reference := averageAcceleration(c, steps)
	table := []float64{0.0437, 0.2326, 0.6121, 1.0825, 1.4309, 1.4231, 0.9622, 0.1908, -0.6044, -1.1442}
	published(t, "the test's own average acceleration", reference, table)

	mean := []float64{0}
	apart := 0.0
	for i := 1; i <= steps; i++ {
		mean = append(mean, (x[i+1]+2*x[i]+x[i-1])/4)
		near(t, fmt.Sprintf("mean at step %d", i), mean[i], reference[i], 1e-13) // rounding of values near 1
		apart = math.Max(apart, math.Abs(x[i]-reference[i]))
	}
	published(t, "weighted mean of CR", mean, table)
	if apart < 0.01*peak(reference) {
		t.Errorf("displacements of CR and average acceleration differ by %.3g only; the load should tell them apart", apart)
	}
}

// The example's theoretical response (from memory, four decimals) is reached
// with the square of the step: halving it leaves a quarter of the error.
func TestSecondOrderOnChoprasExample(t *testing.T) {
	exact := []float64{0.0328, 0.2332, 0.6487, 1.1605, 1.5241, 1.4814, 0.9245, 0.0593, -0.7751, -1.2718}
	for _, name := range Names() {
		t.Run(name, func(t *testing.T) {
			miss := func(per int) (u []float64) {
				all, _ := chopra(t, name, chopraDt/float64(per), 10*per)
				for i := 0; i < len(all); i += per {
					u = append(u, all[i])
				}
				return u
			}
			fine := miss(256)
			published(t, "fine steps", fine, exact)
			last := 0.0
			for _, per := range []int{4, 8, 16} {
				u, e := miss(per), 0.0
				for i := range u {
					e = math.Max(e, math.Abs(u[i]-fine[i]))
				}
				// Of the next order there are some hundredths left at 4 steps
				// to 0.1 s, and the reference has its own (16/256)².
				if last != 0 && math.Abs(last/e-4) > 0.15 {
					t.Errorf("%d steps to 0.1 s: error %.3g after %.3g, want a quarter", per, e, last)
				}
				last = e
			}
		})
	}
}
