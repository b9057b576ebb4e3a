package report

import (
	"context"
	"errors"
	"fmt"
	"math"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study/margin"
)

// mapCells is how many cells the map has each way: fine enough for a smooth
// contour at the width of the page, and worked out in a second.
const mapCells = 81

// stability shows how far the loop is from growing by itself.
func (r *run) stability(ctx context.Context) (Part, error) {
	p := Part{Heading: "Stability"}
	if r.s.Substructure == nil || ctx.Err() != nil {
		return p, nil
	}
	o := margin.Options{AfterRun: r.adaptive() && r.lane.Outcome == rtloop.Completed}
	m, err := margin.Of(ctx, r.s, o)
	var placed *scenarios.Error
	switch {
	case ctx.Err() != nil:
		return p, nil
	case errors.As(err, &placed):
		p.Text = []string{"For small motions about rest this cannot be said: " + placed.Key + ": " + placed.Err.Error() + "."}
		return p, nil
	case err != nil:
		return p, err
	}
	p.Text = []string{stableWords(m)}
	p.List = r.linear(m)
	p.Tables = []Table{marginTable(m)}
	return p, r.chart(ctx, m, &p)
}

// adaptive reports whether any compensator learns while it runs.
func (r *run) adaptive() bool {
	for j := range r.s.Channels {
		if _, ok := r.rec.loop.Part(j).Compensator.(compensator.Adaptive); ok {
			return true
		}
	}
	return false
}

func stableWords(m *margin.Report) string {
	word := "stable"
	if !m.Stable {
		word = "not stable: it grows by itself"
	}
	text := fmt.Sprintf("For small motions about rest the loop is %s; its spectral radius is %.9f.", word, float64(m.SpectralRadius))
	if m.Mode.Frequency.Defined() {
		text += fmt.Sprintf(" Its least damped mode is at %s with a damping ratio of %s.", quantity.Format(float64(m.Mode.Frequency), quantity.Frequency), accept.Share(m.Mode.Damping))
	}
	if m.AfterRun {
		text += " Adaptive compensators count with what they had learned by the end of the run."
	}
	return text
}

// linear says what was taken for linear.
func (r *run) linear(m *margin.Report) []string {
	var out []string
	for _, n := range m.Notes {
		out = append(out, "Taken for linear: "+n+".")
	}
	return out
}

// marginTable lists what each channel can bear.
func marginTable(m *margin.Report) Table {
	t := Table{Caption: "Changes at which stability is lost, of one channel alone and of all together",
		Head: []string{"channel", "extra delay", "delay of the actuator then", "gain of the measured force"}}
	row := func(name string, g *margin.Margins, critical rtloop.Figure) {
		gain := "none found"
		if g.GainMargin.Defined() {
			gain = fmt.Sprintf("%.3g", float64(g.GainMargin))
		}
		t.Rows = append(t.Rows, Row{name, found(g.DelayMargin), found(critical), gain})
	}
	for i := range m.Channels {
		row(m.Channels[i].Name, &m.Channels[i].Margins, m.Channels[i].CriticalDelay)
	}
	if len(m.Channels) > 1 {
		row("all together", &m.Together, rtloop.Figure(math.NaN()))
	}
	return t
}

func found(f rtloop.Figure) string {
	if !f.Defined() {
		return "none found"
	}
	return quantity.Format(float64(f), quantity.Time)
}

// chart adds the map over the delay of the actuator and that which the
// compensator assumes, of the channel that bears the least.
func (r *run) chart(ctx context.Context, m *margin.Report, p *Part) error {
	j := 0
	for i := range r.s.Channels {
		if r.s.Channels[i].Name == m.Limiting {
			j = i
		}
	}
	text := r.options.Map
	if text == "" {
		if text = r.mapOver(j, m); text == "" {
			return nil
		}
	}
	x, y, err := margin.ParseMap(r.s, text)
	if err != nil {
		return fmt.Errorf("map: %w", err)
	}
	g, err := margin.Map(ctx, r.s, x, y, margin.Options{})
	switch {
	case ctx.Err() != nil:
		return nil
	case err != nil && r.options.Map != "":
		return fmt.Errorf("map: %w", err)
	case err != nil:
		p.Text = append(p.Text, fmt.Sprintf("No map was drawn: %v.", err))
		return nil
	}
	caption := "Damping ratio of the least damped mode over two settings. Hatched, beyond the bold line of 0 %, the loop grows by itself; the ring is where the scenario stands."
	if m.AfterRun {
		caption += " Adaptive compensators count with what they start from."
	}
	p.Pictures = append(p.Pictures, Picture{Name: "stability", Caption: caption, Figure: g.Figure()})
	return nil
}

// mapOver chooses a map of channel j; "" is none.
func (r *run) mapOver(j int, m *margin.Report) string {
	c := &r.s.Channels[j]
	delay, ok := c.Actuator.Values["delay"]
	if !ok {
		return ""
	}
	most := 2 * delay.Num
	if critical := m.Channels[j].CriticalDelay; critical.Defined() {
		most = math.Max(most, 1.2*float64(critical))
	}
	most = math.Min(math.Max(most, 0.02), 0.25)
	over := func(path string, from, to float64) string {
		return fmt.Sprintf("%s.%s=%s:%s:%d", c.Name, path, quantity.Plain(from, quantity.Time), quantity.Plain(to, quantity.Time), mapCells)
	}
	if d, ok := c.Compensator.Values["delay"]; ok {
		return over("actuator.delay", 0, most) + "," + over("compensator.delay", 0, math.Max(most, 1.5*d.Num))
	}
	if lag, ok := c.Actuator.Values["lag"]; ok {
		return over("actuator.delay", 0, most) + "," + over("actuator.lag", 0, math.Max(0.02, 2*lag.Num))
	}
	return ""
}
