package accept

import (
	"cmp"
	"math"
	"slices"

	"antelag/rtloop"
)

// Rank sorts lanes from best to worst: those that pass first, then those that
// ran longest, then by the error of the structure's response against the
// reference, or, where there is no reference, by the tracking error of the
// worst channel. The order of equals is kept.
func Rank(lanes []Lane) []Lane {
	out := slices.Clone(lanes)
	slices.SortStableFunc(out, func(a, b Lane) int {
		return cmp.Or(
			cmp.Compare(order(a), order(b)),
			cmp.Compare(-ran(a), -ran(b)),
			cmp.Compare(score(a), score(b)))
	})
	return out
}

func order(l Lane) int {
	if l.Pass {
		return 0
	}
	return 1
}

// ran is the model time at which the lane stopped, or +Inf if it did not.
func ran(l Lane) float64 {
	if l.Trip != nil {
		return l.Trip.Time
	}
	return math.Inf(1)
}

func score(l Lane) float64 {
	for _, f := range []rtloop.Figure{l.ResponseError, measure(l.LaneResult, "nrmse").Got} {
		if f.Defined() {
			return float64(f)
		}
	}
	return math.Inf(1)
}
