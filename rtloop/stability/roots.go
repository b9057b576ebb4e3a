package stability

import (
	"cmp"
	"errors"
	"math"
	"math/cmplx"
	"slices"
)

// ErrUnsettled says that the poles could not be told apart by the characteristic
// function; the eigenvalues of the System can.
var ErrUnsettled = errors.New("the poles of the loop cannot be told apart by its characteristic function")

// Poles returns poles of the loop, one of each pair, by falling size: the largest,
// and those others that were found on the way. That none is larger is made sure of
// by counting zeros of F outside a circle through it (argument principle). near are
// guesses where to look, like the poles of a loop that is nearly the same; without
// any it begins at those of the structure with perfect actuators.
func (m *Model) Poles(near ...complex128) ([]complex128, error) {
	e := newEvaluator(m)
	found := e.fromStarts()
	for _, z := range near {
		if !closeTo(z, found) {
			if r, ok := e.descend(z, found); ok {
				found = append(found, r)
			}
		}
	}
	for range 24 {
		radius := 0.05
		for _, r := range found {
			radius = max(radius, cmplx.Abs(r))
		}
		c := circle{e: e, radius: radius * (1 + 1e-9), known: found}
		beyond, ok := c.zeros(e.nodes())
		if !ok {
			return nil, ErrUnsettled
		}
		if beyond == 0 {
			slices.SortFunc(found, func(a, b complex128) int { return cmp.Compare(cmplx.Abs(b), cmplx.Abs(a)) })
			return found, nil
		}
		r, ok := e.outermost(&c, beyond, found)
		if !ok {
			return nil, ErrUnsettled
		}
		found = append(found, r)
	}
	return nil, ErrUnsettled
}

// Modes describes what Poles returns: the least damped first, of those no faster
// than twice the structure's fastest mode, and of the one that decides the spectral
// radius. Dead times have faster poles without number; those that matter are larger
// than the structure's.
func (m *Model) Modes(poles []complex128) []Mode {
	e := newEvaluator(m)
	var modes []Mode
	for _, z := range m.slow(poles) {
		mode := newMode(z, m.dt)
		mode.Shape = e.shape(z, m.levels)
		modes = append(modes, mode)
	}
	slices.SortStableFunc(modes, func(a, b Mode) int { return cmp.Compare(a.Damping, b.Damping) })
	return modes
}

// LeastDamping is the damping ratio of the first of Modes; NaN where there is none.
func (m *Model) LeastDamping(poles []complex128) float64 {
	least := math.NaN()
	for _, z := range m.slow(poles) {
		if d := newMode(z, m.dt).Damping; !(d >= least) {
			least = d
		}
	}
	return least
}

// slow are the largest pole and those no faster than twice the structure's fastest.
func (m *Model) slow(poles []complex128) []complex128 {
	fastest := 0.0
	for _, z := range m.starts {
		fastest = max(fastest, newMode(z, m.dt).Frequency)
	}
	var out []complex128
	for i, z := range poles {
		if i == 0 || newMode(z, m.dt).Frequency <= 2*fastest {
			out = append(out, z)
		}
	}
	return out
}

// Radius returns the spectral radius; near as in Poles.
func (m *Model) Radius(near ...complex128) (float64, error) {
	poles, err := m.Poles(near...)
	if err != nil || len(poles) == 0 {
		return 0, err
	}
	return cmplx.Abs(poles[0]), nil
}

// Pole goes from a guess to a pole near it.
func (m *Model) Pole(guess complex128) (complex128, bool) { return newEvaluator(m).descend(guess, nil) }

// Unstable returns how many poles are outside the circle of that radius, each of a
// pair counted. It need not find them.
func (m *Model) Unstable(radius float64) (int, error) {
	e := newEvaluator(m)
	found := e.fromStarts()
	c := circle{e: e, radius: radius, known: found}
	n, ok := c.zeros(e.nodes())
	if !ok {
		return 0, ErrUnsettled
	}
	for _, r := range found {
		if cmplx.Abs(r) > radius {
			n += weight(r)
		}
	}
	return n, nil
}

