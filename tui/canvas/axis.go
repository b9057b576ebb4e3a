package canvas

import "math"

// axis is an Axis at work: its range, its ticks and the way from values to dots.
type axis struct {
	lo, hi float64
	step   step
	ticks  []float64
	labels []string
	widest int // columns of the widest label

	from, perUnit, offset float64 // dot = (value − from)·perUnit + offset
}

func (a *axis) span() float64 { return math.Abs(a.hi - a.lo) }

// widen makes the range as wide as span about its middle, never narrower.
func (a *axis) widen(span float64) {
	if !(span > a.span()) {
		return
	}
	half := span / 2
	if a.hi < a.lo {
		half = -half
	}
	mid := a.lo/2 + a.hi/2
	a.lo, a.hi = mid-half, mid+half
}

// mark chooses ticks at least apart of the span from each other, but never so
// far that the axis could be left with a single one, and writes their labels when
// asked. The choice depends on the span alone: ticks of a window that slides
// along keep their step.
func (a *axis) mark(spec *Axis, apart float64, labels bool) {
	a.ticks, a.labels, a.widest = a.ticks[:0], a.labels[:0], 0
	a.step = stepAbove(a.span() * between(apart, 2.0/maxTicks, 0.5))
	for a.step.times(1) > a.span()/2*(1+slack) {
		a.step = a.step.previous()
	}
	a.ticks = a.step.ticks(a.ticks, min(a.lo, a.hi), max(a.lo, a.hi))
	if !labels {
		return
	}
	for _, v := range a.ticks {
		text := ""
		if spec.Label != nil {
			text = spec.Label(v)
		} else {
			text = decimalLabel(v, a.step)
		}
		a.labels = append(a.labels, text)
		a.widest = max(a.widest, Width(text))
	}
}

// fit puts lo on the first and hi on the last of n dots, from the left or,
// upwards, from the bottom.
func (a *axis) fit(n int, upwards bool) {
	a.from, a.offset = a.lo, 0
	a.perUnit = float64(max(n-1, 0)) / (a.hi - a.lo)
	if upwards {
		a.offset = float64(max(n-1, 0))
		a.perUnit = -a.perUnit
	}
}

// far is where coordinates end: far enough outside any screen that bending a line
// there does not show, near enough that clipping it loses no dot to rounding.
const far = 1e7

// at is the dot coordinate of a value.
func (a *axis) at(v float64) float64 {
	c := (v-a.from)*a.perUnit + a.offset
	if c > far {
		return far
	}
	if c < -far {
		return -far
	}
	return c
}

func (a *axis) zeroInside() bool { return min(a.lo, a.hi) < 0 && max(a.lo, a.hi) > 0 }

// holds reports whether the value is on the axis.
func (a *axis) holds(v float64) bool { return v >= min(a.lo, a.hi) && v <= max(a.lo, a.hi) }
