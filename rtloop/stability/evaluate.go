package stability

import (
	"math/cmplx"
	"slices"
)

// evaluator works a Model out at points z. It belongs to one goroutine.
type evaluator struct {
	m     *Model
	work  []complex128
	sides []complex128 // (zI − A)⁻¹ of the forces
	side  []complex128
	loop  []complex128 // L, row by row
	lu    []complex128
}

func newEvaluator(m *Model) *evaluator {
	c, largest := len(m.channels), m.structure.n
	for i := range m.channels {
		largest = max(largest, m.channels[i].plant.core.n)
	}
	return &evaluator{
		m: m, work: make([]complex128, largest*(largest+1)), side: make([]complex128, largest),
		sides: make([]complex128, c*m.structure.n), loop: make([]complex128, c*c), lu: make([]complex128, c*c),
	}
}

// at returns F(z)/z^states, which tends to 1 far out, and leaves L(z) behind.
func (e *evaluator) at(z complex128) scaled {
	det := e.around(z)
	n := len(e.m.channels)
	copy(e.lu, e.loop)
	for i := range e.lu {
		e.lu[i] = -e.lu[i]
	}
	for i := range n {
		e.lu[i*n+i] += 1
	}
	return det.times(determinant(n, e.lu))
}

// around works out L(z) and returns the product of the blocks' determinants over
// z^states.
func (e *evaluator) around(z complex128) scaled {
	m := e.m
	w, lz := 1/z, cmplx.Log(z)
	n := m.structure.n
	for j := range m.forces {
		copy(e.sides[j*n:(j+1)*n], m.forces[j])
	}
	det := m.structure.solve(z, e.sides, e.work)
	channels := len(m.channels)
	for i := range m.channels {
		c := &m.channels[i]
		answer, own := e.plant(c.plant, z, w, lz)
		det = det.by(own)
		answer *= complex(c.gain, 0)
		h := [3]complex128{answer * c.fir[0].sum(lz, w), answer * c.fir[1].sum(lz, w), answer * c.fir[2].sum(lz, w)}
		for j := range channels {
			side := e.sides[j*n : (j+1)*n]
			var sum complex128
			for k, row := range c.c {
				if h[k] == 0 {
					continue
				}
				var dot complex128
				for i, s := range side {
					dot += complex(row[i]*real(s), row[i]*imag(s))
				}
				sum += h[k] * dot
			}
			e.loop[i*channels+j] = sum
		}
	}
	for range m.states {
		det = det.times(w)
	}
	return det
}

// returned is how much comes back in a channel at most, of forces of size 1 in all,
// where around was last.
func (e *evaluator) returned() float64 {
	n, most := len(e.m.channels), 0.0
	for i := range n {
		sum := 0.0
		for _, v := range e.loop[i*n : (i+1)*n] {
			sum += size1(v)
		}
		most = max(most, sum)
	}
	return most
}

// plant is T(z), and the determinant of its core.
func (e *evaluator) plant(p *plantBlock, z, w, lz complex128) (answer complex128, det scaled) {
	side := e.side[:p.core.n]
	clear(side)
	power, at := complex(1, 0), 0.0
	for i := range p.terms {
		t := &p.terms[i]
		switch t.ticks - at {
		case 0:
		case 1:
			power *= w
		default:
			power = cmplx.Exp(-lz * complex(t.ticks, 0))
		}
		at = t.ticks
		for k, b := range t.b {
			side[k] += complex(b*real(power), b*imag(power))
		}
		answer += complex(t.d, 0) * power
	}
	det = p.core.solve(z, side, e.work)
	for k, c := range p.c {
		answer += complex(c, 0) * side[k]
	}
	return answer, det
}

// determinant of an n×n matrix, row by row, which is overwritten.
func determinant(n int, a []complex128) complex128 {
	if n == 1 {
		return a[0]
	}
	det := complex(1, 0)
	for k := range n {
		pivot := k
		for i := k + 1; i < n; i++ {
			if size1(a[i*n+k]) > size1(a[pivot*n+k]) {
				pivot = i
			}
		}
		if pivot != k {
			for j := range n {
				a[k*n+j], a[pivot*n+j] = a[pivot*n+j], a[k*n+j]
			}
			det = -det
		}
		p := a[k*n+k]
		det *= p
		if p == 0 {
			return 0
		}
		for i := k + 1; i < n; i++ {
			f := a[i*n+k] / p
			for j := k + 1; j < n; j++ {
				a[i*n+j] -= f * a[k*n+j]
			}
		}
	}
	return det
}

// shape is how the levels move at a pole z: what the forces that keep themselves up
// there make of the structure.
func (e *evaluator) shape(z complex128, levels int) []complex128 {
	z += complex(1e-14, 1e-14) // not where a division by nothing lies
	e.around(z)
	n, states := len(e.m.channels), e.m.structure.n
	forces := e.kept(n)
	shape := make([]complex128, levels)
	for i := range shape {
		for k := range states {
			q := complex(e.m.structure.q[i*states+k], 0)
			for j, r := range forces {
				shape[i] += q * e.sides[j*states+k] * r
			}
		}
	}
	return normalize(shape)
}

// kept are the forces that come around as they went, Lr = r, by inverse iteration.
func (e *evaluator) kept(n int) []complex128 {
	r := make([]complex128, n)
	for i := range r {
		r[i] = complex(1, 0.1*float64(i))
	}
	if n == 1 {
		return r
	}
	for range 3 {
		a, b := make([]complex128, n*n), slices.Clone(r)
		for i, v := range e.loop {
			a[i] = -v
		}
		for i := range n {
			a[i*n+i] += 1
		}
		eliminate(n, a, b)
		if b = normalize(b); b == nil {
			return r
		}
		r = b
	}
	return r
}

// eliminate overwrites b by A⁻¹b.
func eliminate(n int, a, b []complex128) {
	for k := range n {
		pivot := k
		for i := k + 1; i < n; i++ {
			if size1(a[i*n+k]) > size1(a[pivot*n+k]) {
				pivot = i
			}
		}
		for j := range n {
			a[k*n+j], a[pivot*n+j] = a[pivot*n+j], a[k*n+j]
		}
		b[k], b[pivot] = b[pivot], b[k]
		if a[k*n+k] == 0 {
			a[k*n+k] = 1e-300
		}
		for i := k + 1; i < n; i++ {
			f := a[i*n+k] / a[k*n+k]
			for j := k; j < n; j++ {
				a[i*n+j] -= f * a[k*n+j]
			}
			b[i] -= f * b[k]
		}
	}
	for i := n - 1; i >= 0; i-- {
		for j := i + 1; j < n; j++ {
			b[i] -= a[i*n+j] * b[j]
		}
		b[i] /= a[i*n+i]
	}
}
