package substructure

import "gonum.org/v1/gonum/mat"

// matrix is a square matrix laid out for multiplication on the tick path:
// blocks of four rows, and of each block only the columns from the first to
// the last that is not all zero. So a diagonal or banded matrix costs no more
// than it must, and the four sums of a block run side by side instead of each
// addition waiting for the one before.
type matrix struct {
	n      int
	blocks []block
}

type block struct {
	first int          // first column
	cols  [][4]float64 // columns from first on, of four rows each
}

func newMatrix(m mat.Matrix) *matrix {
	n, _ := m.Dims()
	a := &matrix{n: n, blocks: make([]block, 0, (n+3)/4)}
	for row := 0; row < n; row += 4 {
		last := min(row+4, n)
		lo, hi := row, row // the diagonal is always there, so no block is empty
		for i := row; i < last; i++ {
			for j := range n {
				if m.At(i, j) != 0 {
					lo, hi = min(lo, j), max(hi, j)
				}
			}
		}
		b := block{first: lo, cols: make([][4]float64, hi-lo+1)}
		for i := row; i < last; i++ {
			for j := lo; j <= hi; j++ {
				b.cols[j-lo][i-row] = m.At(i, j)
			}
		}
		a.blocks = append(a.blocks, b)
	}
	return a
}

// product returns the four rows of the block times x. The first product
// starts the sum, so that a matrix of one element gives its product itself.
func (b *block) product(x []float64) (s0, s1, s2, s3 float64) {
	cols := b.cols
	x = x[b.first:][:len(cols)]
	c, e := &cols[0], x[0]
	s0, s1, s2, s3 = c[0]*e, c[1]*e, c[2]*e, c[3]*e
	for j := 1; j < len(cols); j++ {
		c, e := &cols[j], x[j]
		s0 += c[0] * e
		s1 += c[1] * e
		s2 += c[2] * e
		s3 += c[3] * e
	}
	return s0, s1, s2, s3
}

// mul sets dst to A x.
func (a *matrix) mul(dst, x []float64) {
	i := 0
	for k := range a.blocks {
		s0, s1, s2, s3 := a.blocks[k].product(x)
		switch d := dst[i:]; len(d) { // a copy of so few costs more than it moves
		default:
			d[3] = s3
			fallthrough
		case 3:
			d[2] = s2
			fallthrough
		case 2:
			d[1] = s1
			fallthrough
		case 1:
			d[0] = s0
		}
		i += 4
	}
}

// subtract sets dst to dst − A x.
func (a *matrix) subtract(dst, x []float64) {
	i := 0
	for k := range a.blocks {
		s0, s1, s2, s3 := a.blocks[k].product(x)
		switch d := dst[i:]; len(d) {
		default:
			d[3] -= s3
			fallthrough
		case 3:
			d[2] -= s2
			fallthrough
		case 2:
			d[1] -= s1
			fallthrough
		case 1:
			d[0] -= s0
		}
		i += 4
	}
}

// quadratic returns xᵀA x.
func (a *matrix) quadratic(x []float64) float64 {
	q, i := 0.0, 0
	for k := range a.blocks {
		s0, s1, s2, s3 := a.blocks[k].product(x)
		switch d := x[i:]; len(d) {
		default:
			q += d[3] * s3
			fallthrough
		case 3:
			q += d[2] * s2
			fallthrough
		case 2:
			q += d[1] * s1
			fallthrough
		case 1:
			q += d[0] * s0
		}
		i += 4
	}
	return q
}
