package gauge

import "math"

// Tracking holds the running gauges of one channel. With e = x − y, samples
// k = 0 (Start) to n (the last Add), and sums over all of them:
//
//	NRMSE           √(Σe²/Σx²)
//	amplitude ratio √(Σy²/Σx²)
//	peak error      max|e|, its ratio to max|x|
//	indicator       TI = Σ ½(x_{k−1}·y_k − x_k·y_{k−1}), the area ½∮(x dy − y dx)
//	                enclosed by the trail in the (x, y) plane, m² (Mercan & Ricles
//	                2007); it grows while y is late and falls while y is early
//
// For x = A·sin ωt and y = g·A·sin(ωt−φ) TI grows by π·A²·g·sin φ a cycle, times
// sin(ωΔt)/(ωΔt) because the trail is a polygon.
//
// The samples of the trailing window also feed the synchronization subspace,
// see Ellipse.
//
// A tick costs the same whatever has gone before. Sums over the whole run grow
// by one block (a window's worth of ticks) at a time into compensated sums.
// Sums over the window add the newest sample and subtract the one that leaves;
// a second set, begun afresh each time the ring of samples wraps, replaces them
// at the next wrap, so no rounding error lives longer than two windows.
type Tracking struct {
	running moments // over the window
	fresh   moments // since the ring last wrapped
	anchor  point   // what both are taken about: the centre of the window at the wrap
	last    point   // newest sample
	gone    point   // newest sample that has left the window

	ring []point
	at   int // where the newest sample goes
	full bool

	block float64 // Σe² since the ring last wrapped

	peakError, peakTarget float64

	ticks    int   // at the last wrap
	wrapped  point // newest sample at the last wrap
	base     spread
	errors   Sum // Σe² up to the last wrap
	targets  Sum // Σx²
	measured Sum // Σy²
	area     Sum // 2·TI
}

// point is one sample of the trail.
type point struct{ x, y float64 }

// moments are sums over samples u = x − anchor.x, w = y − anchor.y and over
// the steps that lead to them.
type moments struct {
	x, y       float64 // Σu, Σw
	xx, yy, xy float64 // Σu², Σw², Σuw
	area       float64 // Σ(u_{k−1}·w_k − u_k·w_{k−1}), twice the area swept
	step       float64 // Σ(u_k − u_{k−1})²
}

// spread is the second moments that a running set was gathered with; together
// with what came in since they bound its rounding error.
type spread struct{ xx, yy float64 }

// NewTracking returns gauges whose synchronization subspace covers the last
// window samples (at least 2) and the steps that lead to them. Start comes
// before the first Add.
func NewTracking(window int) *Tracking {
	return &Tracking{ring: make([]point, max(window, 2))}
}

// Start forgets everything and takes the first sample.
func (t *Tracking) Start(x, y float64) {
	first := point{x, y}
	*t = Tracking{
		ring: t.ring, at: 1,
		anchor: first, last: first, gone: first, wrapped: first,
		block:     (x - y) * (x - y),
		peakError: math.Abs(x - y), peakTarget: math.Abs(x),
	}
	t.ring[0] = first
}

// Add takes the sample of one tick.
func (t *Tracking) Add(x, y float64) {
	e := x - y
	t.block += e * e
	if a := math.Abs(e); a > t.peakError {
		t.peakError = a
	}
	if a := math.Abs(x); a > t.peakTarget {
		t.peakTarget = a
	}

	ax, ay := t.anchor.x, t.anchor.y
	dx, dy := x-t.last.x, y-t.last.y
	u, w := x-ax, y-ay
	xx, yy, xy := u*u, w*w, u*w
	// Equal to u_{k−1}·w_k − u_k·w_{k−1}, without its cancellation.
	area := u*dy - w*dx
	step := dx * dx
	t.last = point{x, y}

	f := &t.fresh
	f.x += u
	f.y += w
	f.xx += xx
	f.yy += yy
	f.xy += xy
	f.area += area
	f.step += step

	slot := &t.ring[t.at]
	if t.full {
		old := *slot
		dx, dy := old.x-t.gone.x, old.y-t.gone.y
		ou, ow := old.x-ax, old.y-ay
		t.gone = old
		u -= ou
		w -= ow
		xx -= ou * ou
		yy -= ow * ow
		xy -= ou * ow
		area -= ou*dy - ow*dx
		step -= dx * dx
	}
	r := &t.running
	r.x += u
	r.y += w
	r.xx += xx
	r.yy += yy
	r.xy += xy
	r.area += area
	r.step += step

	*slot = point{x, y}
	t.at++
	if t.at == len(t.ring) {
		t.wrap()
	}
}

