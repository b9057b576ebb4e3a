package stability

import (
	"cmp"
	"errors"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"

	"antelag/rtloop"
)

// mostStates is the largest system that is set up, and largestBlock the largest
// part of it whose eigenvalues are looked for: some ten seconds of work.
const mostStates, largestBlock = 20000, 1200

// System is the state matrix of a loop for small motions about rest.
type System struct {
	n, levels int
	dt        float64
	columns   [][]entry // of A
}

type entry struct {
	row   int
	value float64
}

// Linearize disturbs one value after another that the loop carries from tick to
// tick, and lets it do one tick. The loop is one that Linear has made; it is left
// at rest.
func Linearize(linear *rtloop.Loop) (*System, error) {
	rest := linear.State(nil)
	clear(rest)
	s := &System{n: len(rest), levels: linear.Structure().N(), dt: linear.Step()}
	if s.n > mostStates {
		return nil, ErrTooLarge
	}
	state := make([]float64, s.n)
	s.columns = make([][]entry, s.n)
	for j := range s.n {
		copy(state, rest)
		state[j] = small
		linear.SetState(state)
		if !linear.Tick(rtloop.Drive{}) {
			return nil, errors.New("the loop does not bear the smallest motion")
		}
		state = linear.State(state[:0])
		for i, v := range state {
			if v != 0 {
				s.columns[j] = append(s.columns[j], entry{i, v / small})
			}
		}
	}
	linear.SetState(rest)
	return s, nil
}

// Size returns how many values the loop carries from tick to tick.
func (s *System) Size() int { return s.n }

// Matrix returns A.
func (s *System) Matrix() *mat.Dense {
	a := mat.NewDense(s.n, s.n, nil)
	for j, column := range s.columns {
		for _, e := range column {
			a.Set(e.row, j, e.value)
		}
	}
	return a
}

// Spectrum is what the eigenvalues of a system say.
type Spectrum struct {
	Radius float64 // spectral radius
	Modes  []Mode  // by falling |z|, one of each pair; those that vanish at once left out
}

// Spectrum finds the eigenvalues. The matrix falls into parts that feed back into
// themselves, whose eigenvalues are all there are, but for zeros.
func (s *System) Spectrum() (*Spectrum, error) {
	out := &Spectrum{}
	for _, part := range s.parts() {
		if len(part) > largestBlock {
			return nil, ErrTooLarge
		}
		if err := s.partSpectrum(part, out); err != nil {
			return nil, err
		}
	}
	sortModes(out.Modes)
	if len(out.Modes) > 0 {
		out.Radius = cmplx.Abs(out.Modes[0].Pole)
	}
	return out, nil
}

func (s *System) partSpectrum(part []int, out *Spectrum) error {
	place := make(map[int]int, len(part))
	for i, state := range part {
		place[state] = i
	}
	a := mat.NewDense(len(part), len(part), nil)
	for j, state := range part {
		for _, e := range s.columns[state] {
			if i, ok := place[e.row]; ok {
				a.Set(i, j, e.value)
			}
		}
	}
	var eigen mat.Eigen
	if !eigen.Factorize(a, mat.EigenRight) {
		return errors.New("the eigenvalues of the loop cannot be found")
	}
	var vectors mat.CDense
	eigen.VectorsTo(&vectors)
	for k, z := range eigen.Values(nil) {
		if imag(z) < 0 || cmplx.Abs(z) < vanishing {
			continue
		}
		m := newMode(z, s.dt)
		shape := make([]complex128, s.levels)
		for level := range shape {
			if i, ok := place[level]; ok {
				shape[level] = vectors.At(i, k)
			}
		}
		m.Shape = normalize(shape)
		out.Modes = append(out.Modes, m)
	}
	return nil
}

// vanishing is the size below which a pole is gone within a tick or two: dead
// times have thousands of poles at zero, which rounding spreads.
const vanishing = 1e-3

// parts returns the strongly connected parts of the system that feed back into
// themselves (Tarjan 1972), without recursion: the chains of a dead time are long.
func (s *System) parts() [][]int {
	t := tarjan{index: make([]int, s.n), low: make([]int, s.n), on: make([]bool, s.n)}
	for v := range s.n {
		if t.index[v] == 0 {
			t.visit(v, s.columns)
		}
	}
	parts := t.found[:0]
	for _, part := range t.found {
		if len(part) > 1 || s.feedsItself(part[0]) {
			parts = append(parts, part)
		}
	}
	return parts
}

func (s *System) feedsItself(v int) bool {
	for _, e := range s.columns[v] {
		if e.row == v {
			return true
		}
	}
	return false
}

type tarjan struct {
	index, low []int
	on         []bool
	next       int
	stack      []int
	found      [][]int
}

func (t *tarjan) visit(root int, columns [][]entry) {
	type frame struct{ v, edge int }
	open := func(v int) {
		t.next++
		t.index[v], t.low[v], t.on[v] = t.next, t.next, true
		t.stack = append(t.stack, v)
	}
	open(root)
	calls := []frame{{v: root}}
	for len(calls) > 0 {
		f := &calls[len(calls)-1]
		if f.edge < len(columns[f.v]) {
			w := columns[f.v][f.edge].row
			f.edge++
			switch {
			case t.index[w] == 0:
				open(w)
				calls = append(calls, frame{v: w})
			case t.on[w]:
				t.low[f.v] = min(t.low[f.v], t.index[w])
			}
			continue
		}
		v := f.v
		calls = calls[:len(calls)-1]
		if len(calls) > 0 {
			u := calls[len(calls)-1].v
			t.low[u] = min(t.low[u], t.low[v])
		}
		if t.low[v] == t.index[v] {
			t.close(v)
		}
	}
}

// close takes a finished part off the stack.
func (t *tarjan) close(v int) {
	at := len(t.stack) - 1
	for t.stack[at] != v {
		at--
	}
	part := append([]int(nil), t.stack[at:]...)
	t.stack = t.stack[:at]
	for _, w := range part {
		t.on[w] = false
	}
	t.found = append(t.found, part)
}

// sortModes puts the least damped first.
func sortModes(modes []Mode) {
	slices.SortFunc(modes, func(a, b Mode) int {
		return cmp.Or(cmp.Compare(cmplx.Abs(b.Pole), cmplx.Abs(a.Pole)), cmp.Compare(imag(a.Pole), imag(b.Pole)))
	})
}
