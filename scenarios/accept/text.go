package accept

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// labels say what each acceptance limit judges.
var labels = map[string]string{
	"nrmse":          "tracking error, rms",
	"delay":          "delay",
	"peak_error":     "tracking error, peak",
	"energy_margin":  "energy margin, least",
	"response_error": "response error, rms",
	"spectrum_error": "spectrum error, rms",
}

// WriteText writes the verdict for people. With colour, the words that decide
// are coloured too; they decide without it just as well.
func (v *Verdict) WriteText(w io.Writer, colour bool) error {
	p := &page{colour: colour}
	first := &v.Lanes[0]
	p.printf("%s: %s\n", Printable(v.Scenario), Printable(v.Title))
	p.printf("%s\n", v.conditions())
	p.printf("\n%s  %s lane: %s\n", p.verdict(first), first.Name, ending(first, v.Time))
	p.limits(first)
	p.tracking(first, v.Scene)
	p.reach(first, v.Scene)
	p.response(first)
	p.energy(first)
	if len(v.Lanes) > 1 {
		p.compare(v.Lanes)
	}
	_, err := io.WriteString(w, p.String())
	return err
}

func (v *Verdict) conditions() string {
	pace := "at real speed"
	if v.Slowdown != 1 {
		pace = "slowed down " + quantity.Short(v.Slowdown, quantity.None) + " times"
	}
	return fmt.Sprintf("%s of test %s, %s ticks a second, %d ticks, computed in %s",
		quantity.Short(v.Time, quantity.Time), pace, quantity.Short(v.Rate, quantity.None), v.Ticks,
		quantity.Format(v.Compute.Wall, quantity.Time))
}

// ending says how the lane ended and what became of its limits.
func ending(l *Lane, whole float64) string {
	switch l.Outcome {
	case rtloop.Completed:
		return "completed, " + tally(l)
	case rtloop.Tripped, rtloop.Diverged:
		return stopped(l.Outcome, l.Trip, whole)
	}
	return fmt.Sprintf("%s after %s of %s; the figures are of what ran", strings.ToUpper(l.Outcome.String()),
		seconds(l.Ran), quantity.Short(whole, quantity.Time))
}

func tally(l *Lane) string {
	failed, all := len(failures(l)), len(l.Accept)
	switch {
	case all == 0:
		return "nothing was judged: no acceptance limits given"
	case failed == 0:
		return fmt.Sprintf("limits met: %d of %d", all, all)
	}
	return fmt.Sprintf("limits failed: %d of %d", failed, all)
}

// stopped says which limit ended the lane.
func stopped(o rtloop.Outcome, t *rtloop.Trip, whole float64) string {
	dim := quantity.Length
	switch {
	case strings.HasSuffix(t.Limit, "velocity"):
		dim = quantity.Velocity
	case strings.HasSuffix(t.Limit, "force"):
		dim = quantity.Force
	}
	where := t.Limit
	if t.Channel != "" {
		where = "channel " + t.Channel + ": " + t.Limit
	}
	at := fmt.Sprintf("%s at %s of %s, %s", strings.ToUpper(o.String()), seconds(t.Time), quantity.Short(whole, quantity.Time), where)
	switch {
	case !t.Value.Defined():
		return at + " is no number any more"
	case o == rtloop.Diverged:
		return at + " is " + quantity.Format(float64(t.Value), dim)
	}
	return fmt.Sprintf("%s %s, allowed %s", at, quantity.Format(float64(t.Value), dim), quantity.Short(float64(t.Allowed), dim))
}

// page builds the text.
type page struct {
	strings.Builder
	colour bool
}

func (p *page) printf(format string, args ...any) { fmt.Fprintf(p, format, args...) }

// word is the verdict in one word of constant width.
func (p *page) word(pass bool) string { return Word(pass, p.colour) }

// verdict is the word for a lane. One that completed without any limit to meet
// has not passed anything: it is done.
func (p *page) verdict(l *Lane) string {
	if l.Pass && len(l.Accept) == 0 {
		return "DONE"
	}
	return p.word(l.Pass)
}

// table is WriteTable on the page.
func (p *page) table(rows [][]string, marks []string) { WriteTable(&p.Builder, rows, marks) }

// limits shows each acceptance limit, what was found and what room is left.
func (p *page) limits(l *Lane) {
	if len(l.Accept) == 0 {
		return
	}
	several := len(l.Channels) > 1
	rows, marks := [][]string{{"limit", "found", "allowed", "room"}}, []string{}
	if several {
		rows[0] = append(rows[0], "worst channel")
	}
	for _, j := range l.Accept {
		row := []string{labels[j.Limit], j.found(), j.allowed(), j.room()}
		if several && j.Channel != "" {
			row = append(row, j.Channel)
		}
		rows, marks = append(rows, row), append(marks, p.word(j.Pass))
	}
	p.table(rows, marks)
}

// tracking shows how well each channel followed its target.
func (p *page) tracking(l *Lane, scene *scenarios.Scenario) {
	rows := [][]string{{"channel", "compensator", "delay", "amplitude", "error, rms", "error, peak"}}
	for i, c := range l.Channels {
		rows = append(rows, []string{c.Name, c.Compensator, Late(c.Delay), Amplitude(c.AmplitudeRatio), Share(c.NRMSE),
			within(c.PeakError, quantity.Length, limit(scene, i, "error"))})
	}
	p.table(rows, nil)
}

