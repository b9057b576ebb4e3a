package replay

import (
	"fmt"
	"io"
	"math"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// WriteText writes the report for people.
func (r *Report) WriteText(w io.Writer, colour bool) error {
	var b strings.Builder
	r.head(&b)
	r.tracking(&b)
	r.more(&b)
	r.response(&b)
	r.work(&b)
	r.overTime(&b)
	r.moments(&b)
	if r.Against != nil {
		r.Against.ranked(&b, colour)
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (r *Report) head(b *strings.Builder) {
	title := ""
	if r.Title != "" {
		title = ": " + accept.Printable(r.Title)
	}
	pace := ""
	if r.Slowdown != 1 {
		pace = ", slowed down " + quantity.Short(r.Slowdown, quantity.None) + " times"
	}
	fmt.Fprintf(b, "%s%s\n%s of record%s, %s samples a second, %d samples\n", accept.Printable(r.Log), title,
		quantity.Short(float64(r.Time), quantity.Time), pace, quantity.Short(r.Rate, quantity.None), r.Samples)
	for _, n := range r.Notes {
		fmt.Fprintf(b, "note: %s\n", accept.Printable(n))
	}
	if r.Interrupted {
		fmt.Fprintln(b, "INTERRUPTED; the figures are of what was read")
	}
}

// columns writes rows of cells in columns, the headings first, behind a blank line.
func columns(b *strings.Builder, rows [][]string) { accept.WriteTable(b, rows, nil) }

func length(f rtloop.Figure) string { return quantity.Format(float64(f), quantity.Length) }

// area writes the tracking indicator in the unit that displacements have.
func area(f rtloop.Figure) string {
	u, err := quantity.ParseUnit("mm^2")
	if err != nil || !f.Defined() {
		return quantity.Format(math.NaN(), quantity.Area)
	}
	return quantity.FormatIn(float64(f), u, "mm^2", 4)
}

func (r *Report) tracking(b *strings.Builder) {
	rows := [][]string{{"channel", "delay", "amplitude", "error, rms", "error, peak"}}
	index := [][]string{{"channel", "FEI: delay", "amplitude", "frequency", "tracking indicator"}}
	for _, c := range r.Channels {
		name := accept.Printable(c.Name)
		rows = append(rows, []string{name, accept.Late(c.Delay), accept.Amplitude(c.AmplitudeRatio), accept.Share(c.NRMSE), length(c.PeakError)})
		index = append(index, []string{name, accept.Late(c.FEI.Delay), accept.Amplitude(c.FEI.Amplitude),
			quantity.Format(float64(c.FEI.Frequency), quantity.Frequency), area(c.TrackingIndicator)})
	}
	columns(b, rows)
	columns(b, index)
}

// more shows how far the channels went.
func (r *Report) more(b *strings.Builder) {
	rows := [][]string{{"channel", "peak target", "peak command", "peak command velocity", "peak force"}}
	for _, c := range r.Channels {
		rows = append(rows, []string{accept.Printable(c.Name), length(c.PeakTarget), length(c.PeakCommand),
			quantity.Format(float64(c.PeakHurry), quantity.Velocity), quantity.Format(float64(c.PeakForce), quantity.Force)})
	}
	columns(b, rows)
}

// response shows how measured answers target at each frequency.
func (r *Report) response(b *strings.Builder) {
	rows := [][]string{{"channel", "frequency", "amplitude", "delay"}}
	for _, c := range r.Channels {
		for _, f := range c.Response {
			rows = append(rows, []string{accept.Printable(c.Name), quantity.Format(float64(f.Frequency), quantity.Frequency), accept.Amplitude(f.Amplitude), accept.Late(f.Delay)})
		}
	}
	if len(rows) > 1 {
		columns(b, rows)
	}
}

func (r *Report) work(b *strings.Builder) {
	e := r.Energy
	if e.Injected.Defined() {
		way := "put in by"
		v := float64(e.Injected)
		if v < 0 {
			way = "taken out by"
		}
		fmt.Fprintf(b, "\n  energy  %s %s the tracking error; the specimens took %s\n", quantity.Format(math.Abs(v), quantity.Energy), way, quantity.Format(float64(e.Specimen), quantity.Energy))
	} else {
		fmt.Fprintf(b, "\n  energy  unknown without the force of every channel\n")
	}
	if e.MarginMin.Defined() {
		fmt.Fprintf(b, "          the least energy margin that was logged is %s, at %.3f s\n", accept.Margin(e.MarginMin), float64(e.MarginWhen))
	}
}

// overTime shows between what the figures of the windows lie.
func (r *Report) overTime(b *strings.Builder) {
	rows := [][]string{{"in " + quantity.Format(r.Window, quantity.Time) + " each", "delay", "amplitude", "error, rms", "energy put in"}}
	quiet, all := 0, 0
	for _, c := range r.Channels {
		all += len(c.Windows)
		for i := range c.Windows {
			if c.Windows[i].Quiet {
				quiet++
			}
		}
		span := func(of func(*Window) rtloop.Figure, text func(rtloop.Figure) string) string {
			low, high := rtloop.Figure(math.Inf(1)), rtloop.Figure(math.Inf(-1))
			for i := range c.Windows {
				if v := of(&c.Windows[i]); v.Defined() {
					low, high = min(low, v), max(high, v)
				}
			}
			if !low.Defined() {
				return text(rtloop.Figure(math.NaN()))
			}
			return text(low) + " to " + text(high)
		}
		rows = append(rows, []string{accept.Printable(c.Name),
			span(func(w *Window) rtloop.Figure { return w.Delay }, accept.Late),
			span(func(w *Window) rtloop.Figure { return w.AmplitudeRatio }, accept.Amplitude),
			span(func(w *Window) rtloop.Figure { return w.NRMSE }, accept.Share),
			span(func(w *Window) rtloop.Figure { return w.Injected }, joule)})
	}
	columns(b, rows)
	if quiet > 0 {
		fmt.Fprintf(b, "  in %d of %d windows the target hardly moved; they count for the energy alone\n", quiet, all)
	}
}

func joule(f rtloop.Figure) string { return quantity.Format(float64(f), quantity.Energy) }

// said is how the figures of moments are called and written.
var said = map[string]struct {
	name string
	text func(rtloop.Figure) string
}{
	"peak_error_m":    {"error, peak", length},
	"nrmse":           {"error, rms", accept.Share},
	"delay_s":         {"delay", accept.Late},
	"amplitude_ratio": {"amplitude", accept.Amplitude},
	"injected_J":      {"energy put in", joule},
}

func (r *Report) moments(b *strings.Builder) {
	rows := [][]string{{"worst", "", "when", "channel"}}
	for _, c := range r.Channels {
		for _, m := range c.Worst {
			when := fmt.Sprintf("%.3f s", float64(m.Start))
			if m.End != m.Start {
				when = fmt.Sprintf("%.3f s to %.3f s", float64(m.Start), float64(m.End))
			}
			rows = append(rows, []string{said[m.Figure].name, said[m.Figure].text(m.Value), when, accept.Printable(c.Name)})
		}
	}
	if len(rows) > 1 {
		columns(b, rows)
	}
}

// ranked shows the lanes that were driven, best first, with the record among them.
func (a *Against) ranked(b *strings.Builder, colour bool) {
	fmt.Fprintf(b, "\n  %s driven by the recorded target, best first\n", accept.Printable(a.Scenario))
	for _, c := range a.Channels {
		rows := [][]string{{"      lane", "compensator", "delay", "amplitude", "error, rms", "error, peak", "of the limits"}}
		for i, l := range accept.Rank(c.Lanes) {
			ch := l.Channels[0]
			method := ch.Compensator
			if l.Name == Recorded {
				method = "as it was"
			}
			rows = append(rows, []string{fmt.Sprintf("%s  %d. %s", verdict(&l), i+1, accept.Printable(l.Name)), method,
				accept.Late(ch.Delay), accept.Amplitude(ch.AmplitudeRatio), accept.Share(ch.NRMSE), length(ch.PeakError), met(&l)})
		}
		if len(a.Channels) > 1 {
			fmt.Fprintf(b, "\n  channel %s", accept.Printable(c.Name))
		}
		columns(b, rows)
		if colour { // behind the columns, which count colour as width
			text := b.String()
			b.Reset()
			b.WriteString(strings.NewReplacer("\n  PASS  ", "\n  "+accept.Word(true, true)+"  ", "\n  FAIL  ", "\n  "+accept.Word(false, true)+"  ").Replace(text))
		}
	}
	fmt.Fprintf(b, "  %s%s.\n", strings.ToUpper(a.OpenLoop[:1]), a.OpenLoop[1:])
}

func verdict(l *accept.Lane) string {
	if len(l.Accept) == 0 && l.Pass {
		return "DONE"
	}
	return accept.Word(l.Pass, false)
}

// met says how the lane stands to the limits on tracking.
func met(l *accept.Lane) string {
	if l.Trip != nil {
		return fmt.Sprintf("%s: %s at %.3f s", l.Outcome, l.Trip.Limit, float64(l.Trip.Time))
	}
	if l.Outcome != rtloop.Completed {
		return l.Outcome.String()
	}
	var failed []string
	for _, j := range l.Accept {
		if !j.Pass {
			failed = append(failed, j.Limit)
		}
	}
	switch {
	case len(l.Accept) == 0:
		return "none given"
	case len(failed) > 0:
		return "failed " + strings.Join(failed, ", ")
	}
	return fmt.Sprintf("met %d of %d", len(l.Accept), len(l.Accept))
}
