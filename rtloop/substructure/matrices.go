package substructure

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// symmetryTolerance bounds the difference of two elements that should be the
// same, over the largest element: what is lost when a matrix is written in
// ten digits, and no more.
const symmetryTolerance = 1e-9

// Symmetric makes a symmetric matrix of so many rows from elements that stand
// row by row. Matrices that are not square, not finite, or not symmetric to
// 1e-9 of the largest element are errors.
func Symmetric(rows int, elements []float64) (*mat.SymDense, error) {
	if rows < 1 || rows > MaxLevels {
		return nil, fmt.Errorf("must have 1 to %d rows, has %d", MaxLevels, rows)
	}
	if len(elements) != rows*rows {
		return nil, fmt.Errorf("must be square: %d rows take %d elements, there are %d", rows, rows*rows, len(elements))
	}
	largest := 0.0
	for i, v := range elements {
		if !finite(v) {
			return nil, fmt.Errorf("element (%d, %d) is %v", i/rows+1, i%rows+1, v)
		}
		largest = math.Max(largest, math.Abs(v))
	}
	m := mat.NewSymDense(rows, nil)
	for i := range rows {
		for j := i; j < rows; j++ {
			upper, lower := elements[i*rows+j], elements[j*rows+i]
			if math.Abs(upper-lower) > symmetryTolerance*largest {
				return nil, fmt.Errorf("is not symmetric: element (%d, %d) is %v, (%d, %d) is %v",
					i+1, j+1, upper, j+1, i+1, lower)
			}
			m.SetSym(i, j, upper/2+lower/2)
		}
	}
	return m, nil
}

// FromMatrices builds a structure from full matrices: mass (kg), stiffness
// (N/m) and, unless it is nil, damping (N·s/m). The influence vector is all
// ones where it is nil. Damping comes from the ratios or from the matrix; to
// give both is an error. The matrices are copied. Errors name the matrix.
func FromMatrices(mass, stiffness, damping *mat.SymDense, influence []float64, d Damping, at []Attachment) (*Structure, error) {
	s, err := adopt(mass, stiffness, damping, influence, d)
	if err == nil {
		err = s.finish(d, at)
	}
	if err != nil {
		return nil, err
	}
	return s, nil
}

func adopt(mass, stiffness, damping *mat.SymDense, influence []float64, d Damping) (*Structure, error) {
	if mass == nil {
		return nil, errors.New("mass: is missing")
	}
	if stiffness == nil {
		return nil, errors.New("stiffness: is missing")
	}
	if damping != nil && len(d.Ratios) > 0 {
		return nil, errors.New("damping: cannot be given together with a damping ratio")
	}
	n := mass.SymmetricDim()
	if n < 1 || n > MaxLevels {
		return nil, fmt.Errorf("mass: must have 1 to %d rows, has %d", MaxLevels, n)
	}
	if damping == nil {
		damping = mat.NewSymDense(n, nil)
	}
	s := &Structure{n: n, influence: slices.Clone(influence)}
	if s.influence == nil {
		s.influence = ones(n)
	}
	if len(s.influence) != n {
		return nil, fmt.Errorf("influence: must have %d elements like the mass, has %d", n, len(s.influence))
	}
	for _, v := range s.influence {
		if !finite(v) {
			return nil, fmt.Errorf("influence: an element is %v", v)
		}
	}
	var err error
	if s.mass, err = copyMatrix("mass", mass, n); err != nil {
		return nil, err
	}
	if s.stiffness, err = copyMatrix("stiffness", stiffness, n); err != nil {
		return nil, err
	}
	if s.damping, err = copyMatrix("damping", damping, n); err != nil {
		return nil, err
	}
	return s, semidefinite("damping", s.damping)
}

func copyMatrix(name string, m *mat.SymDense, n int) (*mat.SymDense, error) {
	if m.SymmetricDim() != n {
		return nil, fmt.Errorf("%s: must have %d rows like the mass, has %d", name, n, m.SymmetricDim())
	}
	for i := range n {
		for j := i; j < n; j++ {
			if !finite(m.At(i, j)) {
				return nil, fmt.Errorf("%s: element (%d, %d) is %v", name, i+1, j+1, m.At(i, j))
			}
		}
	}
	c := mat.NewSymDense(n, nil)
	c.CopySym(m)
	return c, nil
}

// semidefinite refuses a matrix that would feed energy into the structure.
func semidefinite(name string, m *mat.SymDense) error {
	var eigen mat.EigenSym
	if !eigen.Factorize(m, false) {
		return fmt.Errorf("%s: no eigenvalues found", name)
	}
	v := eigen.Values(nil)
	if lowest := v[0]; lowest < -symmetryTolerance*math.Abs(v[len(v)-1]) {
		return fmt.Errorf("%s: the matrix has the negative eigenvalue %.6g", name, lowest)
	}
	return nil
}
