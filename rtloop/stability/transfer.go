package stability

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/gonum"
)

// transfer is a linear system s_{k+1} = A s_k + B u_k of few states whose answer
// (zI − A)⁻¹B is wanted at many z. A is kept in Hessenberg form, so that one z
// costs the square of the states (Laub 1981).
type transfer struct {
	n int
	h []float64 // QᵀD⁻¹ A D Q, row by row
	q []float64 // D Q: states from transformed ones
	p []float64 // QᵀD⁻¹: transformed states from states
}

// newTransfer takes A row by row.
func newTransfer(n int, a []float64) (*transfer, error) {
	t := &transfer{n: n, h: append([]float64(nil), a...), q: make([]float64, n*n), p: make([]float64, n*n)}
	if n == 0 {
		return t, nil
	}
	for _, v := range a {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, errors.New("the loop's answer to a small motion is no number")
		}
	}
	var impl gonum.Implementation
	scale, tau, work := make([]float64, n), make([]float64, n-1), make([]float64, 4*n+4)
	impl.Dgebal(lapack.Scale, n, t.h, n, scale)
	impl.Dgehrd(n, 0, n-1, t.h, n, tau, work, len(work))
	copy(t.q, t.h)
	impl.Dorghr(n, 0, n-1, t.q, n, tau, work, len(work))
	for i := range n {
		for j := range n {
			t.p[j*n+i] = t.q[i*n+j] / scale[i]
		}
	}
	for i := range n {
		for j := range n {
			t.q[i*n+j] *= scale[i]
			if i > j+1 {
				t.h[i*n+j] = 0
			}
		}
	}
	return t, nil
}

// inward transforms a vector of states, or a column of B.
func (t *transfer) inward(b []float64) []float64 {
	out := make([]float64, t.n)
	for i := range out {
		for j, v := range b {
			out[i] += t.p[i*t.n+j] * v
		}
	}
	return out
}

// outward transforms a row that is applied to states.
func (t *transfer) outward(c []float64) []float64 {
	out := make([]float64, t.n)
	for j := range out {
		for i, v := range c {
			out[j] += v * t.q[i*t.n+j]
		}
	}
	return out
}

// solve overwrites right sides, transformed columns of n each, by (zI − H)⁻¹ of
// them and returns det(zI − H). work has n·(n+1) elements.
func (t *transfer) solve(z complex128, sides []complex128, work []complex128) scaled {
	n := t.n
	det := one
	w, inverses := work[:n*n], work[n*n:n*n+n]
	for i, v := range t.h {
		w[i] = complex(-v, 0)
	}
	for i := range n {
		w[i*n+i] += z
	}
	for k := range n {
		row := w[k*n : k*n+n]
		if k+1 < n {
			below := w[(k+1)*n : (k+1)*n+n]
			if size1(below[k]) > size1(row[k]) {
				for j := k; j < n; j++ {
					row[j], below[j] = below[j], row[j]
				}
				for s := k; s+1 < len(sides); s += n {
					sides[s], sides[s+1] = sides[s+1], sides[s]
				}
				det.m = -det.m
			}
			inverses[k] = inverse(row[k])
			if f := below[k] * inverses[k]; f != 0 {
				for j := k + 1; j < n; j++ {
					below[j] -= f * row[j]
				}
				for s := k; s+1 < len(sides); s += n {
					sides[s+1] -= f * sides[s]
				}
			}
		} else {
			inverses[k] = inverse(row[k])
		}
		det = det.times(row[k])
	}
	for s := 0; s < len(sides); s += n {
		x := sides[s : s+n]
		for i := n - 1; i >= 0; i-- {
			row := w[i*n : i*n+n]
			sum := x[i]
			for j := i + 1; j < n; j++ {
				sum -= row[j] * x[j]
			}
			x[i] = sum * inverses[i]
		}
	}
	return det
}

// inverse is 1/z for a z of ordinary size, quicker than a division that minds all
// others.
func inverse(z complex128) complex128 {
	d := real(z)*real(z) + imag(z)*imag(z)
	return complex(real(z)/d, -imag(z)/d)
}

func size1(z complex128) float64 { return math.Abs(real(z)) + math.Abs(imag(z)) }

// scaled is the complex number m·2^e, so that products of many factors neither
// over- nor underflow.
type scaled struct {
	m complex128
	e int
}

var one = scaled{m: 1}

func (s scaled) times(z complex128) scaled {
	s.m *= z
	if size := size1(s.m); !(size > 0x1p-400 && size < 0x1p400) && size > 0 && !math.IsInf(size, 0) {
		_, e := math.Frexp(size)
		s.m = complex(math.Ldexp(real(s.m), -e), math.Ldexp(imag(s.m), -e))
		s.e += e
	}
	return s
}

func (s scaled) by(o scaled) scaled {
	s = s.times(o.m)
	s.e += o.e
	return s
}

// over returns s/o.
func (s scaled) over(o scaled) complex128 {
	q := s.m / o.m
	e := s.e - o.e
	return complex(math.Ldexp(real(q), e), math.Ldexp(imag(q), e))
}

// log is the natural logarithm of the size.
func (s scaled) log() float64 { return math.Log(cmplx.Abs(s.m)) + float64(s.e)*math.Ln2 }