// fromStarts are the poles that those of the structure with perfect actuators become.
func (e *evaluator) fromStarts() (found []complex128) {
	for _, z := range e.m.starts {
		if r, ok := e.descend(z, found); ok {
			found = append(found, r)
		}
	}
	return found
}

// closeTo reports whether a guess is as good as found already.
func closeTo(z complex128, found []complex128) bool {
	for _, r := range found {
		if cmplx.Abs(z-r) < 0.3*math.Abs(imag(r))+1e-6 {
			return true
		}
	}
	return false
}

func weight(r complex128) int {
	if imag(r) == 0 {
		return 1
	}
	return 2
}

// deflated is F with the known zeros and their conjugates taken out.
func (e *evaluator) deflated(z complex128, known []complex128) scaled {
	f := e.at(z)
	w := 1 / z
	for _, r := range known {
		f.m /= 1 - r*w
		if imag(r) != 0 {
			f.m /= 1 - cmplx.Conj(r)*w
		}
	}
	return f.times(1)
}

// descend goes from z to a zero of F that is not known yet, by secants.
func (e *evaluator) descend(z complex128, known []complex128) (complex128, bool) {
	z0, z1 := z, z+complex(1e-6, 1e-6)
	f0, f1 := e.deflated(z0, known), e.deflated(z1, known)
	for range 60 {
		if f1.m == 0 {
			return settle(z1), true
		}
		step := (z1 - z0) / (1 - f0.over(f1))
		if size := cmplx.Abs(step); size > 0.2 {
			step *= complex(0.2/size, 0)
		}
		z0, f0 = z1, f1
		z1 -= step
		size := cmplx.Abs(z1)
		if !(size > 0.02 && size < 50) {
			return 0, false
		}
		f1 = e.deflated(z1, known)
		if cmplx.Abs(step) <= 2e-15*size {
			return settle(z1), true
		}
		if cmplx.Abs(step) <= 1e-11*size && !(f1.log() < f0.log()) {
			return settle(z0), true // as far as the digits go
		}
	}
	return 0, false
}

// settle takes the one of a pair with Im ≥ 0, and what is real to rounding for
// real.
func settle(z complex128) complex128 {
	if math.Abs(imag(z)) < 1e-11*cmplx.Abs(z) {
		return complex(real(z), 0)
	}
	return complex(real(z), math.Abs(imag(z)))
}

// outermost looks for a zero outside the circle that is not known: there, and, where
// that leads nowhere or there are many, between the largest circle outside which
// there is one and the smallest outside which there is none, drawn closer and closer.
func (e *evaluator) outermost(c *circle, beyond int, known []complex128) (complex128, bool) {
	if beyond <= 2 {
		if r, ok := e.beyond(c, c.radius, known); ok {
			return r, true
		}
	}
	low, high := c.radius, 0.0
	next := circle{e: e, known: known}
	for share, step := 0.01, 0; step < 24; step++ {
		if high == 0 {
			next.radius = c.radius * (1 + share)
			share *= 2
		} else {
			next.radius = math.Sqrt(low * high)
		}
		n, ok := next.zeros(e.nodes())
		if !ok || high > 0 || n == 0 {
			if r, ok := e.beyond(&next, c.radius, known); ok {
				return r, true
			}
		}
		if ok && n > 0 {
			low = next.radius
		} else {
			high = next.radius
		}
	}
	return 0, false
}

// beyond looks for a zero outside a radius that is not known, from the places on a
// circle where F is least.
func (e *evaluator) beyond(c *circle, radius float64, known []complex128) (complex128, bool) {
	slices.SortFunc(c.dips, func(a, b dip) int { return cmp.Compare(a.log, b.log) })
	for _, d := range c.dips[:min(12, len(c.dips))] {
		for _, out := range []float64{1, 1.001, 1.03} {
			r, ok := e.descend(cmplx.Rect(c.radius*out, d.angle), known)
			if ok && cmplx.Abs(r) > radius*(1-1e-12) {
				return r, true
			}
		}
	}
	return 0, false
}

