package stability

import (
	"cmp"
	"errors"
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Crossing is a place where a pair of poles reaches the unit circle when something
// is changed.
type Crossing struct {
	Value float64 // extra delay, physical s, or force gain
	Angle float64 // of the pole, rad a tick
}

// Frequency is the crossing pole's frequency, Hz, model time.
func (m *Model) Frequency(c Crossing) float64 { return c.Angle / (2 * math.Pi * m.dt) }

// All stands for all channels at once where a channel is asked for.
const All = -1

// Scaled returns the model with the force of one channel, or All, times gain.
func (m *Model) Scaled(channel int, gain float64) *Model {
	s := *m
	s.channels = slices.Clone(m.channels)
	for j := range s.channels {
		if channel == All || channel == j {
			s.channels[j].gain *= gain
		}
	}
	return &s
}

// Delays returns at which extra delays of one channel's force, or of All, between
// low and high physical seconds, poles are on the unit circle, by rising delay. The
// extra delay is taken for e^(−sτ); an actuator whose command goes in straight lines
// from tick to tick differs from that by the square of the tick.
func (m *Model) Delays(channel int, low, high float64) ([]Crossing, error) {
	var out []Crossing
	err := m.walk(channel, func(e *evaluator, a, b looked) {
		for i := range a.values {
			if (cmplx.Abs(a.values[i]) > 1) == (cmplx.Abs(b.values[i]) > 1) {
				continue
			}
			angle, value := e.bisect(channel, a, b, i, func(v complex128) float64 { return math.Log(cmplx.Abs(v)) })
			if angle == 0 {
				continue
			}
			turn := 2 * math.Pi / angle * m.tick
			d := cmplx.Phase(value) / angle * m.tick
			d += math.Ceil((low-d)/turn) * turn
			for n := 0; d <= high && n < 64; n++ {
				out = append(out, Crossing{d, angle})
				d += turn
			}
		}
	})
	sortCrossings(out)
	return out, err
}

// Gains returns with which gains of one channel's force, or of All, up to high,
// poles are on the unit circle, by rising gain.
func (m *Model) Gains(channel int, high float64) ([]Crossing, error) {
	var out []Crossing
	add := func(v complex128, angle float64) {
		if g := 1 / real(v); real(v) > 0 && g <= high {
			out = append(out, Crossing{g, angle})
		}
	}
	err := m.walk(channel, func(e *evaluator, a, b looked) {
		for i := range a.values {
			if a.angle == 0 && math.Abs(imag(a.values[i])) <= 1e-9*cmplx.Abs(a.values[i]) {
				add(a.values[i], 0)
				continue
			}
			if b.angle == math.Pi {
				if math.Abs(imag(b.values[i])) <= 1e-9*cmplx.Abs(b.values[i]) {
					add(b.values[i], math.Pi)
				}
				continue
			}
			if (imag(a.values[i]) > 0) == (imag(b.values[i]) > 0) || real(a.values[i]) < 0 && real(b.values[i]) < 0 {
				continue
			}
			angle, value := e.bisect(channel, a, b, i, func(v complex128) float64 { return imag(v) })
			add(value, angle)
		}
	})
	sortCrossings(out)
	return out, err
}

func sortCrossings(c []Crossing) {
	slices.SortFunc(c, func(a, b Crossing) int { return cmp.Compare(a.Value, b.Value) })
}

// looked is what comes back of a unit of force when the loop is cut: at one angle,
// in one channel a single number, in all the eigenvalues of L.
type looked struct {
	angle  float64
	values []complex128
}

// faint is how little may come back to be of no interest: with a hundred times the
// gain no pole would be on the unit circle there.
const faint = 0.01

// walk goes along the unit circle in steps small enough for nothing to be missed.
func (m *Model) walk(channel int, each func(e *evaluator, a, b looked)) error {
	e := newEvaluator(m)
	nodes := e.nodes()
	cut, err := m.cutPoles(channel)
	if err != nil {
		return err
	}
	for _, z := range cut {
		angle, off := math.Abs(cmplx.Phase(z)), math.Abs(1-cmplx.Abs(z))
		for _, far := range []float64{-10, -3, -1, -0.3, 0, 0.3, 1, 3, 10} {
			if a := angle + far*off; a > 0 && a < math.Pi {
				nodes = append(nodes, a)
			}
		}
	}
	// Exactly there a pole of the structure may lie.
	nodes[0] = 1e-9 * nodes[1]
	nodes = append(nodes, 0.999*math.Pi)
	slices.Sort(nodes)
	nodes = slices.Compact(nodes)
	w := walker{e: e, channel: channel, each: each, left: 200000}
	last := w.look(nodes[0], nil)
	start := looked{0, last.values}
	each(e, start, last)
	for _, angle := range nodes[1:] {
		next := w.look(angle, last.values)
		last = w.between(last, next, 0)
	}
	if w.left < 0 {
		return ErrUnsettled
	}
	return nil
}

// cutPoles are the poles of the loop that is cut: the structure and the channels by
// themselves, or the loop that the other channels make.
func (m *Model) cutPoles(channel int) ([]complex128, error) {
	poles, err := m.structure.poles()
	if err != nil {
		return nil, err
	}
	for j := range m.channels {
		more, err := m.channels[j].plant.core.poles()
		if err != nil {
			return nil, err
		}
		poles = append(poles, more...)
	}
	if channel == All || len(m.channels) == 1 {
		return poles, nil
	}
	others, err := m.Scaled(channel, 0).Poles()
	return append(poles, others...), err
}

func (t *transfer) poles() ([]complex128, error) {
	if t.n == 0 {
		return nil, nil
	}
	var eigen mat.Eigen
	if !eigen.Factorize(mat.NewDense(t.n, t.n, append([]float64(nil), t.h...)), mat.EigenNone) {
		return nil, errors.New("the eigenvalues of a part of the loop cannot be found")
	}
	return eigen.Values(nil), nil
}

type walker struct {
	e       *evaluator
	channel int
	each    func(e *evaluator, a, b looked)
	left    int
}

func (w *walker) look(angle float64, like []complex128) looked {
	w.left--
	return looked{angle, w.e.returns(w.channel, cmplx.Rect(1, angle), like)}
}

// between hands the pieces from a to b on and returns b.
func (w *walker) between(a, b looked, depth int) looked {
	m := w.look(0.5*(a.angle+b.angle), a.values)
	b.values = matched(b.values, m.values)
	if depth > 45 || w.left < 0 || w.plain(a, m, b) {
		w.each(w.e, a, m)
		w.each(w.e, m, b)
		return b
	}
	m = w.between(a, m, depth+1)
	return w.between(m, b, depth+1)
}

// plain reports whether what comes back changes little, or matters little.
func (w *walker) plain(a, m, b looked) bool {
	for i := range m.values {
		x, y, z := a.values[i], m.values[i], b.values[i]
		sx, sy, sz := cmplx.Abs(x), cmplx.Abs(y), cmplx.Abs(z)
		if max(sx, sy, sz) < faint || sx == 0 || sy == 0 || sz == 0 {
			continue
		}
		if (b.angle-a.angle)*w.e.m.longest > 2*mostTurn {
			return false
		}
		if math.Abs(cmplx.Phase(y/x)) > mostTurn || math.Abs(cmplx.Phase(z/y)) > mostTurn {
			return false
		}
		if bend := math.Abs(math.Log(sy) - 0.5*(math.Log(sx)+math.Log(sz))); bend > mostBend {
			return false
		}
	}
	return true
}

// bisect finds where value i passes zero of a measure between a and b.
func (e *evaluator) bisect(channel int, a, b looked, i int, measure func(complex128) float64) (float64, complex128) {
	below := measure(a.values[i]) < 0
	var value complex128
	for range 100 {
		mid := 0.5 * (a.angle + b.angle)
		if mid <= a.angle || mid >= b.angle {
			break
		}
		m := looked{mid, e.returns(channel, cmplx.Rect(1, mid), a.values)}
		value = m.values[i]
		if (measure(value) < 0) == below {
			a = m
		} else {
			b = m
		}
	}
	return 0.5 * (a.angle + b.angle), value
}

// returns is what comes back at z in the cut loop, in the order of like.
func (e *evaluator) returns(channel int, z complex128, like []complex128) []complex128 {
	e.around(z)
	n := len(e.m.channels)
	switch {
	case n == 1:
		return []complex128{e.loop[0]}
	case channel == All:
		return matched(eigenvalues(n, e.loop), like)
	}
	// 1 − ℓ = det(I − L)/det(I − L without the channel).
	whole, others := make([]complex128, n*n), make([]complex128, 0, n*n)
	for i := range n {
		for j := range n {
			v := -e.loop[i*n+j]
			if i == j {
				v += 1
			}
			whole[i*n+j] = v
			if i != channel && j != channel {
				others = append(others, v)
			}
		}
	}
	return []complex128{1 - determinant(n, whole)/determinant(n-1, others)}
}

// matched puts values into the order in which they are nearest to like.
func matched(values, like []complex128) []complex128 {
	if like == nil || len(values) < 2 {
		return values
	}
	values = slices.Clone(values)
	for i := range values {
		nearest := i
		for j := i + 1; j < len(values); j++ {
			if cmplx.Abs(values[j]-like[i]) < cmplx.Abs(values[nearest]-like[i]) {
				nearest = j
			}
		}
		values[i], values[nearest] = values[nearest], values[i]
	}
	return values
}

// eigenvalues of a small complex matrix: the roots of its characteristic polynomial
// (Faddeev & Leverrier), all at once (Durand 1960, Kerner 1966).
func eigenvalues(n int, a []complex128) []complex128 {
	scale := 0.0
	for _, v := range a {
		scale = max(scale, cmplx.Abs(v))
	}
	if scale == 0 {
		return make([]complex128, n)
	}
	c := characteristic(n, a, scale)
	roots := make([]complex128, n)
	for i := range roots {
		roots[i] = cmplx.Pow(0.4+0.9i, complex(float64(i), 0))
	}
	for range 200 {
		moved := 0.0
		for i, x := range roots {
			p, q := complex(1, 0), complex(1, 0)
			for k := 1; k <= n; k++ {
				p = p*x + c[k]
			}
			for j, y := range roots {
				if j != i {
					q *= x - y
				}
			}
			if q == 0 {
				q = 1e-18
			}
			step := p / q
			roots[i] -= step
			moved = max(moved, cmplx.Abs(step))
		}
		if moved < 1e-15 {
			break
		}
	}
	for i := range roots {
		roots[i] *= complex(scale, 0)
	}
	return roots
}

// characteristic are the coefficients of det(xI − A/scale), the highest power first.
func characteristic(n int, a []complex128, scale float64) []complex128 {
	c := make([]complex128, n+1)
	c[0] = 1
	m, next := make([]complex128, n*n), make([]complex128, n*n)
	for k := 1; k <= n; k++ {
		for i := range n {
			for j := range n {
				var sum complex128
				for l := range n {
					v := m[l*n+j]
					if l == j {
						v += c[k-1]
					}
					sum += a[i*n+l] / complex(scale, 0) * v
				}
				next[i*n+j] = sum
			}
		}
		m, next = next, m
		var trace complex128
		for i := range n {
			trace += m[i*n+i]
		}
		c[k] = -trace / complex(float64(k), 0)
	}
	return c
}