// reach shows how far each channel went, and how far it was allowed to before
// the loop trips.
func (p *page) reach(l *Lane, scene *scenarios.Scenario) {
	rows := [][]string{{"channel", "peak target", "peak command", "peak velocity", "peak force"}}
	for i, c := range l.Channels {
		rows = append(rows, []string{c.Name,
			within(c.PeakTarget, quantity.Length, nil),
			within(c.PeakCommand, quantity.Length, limit(scene, i, "stroke")),
			within(c.PeakVelocity, quantity.Velocity, limit(scene, i, "velocity")),
			within(c.PeakForce, quantity.Force, limit(scene, i, "force"))})
	}
	p.table(rows, nil)
}

// response shows, for a driven target, how measured answers target at each
// frequency: the frequency response of compensator and actuator together.
func (p *page) response(l *Lane) {
	for _, c := range l.Channels {
		if len(c.Response) == 0 {
			continue
		}
		rows := [][]string{{"channel", "frequency", "amplitude", "delay"}}
		for _, b := range c.Response {
			rows = append(rows, []string{c.Name, quantity.Format(float64(b.Frequency), quantity.Frequency), Amplitude(b.Amplitude), Late(b.Delay)})
		}
		p.table(rows, nil)
	}
}

// limit finds a trip limit of a channel, nil where there is none.
func limit(scene *scenarios.Scenario, channel int, name string) *kind.Value {
	if scene == nil || channel >= len(scene.Channels) {
		return nil
	}
	if v, ok := scene.Channels[channel].Limits[name]; ok {
		return &v
	}
	return nil
}

// energy shows the margin, the damping that the tracking error looks like, and
// the balance of the whole run, in one unit so that it can be added up.
func (p *page) energy(l *Lane) {
	e := l.Energy
	if !e.Input.Defined() || l.Outcome == rtloop.Diverged { // what diverged has no balance to speak of
		return
	}
	window := quantity.Format(float64(e.Window), quantity.Time)
	final := Margin(e.MarginFinal) + " over"
	if !e.MarginFinal.Defined() {
		final = "undefined, too little was damped in"
	}
	p.printf("\n  energy  margin at the end %s the last %s\n", final, window)
	damping := Share(e.AddedDamping) + " of critical"
	if !e.AddedDamping.Defined() {
		damping = "undefined"
	}
	p.printf("          added damping %s; the balance closes within %s\n", damping, strings.TrimPrefix(Share(e.BalanceError), "< "))
	in := sameUnit(e.Input, e.Kinetic, e.Strain, e.Damped, e.Specimen, e.Injected)
	p.printf("          input %s = kinetic %s + strain %s + damped %s + specimens %s − injected %s\n",
		in[0], in[1], in[2], in[3], in[4], in[5])
}

// compare ranks the lanes, best first. Columns that say nothing are left out:
// energy and response where there is no structure, failures where there is none.
func (p *page) compare(lanes []Lane) {
	structure, failed := false, false
	for i := range lanes {
		structure = structure || lanes[i].Energy.Input.Defined()
		failed = failed || !lanes[i].Pass
	}
	row := func(first, energy []string, last string) []string {
		if structure {
			first = append(first, energy...)
		}
		if failed {
			first = append(first, last)
		}
		return first
	}
	rows, marks := [][]string{row([]string{"lane", "compensator", "delay", "error, rms"},
		[]string{"margin", "response"}, "failed")}, []string{}
	for i, l := range Rank(lanes) {
		rows = append(rows, row([]string{fmt.Sprintf("%d. %s", i+1, l.Name), methods(&l),
			Late(measure(l.LaneResult, "delay").Got), Share(measure(l.LaneResult, "nrmse").Got)},
			[]string{Margin(l.Energy.MarginMin), Share(l.ResponseError)}, trouble(&l)))
		marks = append(marks, p.verdict(&l))
	}
	p.table(rows, marks)
}

// trouble says in a few words why a lane does not pass, "" if it does.
func trouble(l *Lane) string {
	switch l.Outcome {
	case rtloop.Tripped:
		return l.Trip.Limit + " at " + seconds(l.Trip.Time)
	case rtloop.Diverged:
		return "diverged at " + seconds(l.Trip.Time)
	case rtloop.Completed:
	default:
		return l.Outcome.String()
	}
	failed := failures(l)
	if len(failed) > 2 {
		return fmt.Sprintf("%d of %d limits", len(failed), len(l.Accept))
	}
	return strings.Join(failed, ", ")
}

// failures names the acceptance limits that were not met.
func failures(l *Lane) []string {
	var out []string
	for _, j := range l.Accept {
		if !j.Pass {
			out = append(out, j.Limit)
		}
	}
	return out
}

// methods names the compensators of a lane, each once; of many only the first.
func methods(l *Lane) string {
	var out []string
	for _, c := range l.Channels {
		if !slices.Contains(out, c.Compensator) {
			out = append(out, c.Compensator)
		}
	}
	if text := strings.Join(out, ", "); len(out) < 2 || len(text) <= 24 {
		return text
	}
	return fmt.Sprintf("%s +%d", out[0], len(out)-1)
}
