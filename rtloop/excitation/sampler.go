package excitation

import (
	"errors"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
)

// sampler draws a stationary Gaussian process exactly on a grid of instants.
// The process is the output y = c·x of a linear system under white noise,
//
//	ẋ = A x + b w,   E[w(t) w(t+τ)] = 2π S₀ δ(τ),
//
// S₀ the two-sided spectral density of w per rad/s. On a grid of step Δ its
// samples obey, without any error of integration,
//
//	x⁺ = Φ x + L ξ,   Φ = e^{AΔ},   L Lᵀ = Q = 2π S₀ ∫₀^Δ e^{As} b bᵀ e^{Aᵀs} ds,
//
// with ξ independent standard normals. Φ and Q come from one matrix
// exponential (Van Loan 1978, "Computing integrals involving the matrix
// exponential"). The start is drawn from the stationary covariance P, which
// solves the Lyapunov equation A P + P Aᵀ + 2π S₀ b bᵀ = 0; A must be stable.
type sampler struct {
	phi, l, l0 square // l0·l0ᵀ = P
	c, x       column
	pcg        *rand.PCG
	rng        *rand.Rand
	seed       uint64
}

// order is the largest order of a sampled system. Systems of lower order are
// filled up with zeros: arrays of fixed size are what makes a draw fast.
const order = 4

type (
	column [order]float64
	square [order]column // rows
)

// excitationStream keeps the noise of the excitation apart from what other
// parts of a run draw from the same seed.
const excitationStream = 0x65786369746174

// newSampler prepares the process. a is n×n by rows, b and c have n elements,
// n ≤ order; intensity is 2π·S₀ and step is Δ.
func newSampler(a, b, c []float64, intensity, step float64, seed uint64) (*sampler, error) {
	n := len(b)
	phi, q := vanLoan(n, a, b, intensity, step)
	p, err := stationary(n, a, b, intensity)
	if err != nil {
		return nil, err
	}
	s := &sampler{
		phi: squareOf(n, phi), l: squareOf(n, semiCholesky(n, q)), l0: squareOf(n, semiCholesky(n, p)),
		pcg: rand.NewPCG(seed, excitationStream), seed: seed,
	}
	copy(s.c[:], c)
	s.rng = rand.New(s.pcg)
	s.restart()
	return s, nil
}

func squareOf(n int, elements []float64) (m square) {
	for i := range n {
		copy(m[i][:], elements[i*n:(i+1)*n])
	}
	return m
}

// restart goes back to the first instant of the same realization.
func (s *sampler) restart() {
	s.pcg.Seed(s.seed, excitationStream)
	s.x = column{}
	s.add(&s.l0)
}

// add adds l·ξ to the state, ξ fresh standard normals, l a lower triangle.
func (s *sampler) add(l *square) {
	a, b, c, d := s.rng.NormFloat64(), s.rng.NormFloat64(), s.rng.NormFloat64(), s.rng.NormFloat64()
	s.x[0] += l[0][0] * a
	s.x[1] += l[1][0]*a + l[1][1]*b
	s.x[2] += l[2][0]*a + l[2][1]*b + l[2][2]*c
	s.x[3] += l[3][0]*a + l[3][1]*b + l[3][2]*c + l[3][3]*d
}

// draw returns the output at the present instant and goes to the next.
func (s *sampler) draw() float64 {
	x := s.x
	for i := range s.phi {
		s.x[i] = s.phi[i].dot(&x)
	}
	s.add(&s.l)
	return s.c.dot(&x)
}

func (v *column) dot(w *column) float64 {
	return (v[0]*w[0] + v[1]*w[1]) + (v[2]*w[2] + v[3]*w[3])
}

// vanLoan returns Φ and Q: with M = [−A G; 0 Aᵀ]Δ, G = intensity·b·bᵀ, and
// e^M = [· F; 0 H], Φ = Hᵀ and Q = Hᵀ·F.
func vanLoan(n int, a, b []float64, intensity, step float64) (phi, q []float64) {
	m := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for j := range n {
			m.Set(i, j, -a[i*n+j]*step)
			m.Set(n+i, n+j, a[j*n+i]*step)
			m.Set(i, n+j, intensity*b[i]*b[j]*step)
		}
	}
	var e mat.Dense
	e.Exp(m)
	phi, q = make([]float64, n*n), make([]float64, n*n)
	h := e.Slice(n, 2*n, n, 2*n).T()
	mat.NewDense(n, n, phi).Copy(h)
	mat.NewDense(n, n, q).Mul(h, e.Slice(0, n, n, 2*n))
	return phi, q
}

// stationary solves A P + P Aᵀ + intensity·b·bᵀ = 0 as n² linear equations.
func stationary(n int, a, b []float64, intensity float64) ([]float64, error) {
	k := mat.NewDense(n*n, n*n, nil)
	rhs := mat.NewVecDense(n*n, nil)
	for i := range n {
		for j := range n {
			row := i*n + j
			rhs.SetVec(row, -intensity*b[i]*b[j])
			for m := range n {
				k.Set(row, m*n+j, k.At(row, m*n+j)+a[i*n+m])
				k.Set(row, i*n+m, k.At(row, i*n+m)+a[j*n+m])
			}
		}
	}
	p := make([]float64, n*n)
	if err := mat.NewVecDense(n*n, p).SolveVec(k, rhs); err != nil {
		var cond mat.Condition
		if !errors.As(err, &cond) || math.IsInf(float64(cond), 1) {
			return nil, err
		}
	}
	return p, nil
}

// semiCholesky returns the lower triangle L with L·Lᵀ = S, by rows, of a
// symmetric positive semidefinite S. Over a short step some states are driven
// only through others and S is singular within rounding; a pivot that is
// rounding alone counts as zero.
func semiCholesky(n int, s []float64) []float64 {
	const eps = 1e-15
	l := make([]float64, n*n)
	for j := range n {
		pivot := s[j*n+j]
		for k := range j {
			pivot -= l[j*n+k] * l[j*n+k]
		}
		if pivot <= eps*s[j*n+j] {
			continue
		}
		root := math.Sqrt(pivot)
		l[j*n+j] = root
		for i := j + 1; i < n; i++ {
			sum := (s[i*n+j] + s[j*n+i]) / 2
			for k := range j {
				sum -= l[i*n+k] * l[j*n+k]
			}
			l[i*n+j] = sum / root
		}
	}
	return l
}
