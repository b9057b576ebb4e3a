package tune

import (
	"encoding/json"

	"antelag/rtloop"
	"antelag/scenarios/study"
)

// MarshalJSON writes the result with SI figures; what is undefined is null.
func (r *Result) MarshalJSON() ([]byte, error) {
	p := r.Problem
	out := resultJSON{
		Scenario: p.Scenario.Name, Lane: p.Lane, Figure: p.Column.Name(), Quantile: p.Quantile, Draws: p.Draws, Seed: p.Seed,
		Pass: r.Pass(), Complete: !r.Cut, Tried: r.Tried, Settings: []settingJSON{}, Limits: []limitJSON{}, Front: []candidateJSON{}, Stands: []obstacleJSON{},
		Best: p.candidateJSON(r.Best), Check: r.Check, Commands: r.Commands(),
		Compute: study.Compute{Wall: r.Wall, Runs: r.Runs, Workers: r.Workers},
	}
	if r.Before != nil {
		before := p.candidateJSON(r.Before)
		out.Before = &before
	}
	for i := range p.Ranges {
		g := &p.Ranges[i]
		out.Settings = append(out.Settings, settingJSON{study.SettingName(g.Path, &g.Setting), rtloop.Figure(p.start[i]), rtloop.Figure(r.Best.Values[i]), g.Low, g.High, g.Log})
	}
	for i := range p.Measures {
		m := &p.Measures[i]
		out.Limits = append(out.Limits, limitJSON{m.Name, rtloop.Figure(m.Limit), m.AtLeast, m.Pass(r.Best.Measured[i])})
	}
	for _, c := range r.Front {
		out.Front = append(out.Front, p.candidateJSON(c))
	}
	for _, o := range r.Stands {
		out.Stands = append(out.Stands, obstacleJSON{p.Measures[o.Measure].Name, rtloop.Figure(o.Got), rtloop.Figure(o.Nearest), o.Ever})
	}
	return json.Marshal(out)
}

func (p *Problem) candidateJSON(c *Candidate) candidateJSON {
	out := candidateJSON{Settings: map[string]rtloop.Figure{}, Figure: rtloop.Figure(c.Figure), Measured: map[string]rtloop.Figure{}, Pass: p.Pass(c)}
	for i := range p.Ranges {
		out.Settings[study.SettingName(p.Ranges[i].Path, &p.Ranges[i].Setting)] = rtloop.Figure(c.Values[i])
	}
	for i := range p.Measures {
		out.Measured[p.Measures[i].Name] = rtloop.Figure(c.Measured[i])
	}
	return out
}

type resultJSON struct {
	Scenario string          `json:"scenario"`
	Lane     string          `json:"lane"`
	Figure   string          `json:"figure"`
	Quantile float64         `json:"quantile"`
	Draws    int             `json:"draws"`
	Seed     int64           `json:"seed"`
	Pass     bool            `json:"pass"`
	Complete bool            `json:"complete"` // the search was not cut short
	Tried    int             `json:"tried"`
	Settings []settingJSON   `json:"settings"`
	Limits   []limitJSON     `json:"limits"`
	Before   *candidateJSON  `json:"before"`
	Best     candidateJSON   `json:"best"`
	Front    []candidateJSON `json:"front"`
	Stands   []obstacleJSON  `json:"in_the_way"`
	Check    *study.Summary  `json:"other_draws"`
	Commands []string        `json:"commands"`
	Compute  study.Compute   `json:"compute"`
}

type settingJSON struct {
	Name   string        `json:"name"`
	Before rtloop.Figure `json:"before"`
	After  rtloop.Figure `json:"after"`
	Low    float64       `json:"low"`
	High   float64       `json:"high"`
	Log    bool          `json:"log"`
}

type limitJSON struct {
	Name    string        `json:"name"`
	Limit   rtloop.Figure `json:"limit"` // null: none
	AtLeast bool          `json:"at_least"`
	Pass    bool          `json:"pass"`
}

type candidateJSON struct {
	Settings map[string]rtloop.Figure `json:"settings"`
	Figure   rtloop.Figure            `json:"figure"`
	Measured map[string]rtloop.Figure `json:"measured"` // a delay margin without end is null
	Pass     bool                     `json:"pass"`
}

type obstacleJSON struct {
	Limit   string        `json:"limit"`
	Got     rtloop.Figure `json:"got"`
	Nearest rtloop.Figure `json:"nearest"`
	Ever    bool          `json:"met_by_others"`
}
