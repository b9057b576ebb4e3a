package check

import (
	"encoding/json"

	"antelag/scenarios/accept"
	"antelag/scenarios/accept/baseline"
)

type (
	jsonReport struct {
		Pass      bool       `json:"pass"`
		Scenarios []jsonTest `json:"scenarios"`
		Gone      []string   `json:"baselines_without_scenario"`
		LeftOut   []string   `json:"left_out"`
	}
	jsonTest struct {
		Scenario string             `json:"scenario"`
		Title    string             `json:"title"`
		Pass     bool               `json:"pass"`
		Error    *string            `json:"error"`
		Outcome  *string            `json:"outcome"` // of the configured lane
		Accept   []accept.Judgement `json:"accept"`
		Baseline jsonBaseline       `json:"baseline"`
	}
	jsonBaseline struct {
		File    string `json:"file"`
		State   State  `json:"state"`
		Version string `json:"version"`
		*baseline.Comparison
	}
)

// MarshalJSON writes the whole check in SI. It holds no time that the check
// took: the same check gives the same bytes.
func (p *Report) MarshalJSON() ([]byte, error) {
	out := jsonReport{Pass: p.Pass(), Scenarios: []jsonTest{}, Gone: orEmpty(p.Gone), LeftOut: orEmpty(p.LeftOut)}
	for i := range p.Results {
		r := &p.Results[i]
		t := jsonTest{Scenario: r.Name, Pass: r.Pass(), Accept: []accept.Judgement{}, Baseline: jsonBaseline{File: r.Path, State: r.State, Comparison: r.Comparison}}
		if r.Scene != nil {
			t.Title = r.Scene.Title
		}
		if r.Baseline != nil {
			t.Baseline.Version = r.Baseline.Version
		}
		if r.Err != nil {
			text := r.Err.Error()
			t.Error = &text
		}
		if r.Verdict != nil {
			word := r.Verdict.Lanes[0].Outcome.String()
			t.Outcome, t.Accept = &word, r.Verdict.Lanes[0].Accept
		}
		out.Scenarios = append(out.Scenarios, t)
	}
	return json.Marshal(out)
}

func orEmpty(s []string) []string {
	if s == nil {
		return []string{}
	}
	return s
}
