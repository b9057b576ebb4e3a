package study

import (
	"encoding/json"
	"math"

	"antelag/rtloop"
)

// MarshalJSON writes the summary with SI figures; what is undefined is null.
func (s *Summary) MarshalJSON() ([]byte, error) {
	st := s.Study
	out := summaryJSON{
		Scenario: st.Scenario.Name, Lane: st.Lane, Sets: append([]string{}, st.Sets...), Draws: st.Draws,
		Of: st.Runs(), Runs: s.Runs, Passed: s.Passed, Pass: s.Pass(), Outcomes: s.Outcomes, Limits: s.Limits,
		Settings: []settingJSON{}, Figures: []tallyJSON{}, Points: []pointJSON{}, Spans: [][2]float64{}, Compute: s.Compute,
	}
	if st.Draws > 0 {
		out.Law, out.Sampling, out.Seed = &st.Law, &st.Sampling, &st.Seed
		if len(st.Grid) == 0 {
			v := rtloop.Figure(s.AtLeast())
			out.AtLeast = &v
		}
	}
	for i := range st.Grid {
		a := &st.Grid[i]
		out.Settings = append(out.Settings, settingJSON{SettingName(a.Path, &a.Setting), a.Low, a.High, a.N, a.Log, false})
	}
	for i := range st.Spread {
		sp := &st.Spread[i]
		out.Settings = append(out.Settings, settingJSON{SettingName(sp.Path, &sp.Setting), sp.Low, sp.High, 0, false, true})
	}
	for i := range s.Figures {
		t := &s.Figures[i]
		out.Figures = append(out.Figures, tallyJSON{
			Name: t.Column.Name(), Limit: rtloop.Figure(t.Limit), Failed: t.Failed,
			Worst: st.extremeJSON(&t.Worst), Best: st.extremeJSON(&t.Best),
			Quantiles: map[string]rtloop.Figure{"0.5": rtloop.Figure(t.Quantile(0.5)), "0.9": rtloop.Figure(t.Quantile(0.9)), "0.95": rtloop.Figure(t.Quantile(0.95)), "0.99": rtloop.Figure(t.Quantile(0.99))},
		})
	}
	for _, p := range s.Points {
		if p.Worst == nil { // not all its draws are there
			continue
		}
		j := pointJSON{Values: p.Values, Runs: p.Runs, Passed: p.Passed, Worst: map[string]rtloop.Figure{}, Most: map[string]rtloop.Figure{}}
		for i := range s.Figures {
			name := s.Figures[i].Column.Name()
			j.Worst[name], j.Most[name] = rtloop.Figure(p.Worst[i]), rtloop.Figure(p.Most[i])
		}
		out.Points = append(out.Points, j)
	}
	for _, sp := range s.Spans {
		out.Spans = append(out.Spans, [2]float64{sp.Low, sp.High})
	}
	return json.Marshal(out)
}

type summaryJSON struct {
	Scenario string           `json:"scenario"`
	Lane     string           `json:"lane"`
	Sets     []string         `json:"set"`
	Draws    int64            `json:"draws"`
	Law      *Law             `json:"law"`
	Sampling *Sampling        `json:"sampling"`
	Seed     *int64           `json:"seed"`
	Settings []settingJSON    `json:"settings"`
	Of       int64            `json:"of"`
	Runs     int64            `json:"runs"`
	Passed   int64            `json:"passed"`
	Pass     bool             `json:"pass"`
	AtLeast  *rtloop.Figure   `json:"pass_at_least"`
	Outcomes map[string]int64 `json:"outcomes"`
	Limits   map[string]int64 `json:"limits"`
	Figures  []tallyJSON      `json:"figures"`
	Points   []pointJSON      `json:"points"`
	Spans    [][2]float64     `json:"all_pass"`
	Compute  Compute          `json:"compute"`
}

type settingJSON struct {
	Name  string  `json:"name"`
	Low   float64 `json:"low"`
	High  float64 `json:"high"`
	N     int     `json:"values"`
	Log   bool    `json:"log"`
	Drawn bool    `json:"drawn"`
}

type tallyJSON struct {
	Name      string                   `json:"name"`
	Limit     rtloop.Figure            `json:"limit"`
	Failed    int64                    `json:"failed"`
	Worst     extremeJSON              `json:"worst"`
	Best      extremeJSON              `json:"best"`
	Quantiles map[string]rtloop.Figure `json:"quantiles"`
}

type extremeJSON struct {
	Run     int64         `json:"run"`
	Value   rtloop.Figure `json:"value"`
	Outcome string        `json:"outcome"`
	Command string        `json:"command"`
}

type pointJSON struct {
	Values []float64                `json:"values"`
	Runs   int64                    `json:"runs"`
	Passed int64                    `json:"passed"`
	Worst  map[string]rtloop.Figure `json:"worst"`
	Most   map[string]rtloop.Figure `json:"q95"`
}

func (st *Study) extremeJSON(e *Extreme) extremeJSON {
	if e.Outcome == "" {
		return extremeJSON{Run: -1, Value: rtloop.Figure(math.NaN())}
	}
	return extremeJSON{e.Run, rtloop.Figure(e.Value), e.Outcome, st.Command(e.Run)}
}
