package canvas

import "math"

// Scale keeps the bounds of an axis from jumping. It is told the extent of the
// data of every frame. The bounds are multiples of a 1-2-5 step; they
//
//   - grow at once when data leave them, and only on the sides where data do, up
//     to the rounding to a coarser step;
//   - shrink only when the data have filled less than Share of them for Frames
//     frames in a row, and then to what those frames together needed.
//
// Data that have not moved yet set no bounds that would have to be waited out:
// the first frame with an extent does.
//
// The zero value is ready, with the defaults below.
type Scale struct {
	Symmetric bool    // bounds are −b and +b
	Share     float64 // default 0.4; more lets a scale shrink that was just set
	Frames    int     // default 40: two seconds at 20 frames a second
	MinSpan   float64 // smallest span, so that rest does not magnify noise; default none

	shown    bool // lo and hi hold
	set      bool // they come from data that moved
	lo, hi   float64
	idle     int     // frames in a row that filled less than Share
	low, top float64 // extent of these frames
}

// Bounds are the bounds now; 0 and 1, or ±1 when symmetric, before any data.
func (s *Scale) Bounds() (lo, hi float64) {
	switch {
	case s.shown:
		return s.lo, s.hi
	case s.Symmetric:
		return -1, 1
	}
	return 0, 1
}

// Reset forgets all data.
func (s *Scale) Reset() {
	s.shown, s.set, s.idle = false, false, 0
}

// slack is what data may lie beyond a bound that was meant to be theirs and
// differs by rounding, as a share of the span.
const slack = 1e-9

// Update takes the extent of one frame's data. NaN on both sides means that
// there were none and changes nothing; infinities count as the largest number
// that can be plotted. It returns the bounds.
func (s *Scale) Update(lo, hi float64) (float64, float64) {
	if math.IsNaN(lo) && math.IsNaN(hi) {
		return s.Bounds()
	}
	lo, hi = s.extent(lo, hi)
	switch {
	case !s.set:
		s.lo, s.hi = s.nice(lo, hi)
		s.shown, s.idle = true, 0
		s.set = hi > lo || s.MinSpan > 0
	case lo < s.lo-slack*(s.hi-s.lo) || hi > s.hi+slack*(s.hi-s.lo):
		s.lo, s.hi = s.nice(math.Min(lo, s.lo), math.Max(hi, s.hi))
		s.idle = 0
	default:
		s.rest(lo, hi)
	}
	return s.lo, s.hi
}

// rest counts the frames that fill too little and shrinks after enough of them.
func (s *Scale) rest(lo, hi float64) {
	share, frames := s.Share, s.Frames
	if !(share > 0) {
		share = 0.4
	}
	if frames <= 0 {
		frames = 40
	}
	if s.idle == 0 {
		s.low, s.top = lo, hi
	}
	s.low, s.top = math.Min(s.low, lo), math.Max(s.top, hi)
	if s.top-s.low >= share*(s.hi-s.lo) {
		s.idle = 0
		return
	}
	if s.idle++; s.idle < frames {
		return
	}
	s.idle = 0
	if lo, hi := s.nice(s.low, s.top); hi-lo < s.hi-s.lo {
		s.lo, s.hi = lo, hi
	}
}

// extent orders and bounds what was given and mirrors it when symmetric.
func (s *Scale) extent(lo, hi float64) (float64, float64) {
	if math.IsNaN(lo) {
		lo = hi
	}
	if math.IsNaN(hi) {
		hi = lo
	}
	if lo > hi {
		lo, hi = hi, lo
	}
	if s.Symmetric {
		hi = math.Max(math.Abs(lo), math.Abs(hi))
		lo = -hi
	}
	return math.Max(-hugeValue, lo), math.Min(hi, hugeValue)
}

// nice is the smallest range around the extent whose bounds are multiples of a
// step of about a quarter of it. The step is at most 2½/4 of the extent and each
// side is less than a step away, so the extent fills more than 1/(1+2·2½/4) = 4/9;
// the larger of ±1, 2, 5 is filled to 2/5 at least. Neither can shrink again at
// the default share.
func (s *Scale) nice(lo, hi float64) (float64, float64) {
	if s.Symmetric {
		hi = math.Max(hi, math.Min(s.MinSpan/2, hugeValue))
		_, hi = properRange(-hi, hi)
		hi = stepAbove(hi).times(1)
		return -hi, hi
	}
	if span := s.MinSpan; span > hi-lo && span < hugeValue {
		mid := lo/2 + hi/2
		from, to := mid-span/2, mid+span/2
		switch {
		case lo >= 0 && from < 0: // what is never negative keeps its zero
			from, to = 0, span
		case hi <= 0 && to > 0:
			from, to = -span, 0
		}
		lo, hi = from, to
	}
	lo, hi = properRange(lo, hi)
	unit := stepAbove((hi - lo) / 4)
	one := unit.times(1)
	return unit.times(math.Floor(lo/one+slack) + 0), unit.times(math.Ceil(hi/one-slack) + 0)
}
