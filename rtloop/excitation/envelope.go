package excitation

import "math"

// The words for an envelope.
const (
	trapezoidWord = "trapezoid"
	saragoniWord  = "saragoni-hart"
)

// envelope is the strength of a motion against time, at most 1.
type envelope interface {
	at(t float64) float64 // at t ≥ 0, s
	length() float64      // time after which nothing is left, s
}

// trapezoid is an envelope that rises from 0 to 1, stays, and falls to 0, all
// in straight lines; its fields are the times that takes, s.
type trapezoid struct{ rise, strong, decay float64 }

// at returns the envelope at t ≥ 0, s.
func (e *trapezoid) at(t float64) float64 {
	switch {
	case t < e.rise:
		return t / e.rise
	case t <= e.rise+e.strong:
		return 1
	}
	return math.Max(0, 1-(t-e.rise-e.strong)/e.decay) // decay 0: −∞, so 0
}

// length returns the time after which the envelope is zero, s.
func (e *trapezoid) length() float64 { return e.rise + e.strong + e.decay }

// saragoniHart is the envelope of Saragoni & Hart (1974),
//
//	e(t) = a·(t/tn)^b·exp(−c·t/tn),
//	b = −ε·ln η/(1 + ε·(ln ε − 1)),   c = b/ε,   a = (e/ε)^b  (e the base of ln),
//
// tn in s, in the usual parametrisation: it is 1, its largest value, at ε·tn
// and η at tn. With τ = t/(ε·tn) all that is e = exp(b·(ln τ + 1 − τ)), which
// is how it is computed. It dies away behind tn and is taken for zero from
// where it has fallen to 1e-6.
type saragoniHart struct {
	peak float64 // ε·tn, s
	b    float64
	end  float64 // s
}

const saragoniRest = 1e-6

// newSaragoniHart returns the envelope for 0 < epsilon < 1, 0 < eta < 1 and
// tn > 0, s.
func newSaragoniHart(epsilon, eta, tn float64) *saragoniHart {
	e := &saragoniHart{
		peak: epsilon * tn,
		b:    -epsilon * math.Log(eta) / (1 + epsilon*(math.Log(epsilon)-1)),
	}
	// Behind its peak the envelope only falls: halve the interval of the end.
	before, after := e.peak, 2*e.peak
	for e.value(after) > saragoniRest {
		before, after = after, 2*after
	}
	for range 50 {
		if mid := (before + after) / 2; e.value(mid) > saragoniRest {
			before = mid
		} else {
			after = mid
		}
	}
	e.end = after
	return e
}

// value is the envelope without an end.
func (e *saragoniHart) value(t float64) float64 {
	tau := t / e.peak
	return math.Exp(e.b * (math.Log(tau) + 1 - tau)) // at 0: exp(−∞) = 0
}

// at returns the envelope at t ≥ 0, s.
func (e *saragoniHart) at(t float64) float64 {
	if t >= e.end {
		return 0
	}
	return e.value(t)
}

// length returns the time after which the envelope is zero, s.
func (e *saragoniHart) length() float64 { return e.end }
