package accept

import (
	"antelag/rtloop"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// The words and figures of the verdict, for those who show it in another form
// than text.

// Room says how far the figure is from its limit, "81 % left".
func (j *Judgement) Room() string { return j.room() }

// Word is the verdict on the lane in one word: PASS or FAIL, or DONE where
// there was nothing to be judged by.
func (l *Lane) Word() string { return (&page{}).verdict(l) }

// Trouble says in a few words why the lane does not pass, "" if it does.
func (l *Lane) Trouble() string { return trouble(l) }

// Methods names the compensators of the lane.
func (l *Lane) Methods() string { return methods(l) }

// Within writes a figure and the limit that it was to stay below, if any.
func Within(f rtloop.Figure, dim quantity.Dim, limit *kind.Value) string {
	return within(f, dim, limit)
}

// SameUnit writes energies in one unit, so that they can be added up.
func SameUnit(terms ...rtloop.Figure) []string { return sameUnit(terms...) }

// NewJudgement is a figure of a limit that was found elsewhere, without a
// verdict, to be written in the same words; NaN is undefined.
func NewJudgement(limit string, got float64) Judgement {
	j := measure(rtloop.LaneResult{}, limit)
	j.Got = rtloop.Figure(got)
	return j
}
