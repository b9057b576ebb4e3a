package identify

import (
	"context"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// fitter fits one record.
type fitter struct {
	ctx      context.Context
	rec      Record
	spectrum *spectrum
	first    guess
}

const (
	// glance is how many samples are used to choose between starts.
	glance = 1 << 15
	// settles is how many total delays what went before the record is felt:
	// e^(−12) of it is 6e-6.
	settles = 12
	// rounds bounds the iterations; usual are five to fifteen. Fewer tell which
	// start is best.
	rounds, glances = 60, 12
	// still is the gain, in squares of the noise, below which a step is none: it
	// moves no parameter by more than a hundredth of its standard error.
	still = 1e-4
)

// state is a point of the search: parameters, gain and offset, the answer to
// them for a gain of 1, and the sum of the squares that are left behind the
// skipped samples.
type state struct {
	p            []float64
	gain, offset float64
	y            []float64
	rss          float64
}

// fit finds the parameters that leave the least squares: from the best starts
// over a short stretch, then over all. The record is at first taken to begin in
// the middle of a motion, so that its beginning does not count; where the fit
// from rest explains the beginning as well as the rest, it is used.
func (f *fitter) fit(s shape) (*Fit, error) {
	short := *f
	from, to := loudest(f.rec.Command, glance)
	short.rec = f.rec.part(from, to)
	var best *state
	for _, p := range f.starts(s) {
		got, err := short.search(s, p, short.skip(), glances)
		if err != nil {
			return nil, err
		}
		if best == nil || got.rss < best.rss {
			best = got
		}
	}
	skip := f.skip()
	got, err := f.search(s, best.p, skip, rounds)
	if err != nil {
		return nil, err
	}
	rested, err := f.search(s, got.p, 0, rounds)
	if err != nil {
		return nil, err
	}
	fit := &Fit{Kind: s.kind, shape: s}
	if f.began(rested, got, skip) {
		fit.AtRest = true
		got, skip = rested, 0
	}
	if err := f.conclude(fit, got, skip); err != nil {
		return nil, err
	}
	return fit, nil
}

// skip is how many samples at the beginning may remember what went before.
func (f *fitter) skip() int {
	total := max(f.first.total, f.rec.Tick)
	n := len(f.rec.Command)
	return min(int(settles*total/f.rec.Tick)+4, n/5)
}

// began reports whether the beginning, from rest, is explained as well as the
// rest of the record is.
func (f *fitter) began(rested, got *state, skip int) bool {
	early := f.squares(rested, 0, skip) / float64(skip)
	later := got.rss / float64(len(f.rec.Command)-skip)
	size := got.gain * spread(got.y)
	return early <= 4*later+1e-12*size*size
}

func (f *fitter) squares(s *state, from, to int) float64 {
	sum := 0.0
	for k := from; k < to; k++ {
		r := f.rec.Measured[k] - s.gain*s.y[k] - s.offset
		sum += r * r
	}
	return sum
}

// search is Levenberg and Marquardt's: Gauss-Newton steps, damped until they
// help (Marquardt 1963), kept inside the bounds.
func (f *fitter) search(s shape, start []float64, skip, rounds int) (*state, error) {
	now, err := f.try(s, slices.Clone(start), skip)
	if err != nil {
		return nil, err
	}
	damping := 1e-3
	for range rounds {
		if err := f.ctx.Err(); err != nil {
			return nil, err
		}
		normal, slope, err := f.normal(s, now, skip)
		if err != nil {
			return nil, err
		}
		better := false
		for damping < 1e12 {
			p, ok := step(s, now, normal, slope, damping)
			if ok {
				next, err := f.try(s, p, skip)
				if err != nil {
					return nil, err
				}
				if next.rss < now.rss {
					gained := (now.rss - next.rss) / now.rss * float64(len(now.y))
					now, better = next, gained > still
					damping = max(damping/10, 1e-12)
					break
				}
			}
			damping *= 8
		}
		if !better || now.rss == 0 {
			break
		}
	}
	return now, nil
}

// try finds what parameters leave, with the gain and offset that leave least.
func (f *fitter) try(s shape, p []float64, skip int) (*state, error) {
	s.clamp(p)
	now := &state{p: p, y: make([]float64, len(f.rec.Command))}
	if err := s.run(now.y, &f.rec, p); err != nil {
		return nil, err
	}
	y, m := now.y[skip:], f.rec.Measured[skip:]
	my, mm := mean(y), mean(m)
	var yy, ym float64
	for k := range y {
		yy += (y[k] - my) * (y[k] - my)
		ym += (y[k] - my) * (m[k] - mm)
	}
	if yy > 0 {
		now.gain = ym / yy
	}
	now.offset = mm - now.gain*my
	now.rss = f.squares(now, skip, len(now.y))
	return now, nil
}

// columns are the derivatives of the answer from a sample on: to the parameters,
// the gain and the offset. The answer to a parameter that is a little off comes
// from the actuator itself.
func (f *fitter) columns(s shape, now *state, from int, central bool) ([][]float64, error) {
	cols := make([][]float64, s.n+2)
	for i := range s.n {
		d, err := f.derivative(s, now, i, central)
		if err != nil {
			return nil, err
		}
		for k := range d {
			d[k] *= now.gain
		}
		cols[i] = d[from:]
	}
	cols[s.n] = slices.Clone(now.y[from:])
	cols[s.n+1] = slices.Repeat([]float64{1}, len(now.y)-from)
	return cols, nil
}

// derivative is that of the answer to parameter i, by a difference to one side,
// away from the bound, or a central one.
func (f *fitter) derivative(s shape, now *state, i int, central bool) ([]float64, error) {
	h := s.nudge(now.p, i)
	nudged := func(h float64) ([]float64, float64, error) {
		p := slices.Clone(now.p)
		p[i] += h
		s.clamp(p)
		if p[i] == now.p[i] {
			return now.y, p[i], nil
		}
		y := make([]float64, len(now.y))
		return y, p[i], s.run(y, &f.rec, p)
	}
	y, at, err := nudged(h)
	if err != nil {
		return nil, err
	}
	other, from := now.y, now.p[i]
	if central || at == from {
		if other, from, err = nudged(-h); err != nil {
			return nil, err
		}
	}
	d := make([]float64, len(y))
	if at == from {
		return d, nil
	}
	for k := range d {
		d[k] = (y[k] - other[k]) / (at - from)
	}
	return d, nil
}

// normal is JᵀJ and Jᵀr.
func (f *fitter) normal(s shape, now *state, skip int) (*mat.SymDense, []float64, error) {
	cols, err := f.columns(s, now, skip, false)
	if err != nil {
		return nil, nil, err
	}
	slope := make([]float64, len(cols))
	r := f.residual(now, skip)
	for i, c := range cols {
		slope[i] = dot(c, r)
	}
	return products(cols), slope, nil
}

// residual is what the fit leaves from a sample on.
func (f *fitter) residual(now *state, from int) []float64 {
	r := make([]float64, len(now.y)-from)
	m, y := f.rec.Measured[from:], now.y[from:]
	for k := range r {
		r[k] = m[k] - now.gain*y[k] - now.offset
	}
	return r
}

// step is the damped step; a parameter at a bound that would go beyond stays
// where it is. It reports false where there is none.
func step(s shape, now *state, normal *mat.SymDense, slope []float64, damping float64) ([]float64, bool) {
	var fixed [3]bool
	for range s.n + 1 {
		d, ok := damped(normal, slope, damping, fixed[:s.n])
		if !ok {
			return nil, false
		}
		again := false
		p := slices.Clone(now.p)
		for i := range s.n {
			p[i] += d[i]
		}
		want := slices.Clone(p)
		s.clamp(p)
		for i := range s.n {
			// Stuck: it is at the bound, and pushes.
			if p[i] == now.p[i] && want[i] != p[i] && !fixed[i] {
				fixed[i], again = true, true
			}
		}
		if !again {
			return p, true
		}
	}
	return nil, false
}

// damped solves (N + λ·diag N)·d = slope for the parameters that are not fixed.
func damped(normal *mat.SymDense, slope []float64, damping float64, fixed []bool) ([]float64, bool) {
	m := len(slope)
	a := mat.NewSymDense(m, nil)
	b := mat.NewVecDense(m, nil)
	scale := make([]float64, m)
	for i := range m {
		if v := normal.At(i, i); v > 0 {
			scale[i] = 1 / math.Sqrt(v)
		}
	}
	for i := range m {
		out := i < len(fixed) && fixed[i] || scale[i] == 0
		for j := i; j < m; j++ {
			other := j < len(fixed) && fixed[j] || scale[j] == 0
			v := normal.At(i, j) * scale[i] * scale[j]
			if out || other {
				v = 0
			}
			if i == j {
				v = 1 + damping
			}
			a.SetSym(i, j, v)
		}
		if !out {
			b.SetVec(i, slope[i]*scale[i])
		}
	}
	var c mat.Cholesky
	if !c.Factorize(a) {
		return nil, false
	}
	var x mat.VecDense
	if err := c.SolveVecTo(&x, b); err != nil {
		return nil, false
	}
	d := make([]float64, m)
	for i := range m {
		d[i] = x.AtVec(i) * scale[i]
	}
	return d, true
}