// wrap is called when the ring has been filled once more: the fresh set now
// covers exactly the window and takes over, about the window's own centre.
func (t *Tracking) wrap() {
	n := len(t.ring)
	gained := t.sinceWrap()
	t.errors.Add(t.block)
	t.targets.Add(gained.xx)
	t.measured.Add(gained.yy)
	t.area.Add(gained.area)
	t.block = 0

	shift := point{t.fresh.x / float64(n), t.fresh.y / float64(n)}
	t.base = spread{t.fresh.xx, t.fresh.yy}
	t.running = t.fresh.about(shift, n, point{t.last.x - t.wrapped.x, t.last.y - t.wrapped.y})
	t.fresh = moments{}
	t.anchor.x += shift.x
	t.anchor.y += shift.y

	t.ticks += n
	if !t.full {
		t.ticks-- // the start is not a tick
	}
	t.wrapped = t.last
	t.at = 0
	t.full = true
}

// about returns the moments of the same n samples about a point that lies at
// shift from the present anchor; travel is their last sample less the one that
// the first step came from.
func (m moments) about(shift point, n int, travel point) moments {
	k := float64(n)
	m.xx += shift.x * (k*shift.x - 2*m.x)
	m.yy += shift.y * (k*shift.y - 2*m.y)
	m.xy += k*shift.x*shift.y - shift.x*m.y - shift.y*m.x
	m.area -= shift.x*travel.y - shift.y*travel.x
	m.x -= k * shift.x
	m.y -= k * shift.y
	return m
}

// sinceWrap is the fresh set about the origin, as the gauges of the whole run
// need it.
func (t *Tracking) sinceWrap() moments {
	return t.fresh.about(point{-t.anchor.x, -t.anchor.y}, t.at,
		point{t.last.x - t.wrapped.x, t.last.y - t.wrapped.y})
}

// NRMSE returns rms(x−y)/rms(x) over the whole run, NaN while x has been zero.
func (t *Tracking) NRMSE() float64 {
	return rootRatio(t.errors.Value()+t.block, t.targets.Value()+t.sinceWrap().xx)
}

// AmplitudeRatio returns rms(y)/rms(x) over the whole run, NaN while x has
// been zero.
func (t *Tracking) AmplitudeRatio() float64 {
	gained := t.sinceWrap()
	return rootRatio(t.measured.Value()+gained.yy, t.targets.Value()+gained.xx)
}

// PeakError returns the largest |x−y| so far, m.
func (t *Tracking) PeakError() float64 { return t.peakError }

// PeakTarget returns the largest |x| so far, m.
func (t *Tracking) PeakTarget() float64 { return t.peakTarget }

// PeakErrorRatio returns the peak error over the peak target, NaN while x has
// been zero.
func (t *Tracking) PeakErrorRatio() float64 {
	if t.peakTarget == 0 {
		return math.NaN()
	}
	return t.peakError / t.peakTarget
}

// Indicator returns the tracking indicator TI, m², positive when late.
func (t *Tracking) Indicator() float64 {
	return (t.area.Value() + t.sinceWrap().area) / 2
}

// rootRatio returns √(a/b) of two sums of squares, NaN when b is none.
func rootRatio(a, b float64) float64 {
	if b == 0 {
		return math.NaN()
	}
	return math.Sqrt(a / b)
}
