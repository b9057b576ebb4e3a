package tempo

import (
	"encoding/json"
	"math"

	"antelag/rtloop"
	"antelag/scenarios/accept"
)

type (
	jsonReport struct {
		Scenario string         `json:"scenario"`
		Lane     string         `json:"lane"`
		Points   []jsonPoint    `json:"points"`
		Fastest  *rtloop.Figure `json:"fastest_slowdown"` // that passes
		NoMargin string         `json:"no_delay_margin,omitempty"`
		Broken   bool           `json:"interrupted"`
	}
	jsonPoint struct {
		Slowdown     float64            `json:"slowdown"`
		Lasts        float64            `json:"lasts_s"` // physical
		Outcome      rtloop.Outcome     `json:"outcome"`
		Channels     []jsonChannel      `json:"channels"`
		EnergyMargin rtloop.Figure      `json:"energy_margin"`
		DelayMargin  rtloop.Figure      `json:"delay_margin_s"`
		Stable       *bool              `json:"stable"`
		Response     rtloop.Figure      `json:"response_error"`
		Sync         rtloop.Figure      `json:"synchronization_error"`
		Rate         rtloop.Figure      `json:"rate_error"`
		Correlation  rtloop.Figure      `json:"correlation"`
		Accept       []accept.Judgement `json:"accept"`
		Pass         bool               `json:"pass"`
	}
	jsonChannel struct {
		Name  string        `json:"name"`
		NRMSE rtloop.Figure `json:"nrmse"`
		Delay rtloop.Figure `json:"delay_s"`
	}
)

// MarshalJSON writes the study in SI; what is undefined is null. A delay margin
// is null where no extra delay was found at which the loop grows, too.
func (r *Report) MarshalJSON() ([]byte, error) {
	out := jsonReport{Scenario: r.Scenario, Lane: r.Lane, Points: []jsonPoint{}, NoMargin: r.NoMargin, Broken: len(r.Points) < r.Asked}
	if i := r.Fastest(); i >= 0 {
		v := rtloop.Figure(r.Points[i].Slowdown)
		out.Fastest = &v
	}
	for i := range r.Points {
		p := &r.Points[i]
		j := jsonPoint{
			Slowdown: p.Slowdown, Lasts: p.Lasts, Outcome: p.Lane.Outcome, EnergyMargin: p.Lane.Energy.MarginMin,
			DelayMargin: rtloop.Figure(p.DelayMargin), Response: rtloop.Figure(p.Split.Total), Sync: rtloop.Figure(p.Split.Sync),
			Rate: rtloop.Figure(p.Split.Rate), Correlation: rtloop.Figure(p.Split.Correlation), Accept: p.Lane.Accept, Pass: p.Lane.Pass,
		}
		if !math.IsNaN(p.DelayMargin) {
			j.Stable = &p.Stable
		}
		for _, c := range p.Lane.Channels {
			j.Channels = append(j.Channels, jsonChannel{c.Name, c.NRMSE, c.Delay})
		}
		out.Points = append(out.Points, j)
	}
	return json.Marshal(out)
}
