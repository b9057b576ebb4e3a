package accept

import (
	"antelag/rtloop"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Label says in words what the limit judges, "tracking error, rms".
func (j *Judgement) Label() string { return labels[j.Limit] }

// Found writes the figure that was judged, with its unit.
func (j *Judgement) Found() string { return j.found() }

// Allowed writes the limit, with its unit and its direction.
func (j *Judgement) Allowed() string { return j.allowed() }

// Ending says how the lane ended and what became of its limits; whole is the
// length of the run in model seconds.
func (l *Lane) Ending(whole float64) string { return ending(l, whole) }

// Figures are the names of all figures that a limit can judge, in the order in
// which they are judged.
func Figures() []string { return append([]string(nil), limitNames...) }

// Label says in words what the limit of that name judges.
func Label(limit string) string { return labels[limit] }

// Figure finds the figure that the limit of that name would judge, of the worst
// channel, whether there is such a limit or not; SI.
func (l *Lane) Figure(limit string) (value float64, dim quantity.Dim) {
	j := measure(l.LaneResult, limit)
	return float64(j.Got), j.Dim
}

// Printable keeps what a file gave for a name from moving the cursor.
func Printable(s string) string { return printable(s) }

// Word is a verdict in one word of four letters.
func Word(pass, colour bool) string {
	word, code := "FAIL", "31;1"
	if pass {
		word, code = "PASS", "32;1"
	}
	if !colour {
		return word
	}
	return "\x1b[" + code + "m" + word + "\x1b[0m"
}

// Judge holds the figures of a lane that ran elsewhere against limits.
func Judge(res rtloop.LaneResult, limits kind.Values) Lane { return judge(res, limits) }
