package tempo

import (
	"math"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
)

// sums gathers the squares of the three differences and of the reference over
// all levels and ticks, and the product of the two parts.
type sums struct {
	total, sync, rate, product, reference gauge.Sum
	broken                                bool // the reference or the perfect loop is no number to compare with
}

// add takes the tick that the rig has just done. A tick at which the lane
// diverged is no part of its response.
func (s *sums) add(rig *rtloop.Rig) {
	if rig.Reference == nil || rig.Lanes[0].Loop.Outcome() == rtloop.Diverged {
		return
	}
	perfect := rig.Lanes[1].Loop
	if rig.Reference.Outcome() == rtloop.Diverged || perfect.Outcome() == rtloop.Diverged {
		s.broken = true
		return
	}
	hybrid, ideal, ref := rig.Lanes[0].Loop.Displacements(), perfect.Displacements(), rig.Reference.Displacements()
	var total, sync, rate, product, reference float64
	for k := range hybrid {
		e, d, r := hybrid[k]-ref[k], hybrid[k]-ideal[k], ideal[k]-ref[k]
		total += e * e
		sync += d * d
		rate += r * r
		product += d * r
		reference += ref[k] * ref[k]
	}
	s.total.Add(total)
	s.sync.Add(sync)
	s.rate.Add(rate)
	s.product.Add(product)
	s.reference.Add(reference)
}

// split relates everything to the reference.
func (s *sums) split(rig *rtloop.Rig) Split {
	ref := s.reference.Value()
	if rig.Reference == nil || s.broken || !(ref > 0) {
		return Split{math.NaN(), math.NaN(), math.NaN(), math.NaN()}
	}
	out := Split{
		Total: math.Sqrt(s.total.Value() / ref),
		Sync:  math.Sqrt(s.sync.Value() / ref),
		Rate:  math.Sqrt(s.rate.Value() / ref),
	}
	out.Correlation = s.product.Value() / math.Sqrt(s.sync.Value()*s.rate.Value())
	if out.Rate < nothing || out.Sync < nothing {
		out.Correlation = math.NaN() // of roundings
	}
	return out
}

// nothing is a part of the response that is made of roundings.
const nothing = 1e-9

// Fastest is the index of the smallest slowdown that passes, -1 if none does.
func (r *Report) Fastest() int {
	if !r.Limits {
		return -1
	}
	for i := range r.Points {
		if r.Points[i].Lane.Pass {
			return i
		}
	}
	return -1
}

// SlowerFails is the index of the first slowdown beyond the fastest that passes
// which does not pass again, -1 if there is none.
func (r *Report) SlowerFails() int {
	fastest := r.Fastest()
	for i := range r.Points {
		if fastest >= 0 && i > fastest && !r.Points[i].Lane.Pass {
			return i
		}
	}
	return -1
}