// nodes are angles from 0 to π between which F is looked at more closely where it
// turns.
func (e *evaluator) nodes() []float64 {
	m := e.m
	nodes := []float64{0}
	first := math.Pi / 4
	if len(m.angles) > 0 && m.angles[0] > 0 {
		first = m.angles[0]
	}
	for a := 0.1 * min(first, math.Pi/4); a < math.Pi/1.3; a *= 1.5 {
		nodes = append(nodes, a)
	}
	for _, a := range m.angles {
		if a > 0 && a < math.Pi {
			nodes = append(nodes, a)
		}
	}
	nodes = append(nodes, math.Pi)
	slices.Sort(nodes)
	return slices.Compact(nodes)
}

// circle counts zeros of F outside a circle about 0, but for those that are known.
type circle struct {
	e      *evaluator
	radius float64
	known  []complex128
	dips   []dip
	left   int // evaluations that may still be spent
}

// dip is a place where the size of F is less than around it.
type dip struct{ angle, log float64 }

// sample is F at one angle, and how much comes back there of a force.
type sample struct {
	angle float64
	f     scaled
	log   float64
	loud  bool
}

func (c *circle) sample(angle float64) sample {
	c.left--
	f := c.e.deflated(cmplx.Rect(c.radius, angle), c.known)
	return sample{angle, f, f.log(), c.e.returned() > quiet}
}

// zeros goes along the upper half of the circle; the lower is its mirror image.
// F is analytic outside and 1 at infinity, so it turns back by 2π for each zero
// there. ok is false where F cannot be followed.
func (c *circle) zeros(nodes []float64) (n int, ok bool) {
	c.left, c.dips = 200000, c.dips[:0]
	turned := 0.0
	last := c.sample(nodes[0])
	older := last
	for _, angle := range nodes[1:] {
		next := c.sample(angle)
		d, ok := c.turn(last, next, 0)
		if !ok {
			return 0, false
		}
		turned += d
		if last.log <= older.log && last.log <= next.log {
			c.dips = append(c.dips, dip{last.angle, last.log})
		}
		older, last = last, next
	}
	c.dips = append(c.dips, dip{last.angle, last.log}) // a real one lies at the end
	turns := -turned / math.Pi
	whole := math.Round(turns)
	return int(whole), math.Abs(turns-whole) < 0.1
}

// quiet is how little may come back for det(I − L) to stay near 1 wherever its phases
// are.
const quiet = 0.2

// How far F may turn, rad, and how much its logarithm may bend in half a piece, for
// it to be followed without doubt.
const mostTurn, mostBend = 0.7, 0.35

// turn is by how much F turns between two samples.
func (c *circle) turn(a, b sample, depth int) (float64, bool) {
	if depth > 60 || c.left < 0 {
		return 0, false
	}
	m := c.sample(0.5 * (a.angle + b.angle))
	first, second := turned(a, m), turned(m, b)
	coarse := (a.loud || m.loud || b.loud) && (b.angle-a.angle)*c.e.m.longest > mostTurn*2
	if !coarse && math.Abs(first) < mostTurn && math.Abs(second) < mostTurn && math.Abs(m.log-0.5*(a.log+b.log)) < mostBend {
		return first + second, true
	}
	if m.log < a.log && m.log < b.log {
		c.dips = append(c.dips, dip{m.angle, m.log})
	}
	first, ok := c.turn(a, m, depth+1)
	if !ok {
		return 0, false
	}
	second, ok = c.turn(m, b, depth+1)
	return first + second, ok
}

func turned(a, b sample) float64 { return cmplx.Phase(b.f.m / a.f.m) }
