package tune

import (
	"context"
	"math"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/scenarios/study"
)

// Measure is something that a candidate must keep within a limit.
type Measure struct {
	Name    string // as in JSON and in records
	Label   string
	Limit   float64 // NaN: it is told, but nothing is asked of it
	AtLeast bool    // the limit is the least, not the most
	Over    bool    // it is of all runs, not only of the scenario as it is

	limit string  // the limit for people, where say would not do
	unit  float64 // what a miss is measured by where the limit is 0
	say   func(v float64) string

	// One of these takes it: of the runs, the first of which is the scenario as it
	// is, or of that without any.
	of    func(judged []study.Judged) float64
	alone func(ctx context.Context, s *scenarios.Scenario) (float64, error)
}

// Pass reports whether a value keeps the limit. What is undefined does not.
func (m *Measure) Pass(v float64) bool { return m.Missed(v) == 0 }

// worstMiss is how much one measure can count against a candidate.
const worstMiss = 10

// Missed says by how much a value misses the limit, over the limit; 0 if it does
// not.
func (m *Measure) Missed(v float64) float64 {
	if math.IsNaN(m.Limit) {
		return 0
	}
	by := v - m.Limit
	if m.AtLeast {
		by = -by
	}
	switch {
	case math.IsNaN(v):
		return worstMiss
	case by <= 0:
		return 0
	}
	return min(by/max(math.Abs(m.Limit), m.unit), worstMiss)
}

// Say writes a value for people.
func (m *Measure) Say(v float64) string {
	if math.IsInf(v, 1) {
		return "no end"
	}
	if math.IsNaN(v) {
		return "–"
	}
	return m.say(v)
}

// Allowed writes the limit for people.
func (m *Measure) Allowed() string {
	switch {
	case math.IsNaN(m.Limit):
		return ""
	case m.limit != "":
		return m.limit
	case m.AtLeast:
		return "≥ " + m.say(m.Limit)
	}
	return "≤ " + m.say(m.Limit)
}

// dim is the dimension of the values.
func (m *Measure) dim() quantity.Dim {
	switch m.Name {
	case "delay_margin_s":
		return quantity.Time
	case "command_velocity_m_s":
		return quantity.Velocity
	}
	return quantity.None
}

func share(v float64) string { return accept.Share(rtloop.Figure(v)) }

// measures are all that are taken, in a fixed order.
func (p *Problem) measures() []Measure {
	out := []Measure{{
		limit: "all", Name: "completed", Label: "runs that complete", Limit: 1, AtLeast: true, Over: true, unit: 1, say: share,
		of: func(judged []study.Judged) float64 { return survived(p.Scenario.Loop.Num("duration"), judged) },
	}}
	if p.Scenario.Substructure != nil {
		out = append(out, p.energy())
		if p.Delay != nil {
			out = append(out, p.delay())
		}
	}
	out = append(out, p.velocity(), p.noise())
	for i := range p.columns {
		c := &p.columns[i]
		if c.Channel != "" || c.Figure == "energy_margin" || !c.Judged() || !p.Scenario.Accept.Has(c.Figure) {
			continue
		}
		judged := accept.Judgement{Limit: c.Figure, Want: p.Scenario.Accept.Num(c.Figure), Dim: c.Dim}
		out = append(out, Measure{
			limit: judged.Allowed(),
			Name:  "nominal_" + c.Figure, Label: c.Label, Limit: p.Scenario.Accept.Num(c.Figure), unit: 1e-6, say: c.Size,
			of: func(judged []study.Judged) float64 { return math.Abs(p.value(c, &judged[0])) },
		})
	}
	return out
}

// survived is the share of the test that all runs got through: 1 only if all
// came to their end.
func survived(duration float64, judged []study.Judged) float64 {
	sum := 0.0
	for i := range judged {
		if judged[i].Refused == nil && judged[i].Outcome == rtloop.Completed {
			sum++
			continue
		}
		if judged[i].Refused == nil {
			sum += 0.99 * judged[i].Ran / duration
		}
	}
	return sum / float64(len(judged))
}

// worst is the worst value of a figure over all runs, NaN where one has none.
func (p *Problem) worst(figure string) func([]study.Judged) float64 {
	for i := range p.columns {
		if c := &p.columns[i]; c.Figure == figure && c.Channel == "" {
			return func(judged []study.Judged) float64 {
				bad := math.Inf(-1)
				for k := range judged {
					bad = max(bad, c.Bad(p.value(c, &judged[k])))
				}
				return c.Good(bad)
			}
		}
	}
	panic("tune: no figure " + figure)
}

func (p *Problem) energy() Measure {
	limit := p.Limits.EnergyMargin
	if math.IsNaN(limit) && p.Scenario.Accept.Has("energy_margin") {
		limit = p.Scenario.Accept.Num("energy_margin")
	}
	allowed := ""
	if !math.IsNaN(limit) {
		j := accept.Judgement{Limit: "energy_margin", Want: limit}
		allowed = j.Allowed()
	}
	return Measure{limit: allowed, Name: "energy_margin", Label: "energy margin, least", Limit: limit, AtLeast: true, Over: true, unit: 1,
		say: func(v float64) string { return accept.Margin(rtloop.Figure(v)) }, of: p.worst("energy_margin")}
}

func (p *Problem) delay() Measure {
	return Measure{Name: "delay_margin_s", Label: "delay margin", Limit: p.Limits.DelayMargin, AtLeast: true, unit: 1e-3,
		say:   func(v float64) string { return quantity.Format(v, quantity.Time) },
		alone: p.Delay}
}

// velocity is limited by what was asked for, or by what trips a channel.
func (p *Problem) velocity() Measure {
	limit := p.Limits.CommandVelocity
	if math.IsNaN(limit) {
		for _, c := range p.Scenario.Channels {
			if v, ok := c.Limits["velocity"]; ok && !(v.Num > limit) {
				limit = v.Num
			}
		}
	}
	return Measure{Name: "command_velocity_m_s", Label: "command velocity", Limit: limit, Over: true, unit: 1e-3,
		say: func(v float64) string { return quantity.Format(v, quantity.Velocity) }, of: p.worst("peak_command_velocity")}
}

func (p *Problem) noise() Measure {
	return Measure{Name: "noise_gain", Label: "noise gain", Limit: p.Limits.NoiseGain, unit: 1,
		say:   func(v float64) string { return quantity.Format(v, quantity.None) },
		alone: func(_ context.Context, s *scenarios.Scenario) (float64, error) { return NoiseGain(s, p.Lane) }}
}
