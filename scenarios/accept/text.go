package accept

import (
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"

	"antelag/rtloop"
	"antelag/scenarios/quantity"
)

// labels say what each acceptance limit judges.
var labels = map[string]string{
	"nrmse":          "tracking error, rms / rms target",
	"delay":          "remaining delay (late +, early −)",
	"peak_error":     "largest tracking error",
	"energy_margin":  "energy margin, smallest",
	"response_error": "response error, rms / rms reference",
}

// WriteText writes the verdict for people. With colour, the words that decide
// are coloured too; they decide without it just as well.
func (v *Verdict) WriteText(w io.Writer, colour bool) error {
	p := &page{colour: colour}
	p.printf("%s: %s\n", v.Scenario, v.Title)
	p.printf("%s\n", v.conditions())
	first := &v.Lanes[0]
	p.printf("\n%s  %s lane%s\n", p.word(first.Pass), first.Name, outcomeText(first, v.Time))
	p.limits(first)
	p.channels(first)
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
	return fmt.Sprintf("%s of test %s, %s a second, %d ticks, computed in %s",
		quantity.Short(v.Time, quantity.Time), pace, plural(v.Rate, "tick"), v.Ticks,
		quantity.Format(v.Compute.Wall, quantity.Time))
}

func plural(n float64, what string) string {
	return quantity.Short(n, quantity.None) + " " + what + "s"
}

// outcomeText says how the lane ended, where it did not just complete.
func outcomeText(l *Lane, whole float64) string {
	switch l.Outcome {
	case rtloop.Completed:
		return ""
	case rtloop.Interrupted:
		return ": interrupted; the figures are of what ran"
	}
	t := l.Trip
	dim := quantity.Length
	switch t.Limit {
	case "velocity":
		dim = quantity.Velocity
	case "force":
		dim = quantity.Force
	}
	how := fmt.Sprintf(": TRIPPED at %s of %s", quantity.Format(t.Time, quantity.Time), quantity.Short(whole, quantity.Time))
	if l.Outcome == rtloop.Diverged {
		how = fmt.Sprintf(": DIVERGED at %s", quantity.Format(t.Time, quantity.Time))
	}
	return fmt.Sprintf("%s, channel %s: %s %s, allowed %s", how, t.Channel, t.Limit,
		quantity.Format(float64(t.Value), dim), quantity.Short(float64(t.Allowed), dim))
}

// page builds the text.
type page struct {
	strings.Builder
	colour bool
}

func (p *page) printf(format string, args ...any) { fmt.Fprintf(p, format, args...) }

// word is the verdict in one word of constant width.
func (p *page) word(pass bool) string {
	word, code := "FAIL", "31;1"
	if pass {
		word, code = "PASS", "32;1"
	}
	if !p.colour {
		return word
	}
	return "\x1b[" + code + "m" + word + "\x1b[0m"
}

// table lines its rows up in columns; cells are separated by tabs. The last
// column may hold colour: its width does not matter.
func (p *page) table(rows func(io.Writer)) {
	t := tabwriter.NewWriter(p, 0, 0, 2, ' ', 0)
	rows(t)
	t.Flush() //nolint:errcheck // a Builder does not fail
}

func (p *page) limits(l *Lane) {
	if len(l.Accept) == 0 {
		p.printf("no acceptance limits given; only a completed run was asked for\n")
		return
	}
	p.table(func(w io.Writer) {
		fmt.Fprintf(w, "  acceptance\tfound\tlimit\troom\t\n")
		for _, j := range l.Accept {
			channel := ""
			if j.Channel != "" && len(l.Channels) > 1 {
				channel = " (" + j.Channel + ")"
			}
			sign := "≤"
			if j.Limit == "energy_margin" {
				sign = "≥"
			}
			fmt.Fprintf(w, "  %s%s\t%s\t%s %s\t%s\t%s\n", labels[j.Limit], channel,
				quantity.Format(float64(j.Got), j.Dim), sign, quantity.Short(j.Want, j.Dim), j.room(), p.word(j.Pass))
		}
	})
}

// room says how far the figure is from its limit, in parts of the limit.
func (j *Judgement) room() string {
	if !j.Got.Defined() {
		return "not defined"
	}
	got := float64(j.Got)
	if j.Limit == "energy_margin" {
		return fmt.Sprintf("%+.2f", got-j.Want)
	}
	if j.Want == 0 {
		return "–"
	}
	share := 100 * (1 - math.Abs(got)/j.Want)
	if share < 0 {
		return fmt.Sprintf("%.3g times over", math.Abs(got)/j.Want)
	}
	return fmt.Sprintf("%.0f %% left", share)
}

func (p *page) channels(l *Lane) {
	p.printf("\n")
	p.table(func(w io.Writer) {
		fmt.Fprintf(w, "  channel\tcompensator\tNRMSE\tdelay\tamplitude\tpeak target\tpeak command\tpeak velocity\tpeak force\n")
		for _, c := range l.Channels {
			fmt.Fprintf(w, "  %s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\n", c.Name, c.Compensator,
				plain(c.NRMSE), show(c.Delay, quantity.Time), plain(c.AmplitudeRatio), show(c.PeakTarget, quantity.Length),
				show(c.PeakCommand, quantity.Length), show(c.PeakVelocity, quantity.Velocity), show(c.PeakForce, quantity.Force))
		}
	})
}

func show(f rtloop.Figure, dim quantity.Dim) string { return quantity.Format(float64(f), dim) }

func plain(f rtloop.Figure) string { return show(f, quantity.None) }

func (p *page) energy(l *Lane) {
	e := l.Energy
	if !e.Input.Defined() {
		return
	}
	p.printf("\n  energy  margin %s at the end, over %s; added damping %s of critical\n",
		plain(e.MarginFinal), show(e.Window, quantity.Time), percent(e.AddedDamping))
	p.printf("          input %s = kinetic %s + strain %s + damped %s + specimens %s − injected %s (closes within %s)\n",
		show(e.Input, quantity.Energy), show(e.Kinetic, quantity.Energy), show(e.Strain, quantity.Energy),
		show(e.Damped, quantity.Energy), show(e.Specimen, quantity.Energy), show(e.Injected, quantity.Energy), percent(e.BalanceError))
}

func percent(f rtloop.Figure) string {
	if !f.Defined() {
		return "–"
	}
	return fmt.Sprintf("%.2g %%", 100*float64(f))
}

// compare ranks the lanes: passing before failing, then by what the test is
// for, the error of the response, or else of the tracking.
func (p *page) compare(lanes []Lane) {
	p.printf("\n")
	p.table(func(w io.Writer) {
		fmt.Fprintf(w, "  rank  lane\tcompensator\tended\tNRMSE\tdelay\tmargin, least\tresponse error\t\n")
		for i, l := range Rank(lanes) {
			worst := measure(l.LaneResult, "nrmse").Got
			delay := measure(l.LaneResult, "delay").Got
			fmt.Fprintf(w, "  %d     %s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\n", i+1, l.Name, methods(l), l.Outcome,
				plain(worst), show(delay, quantity.Time), plain(l.Energy.MarginMin), plain(l.ResponseError), p.word(l.Pass))
		}
	})
}

func methods(l Lane) string {
	var out []string
	for _, c := range l.Channels {
		if len(out) == 0 || out[len(out)-1] != c.Compensator {
			out = append(out, c.Compensator)
		}
	}
	return strings.Join(out, ", ")
}
