package tempo

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// WriteText writes the table, the drawn errors and what follows from them, so
// many columns wide.
func (r *Report) WriteText(w io.Writer, columns int, colour bool) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s\n", accept.Printable(r.Scenario), accept.Printable(r.Title))
	fmt.Fprintf(&b, "the %s lane, slowed down\n\n", r.Lane)
	if len(r.Points) > 0 {
		r.table(&b, colour)
	}
	if r.Structure && len(r.Points) > 1 {
		b.WriteByte('\n')
		r.draw(&b, columns)
	}
	b.WriteByte('\n')
	r.conclude(&b)
	_, err := io.WriteString(w, b.String())
	return err
}

// heads are the headings of the table in rows, the last with the units.
func (r *Report) heads() [][]string {
	heads := [][]string{
		{"slow-", "test", "tracking", ""},
		{"down", "lasts", "error", "delay"},
		{"", "s", "%", "ms"},
	}
	if r.Structure {
		heads[0] = append(heads[0], "energy", "delay", "response", "synchro-", "rate", "corre-")
		heads[1] = append(heads[1], "margin", "margin", "error", "nization", "effects", "lation")
		heads[2] = append(heads[2], "%", "ms", "%", "%", "%", "")
	}
	return heads
}

func (r *Report) table(b *strings.Builder, colour bool) {
	rows := r.heads()
	above := len(rows)
	for i := range r.Points {
		rows = append(rows, r.row(&r.Points[i]))
	}
	widths := make([]int, len(rows[0]))
	for _, row := range rows {
		for k, cell := range row {
			widths[k] = max(widths[k], utf8.RuneCountInString(cell))
		}
	}
	for i, row := range rows {
		line := strings.Repeat(" ", len("FAIL"))
		trouble := ""
		if i >= above {
			p := &r.Points[i-above]
			line = p.Lane.Word()
			if line != "DONE" {
				line = accept.Word(p.Lane.Pass, colour)
			}
			trouble = p.Lane.Trouble()
		}
		for k, cell := range row {
			line += "  " + strings.Repeat(" ", widths[k]-utf8.RuneCountInString(cell)) + cell
		}
		if trouble != "" {
			line += "  " + trouble
		}
		fmt.Fprintln(b, strings.TrimRight(line, " "))
	}
}

func (r *Report) row(p *Point) []string {
	_, nrmse, late := p.tracking()
	row := []string{quantity.Short(p.Slowdown, quantity.None), quantity.Short(rounded(p.Lasts), quantity.None), percent(float64(nrmse)), milli(float64(late))}
	if !r.Structure {
		return row
	}
	energy := strings.TrimSuffix(accept.Margin(p.Lane.Energy.MarginMin), " %")
	return append(row, energy, p.marginText(), percent(p.Split.Total), percent(p.Split.Sync), percent(p.Split.Rate), correlation(p.Split.Correlation))
}

// tracking finds the channel that tracks worst, its error and the delay of the
// one that is furthest off.
func (p *Point) tracking() (channel string, nrmse, late rtloop.Figure) {
	nrmse, late = rtloop.Figure(math.NaN()), rtloop.Figure(math.NaN())
	for i, c := range p.Lane.Channels {
		if i == 0 || c.NRMSE > nrmse {
			channel, nrmse = c.Name, c.NRMSE
		}
		if i == 0 || math.Abs(float64(c.Delay)) > math.Abs(float64(late)) {
			late = c.Delay
		}
	}
	return channel, nrmse, late
}

// milli writes a delay in milliseconds, negative when early.
func milli(v float64) string {
	switch text := fmt.Sprintf("%.3f", 1e3*v); {
	case math.IsNaN(v):
		return "–"
	case text == "-0.000":
		return "0.000"
	default:
		return text
	}
}

func (p *Point) marginText() string {
	switch {
	case math.IsNaN(p.DelayMargin):
		return "–"
	case !p.Stable:
		return "grows"
	case math.IsInf(p.DelayMargin, 1):
		return "none"
	}
	return strconv.FormatFloat(1e3*p.DelayMargin, 'g', 4, 64)
}

// percent writes a ratio in per cent, without the sign.
func percent(v float64) string {
	if v < nothing {
		return "0"
	}
	return strings.TrimSuffix(accept.Share(rtloop.Figure(v)), " %")
}

func correlation(v float64) string {
	if math.IsNaN(v) {
		return "–"
	}
	return strings.Replace(fmt.Sprintf("%.2f", v), "-0.00", "0.00", 1)
}

// conclude names the slowdown to run at, and what the table does not say.
func (r *Report) conclude(b *strings.Builder) {
	if n := len(r.Points); n < r.Asked {
		fmt.Fprintf(b, "INTERRUPTED: %d of %d slowdowns\n", n, r.Asked)
	}
	if len(r.Points) > 0 {
		fmt.Fprintln(b, r.Conclusion())
	}
	if r.Structure {
		fmt.Fprintln(b, "Response error² = synchronization² + rate² + 2·correlation·synchronization·rate, each over")
		fmt.Fprintln(b, "the rms of the reference response at real speed. Delays are physical; the delay margin")
		fmt.Fprintln(b, "is that of small motions about rest, with adaptive compensators as they start.")
	} else {
		fmt.Fprintln(b, "The target is driven: there is no structure whose response could be wrong.")
	}
	if r.NoMargin != "" {
		fmt.Fprintf(b, "No delay margin: %s\n", accept.Printable(r.NoMargin))
	}
}

// Conclusion says in a sentence or two which slowdown is the fastest that
// passes, or that none does and why.
func (r *Report) Conclusion() string {
	slow := func(i int) string { return quantity.Short(r.Points[i].Slowdown, quantity.None) }
	fastest, last := r.Fastest(), len(r.Points)-1
	switch {
	case last < 0:
		return "Nothing has run."
	case !r.Limits:
		return "The scenario has no acceptance limits, so none of these passes or fails."
	case fastest < 0 && last == 0:
		return fmt.Sprintf("A slowdown of %s does not pass: %s.", slow(0), r.Points[0].Lane.Trouble())
	case fastest < 0:
		return fmt.Sprintf("None of these slowdowns passes: at %s it is %s, at %s %s.",
			slow(0), r.Points[0].Lane.Trouble(), slow(last), r.Points[last].Lane.Trouble())
	}
	text := fmt.Sprintf("The fastest slowdown that passes is %s.", slow(fastest))
	if fastest > 0 {
		text += fmt.Sprintf(" %s fails: %s.", slow(fastest-1), r.Points[fastest-1].Lane.Trouble())
	}
	if worse := r.SlowerFails(); worse >= 0 {
		text += fmt.Sprintf(" Too slow: %s fails: %s.", slow(worse), r.Points[worse].Lane.Trouble())
	}
	return text
}
