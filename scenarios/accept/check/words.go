package check

import (
	"fmt"

	"antelag/scenarios/accept"
	"antelag/scenarios/accept/baseline"
)

// Row is one thing that failed: what was recorded, what is, what is allowed.
// Was is "" where no baseline tells.
type Row struct {
	Limit            bool // an acceptance limit, else a figure of the baseline
	What             string
	Was, Is, Allowed string
	Pass             bool
}

// limits lists the acceptance limits of the configured lane.
func (r *Result) limits() []Row {
	var out []Row
	lane := &r.Verdict.Lanes[0]
	for i := range lane.Accept {
		j := &lane.Accept[i]
		row := Row{Limit: true, What: j.Label(), Is: j.Found(), Allowed: j.Allowed(), Pass: j.Pass}
		if j.Channel != "" && len(lane.Channels) > 1 {
			row.What = j.Channel + ": " + row.What
		}
		if r.Baseline != nil {
			row.Was = r.Baseline.Text(lane.Name, j.Channel, j.Limit)
		}
		out = append(out, row)
	}
	return out
}

// moves lists the figures that left their tolerance.
func (r *Result) moves() []Row {
	if r.Comparison == nil {
		return nil
	}
	var out []Row
	for i := range r.Comparison.Moved {
		m := &r.Comparison.Moved[i]
		out = append(out, Row{What: r.place(m), Was: m.WasText, Is: m.IsText, Allowed: m.AllowedText})
	}
	return out
}

// place names a figure by lane and channel, where there are several.
func (r *Result) place(m *baseline.Move) string {
	what := m.Label
	if m.Channel != "" && len(r.Scene.Channels) > 1 {
		what = m.Channel + ": " + what
	}
	if len(r.Scene.Lanes) > 0 {
		what = m.Lane + ": " + what
	}
	return accept.Printable(what)
}

// status is the verdict in a word. Without limit and baseline nothing is
// judged: it is done.
func (r *Result) status() string {
	switch {
	case r.Verdict == nil || r.State == Unwritten:
		return "ERROR"
	case !r.Pass():
		return "FAIL"
	case len(r.Verdict.Lanes[0].Accept) == 0 && (r.State == Absent || r.State == Recorded):
		return "DONE"
	}
	return "PASS"
}

// accepted says in words what became of the limits.
func (r *Result) accepted() string {
	if r.Verdict == nil {
		return ""
	}
	lane := &r.Verdict.Lanes[0]
	if lane.Trip != nil {
		return fmt.Sprintf("%s at %.3f s: %s", lane.Outcome, lane.Trip.Time, lane.Trip.Limit)
	}
	met := 0
	for _, j := range lane.Accept {
		if j.Pass {
			met++
		}
	}
	switch all := len(lane.Accept); {
	case all == 0:
		return "no limits"
	case met < all:
		return fmt.Sprintf("limits failed: %d of %d", all-met, all)
	default:
		return fmt.Sprintf("limits met: %d of %d", met, all)
	}
}

// kept says in words what became of the baseline.
func (r *Result) kept() string {
	c := r.Comparison
	moved := func() string { return fmt.Sprintf("%d of %s moved", len(c.Moved), figures(c.Compared)) }
	switch r.State {
	case Same:
		text := "baseline: " + figures(c.Compared) + " hold"
		if n := len(c.Settings); n > 0 {
			text += fmt.Sprintf(", %s changed", count(n, "setting"))
		}
		return text
	case Moved:
		return "baseline: " + moved()
	case Recorded:
		return "baseline recorded"
	case Replaced:
		return "baseline recorded anew: " + moved()
	case Unchanged:
		return "baseline: " + figures(c.Compared) + " hold, left as it is"
	case Unwritten:
		return "baseline not recorded"
	}
	return "no baseline"
}

func figures(n int) string { return count(n, "figure") }

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// word colours a status like that of a run.
func word(status string, colour bool) string {
	switch {
	case !colour || status == "DONE":
		return status
	case status == "PASS":
		return accept.Word(true, true)
	case status == "FAIL":
		return accept.Word(false, true)
	}
	return accept.Coloured(status, accept.Bad)
}
