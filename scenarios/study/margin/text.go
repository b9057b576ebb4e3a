package margin

import (
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// WriteText writes the report for people. With colour, the word that decides is
// coloured too.
func (r *Report) WriteText(w io.Writer, colour bool) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: the %s lane for small motions about rest%s\n\n", r.Scenario, r.Lane, r.learned())
	fmt.Fprintf(&b, "%s  spectral radius %.9f\n", r.verdict(colour), float64(r.SpectralRadius))
	if r.Mode.Frequency.Defined() {
		fmt.Fprintf(&b, "\nmodes, the least damped first%s\n\n", r.levels())
		r.modes(&b)
	}
	fmt.Fprintf(&b, "\nstability is lost with\n")
	r.margins(&b)
	if r.Limiting != "" && len(r.Channels) > 1 {
		fmt.Fprintf(&b, "%s bears the least extra delay.\n", r.Limiting)
	}
	r.further(&b)
	for i, n := range r.Notes {
		if i == 0 {
			b.WriteString("\nto be known\n")
		}
		fmt.Fprintf(&b, "  %s\n", n)
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (r *Report) learned() string {
	if r.AfterRun {
		return ",\nadaptive compensators as the run left them"
	}
	return ""
}

func (r *Report) verdict(colour bool) string {
	word, code := "STABLE", accept.Good
	switch {
	case !r.Stable:
		word, code = "GROWS", accept.Bad
	case math.Abs(float64(r.SpectralRadius)-1) <= Neutral:
		word, code = "ON THE EDGE", accept.Unsure
	}
	if colour {
		return accept.Coloured(word, code)
	}
	return word
}

// percent writes a damping ratio.
func percent(v rtloop.Figure) string {
	if !v.Defined() {
		return "–"
	}
	return fmt.Sprintf("%.2f %%", 100*float64(v))
}

// levels says which levels are not written out.
func (r *Report) levels() string {
	if n := len(r.Mode.Shape); n > mostLevels {
		return fmt.Sprintf(" (levels %d to %d are in --json)", mostLevels+1, n)
	}
	return ""
}

// mostLevels is how many levels of a shape are written out.
const mostLevels = 8

func (r *Report) modes(b *strings.Builder) {
	w := tabwriter.NewWriter(b, 0, 0, 3, ' ', tabwriter.AlignRight)
	levels := len(r.Mode.Shape)
	head := "  frequency\tdamping ratio\t"
	for i := range min(levels, mostLevels) {
		head += fmt.Sprintf("level %d\t", i+1)
	}
	fmt.Fprintln(w, head)
	for i := range r.Modes {
		m := &r.Modes[i]
		line := "  " + quantity.Format(float64(m.Frequency), quantity.Frequency) + "\t" + percent(m.Damping) + "\t"
		for k := range min(len(m.Shape), mostLevels) {
			line += signed(m, k) + "\t"
		}
		fmt.Fprintln(w, line)
	}
	w.Flush()
}

// signed is the motion of a level with the sign that it has beside the largest, and
// its phase where it is neither with it nor against it.
func signed(m *Mode, k int) string {
	size, phase := float64(m.Shape[k]), float64(m.Phase[k])
	if math.Abs(phase) > math.Pi/2 {
		size, phase = -size, phase-math.Copysign(math.Pi, phase)
	}
	if math.Abs(phase) > 0.1 && math.Abs(size) > 0.02 {
		return fmt.Sprintf("%.2f∠%.0f°", size, phase*180/math.Pi)
	}
	if math.Abs(size) < 0.005 {
		size = 0 // not -0.00
	}
	return fmt.Sprintf("%.2f", size)
}

func (r *Report) margins(b *strings.Builder) {
	rows := [][]string{{"channel", "extra delay", "at", "delay then", "force gain", "at"}}
	for i := range r.Channels {
		c := &r.Channels[i]
		rows = append(rows, c.Margins.row(c.Name, quantity.Format(float64(c.CriticalDelay), quantity.Time)))
	}
	if len(r.Channels) > 1 {
		rows = append(rows, r.Together.row("all together", "–"))
	}
	accept.WriteTable(b, rows, nil)
}

func (m *Margins) row(name, critical string) []string {
	row := []string{name, "none found", "", "", "none found", ""}
	if m.DelayMargin.Defined() {
		row[1] = quantity.Format(float64(m.DelayMargin), quantity.Time)
		row[2] = quantity.Format(float64(m.Delays[0].Frequency), quantity.Frequency)
		row[3] = critical
	}
	if m.GainMargin.Defined() {
		row[4] = quantity.Format(float64(m.GainMargin), quantity.None)
		row[5] = quantity.Format(float64(m.Gains[0].Frequency), quantity.Frequency)
	}
	return row
}

// further says where stability comes back, and what the signs of an unstable loop's
// margins mean.
func (r *Report) further(b *strings.Builder) {
	if !r.Stable {
		b.WriteString("The loop grows as it is: delays below nothing and gains below 1 say how much\nquicker the actuator, or weaker the force, would have to be.\n")
		if len(r.Notes) > 0 {
			b.WriteString("Parts that yield may keep it from growing far.\n")
		}
	}
	say := func(name string, m *Margins) {
		if len(m.Delays) > 1 {
			fmt.Fprintf(b, "%s, delay: %s\n", name, path(m.Delays, quantity.Time))
		}
		if len(m.Gains) > 1 {
			fmt.Fprintf(b, "%s, gain: %s\n", name, path(m.Gains, quantity.None))
		}
	}
	for i := range r.Channels {
		say(r.Channels[i].Name, &r.Channels[i].Margins)
	}
	if len(r.Channels) > 1 {
		say("all together", &r.Together)
	}
}

func path(changes []Change, dim quantity.Dim) string {
	var parts []string
	for _, c := range changes {
		word := "lost at "
		if c.Stable {
			word = "regained at "
		}
		parts = append(parts, word+quantity.Format(float64(c.At), dim))
	}
	return strings.Join(parts, ", ")
}
