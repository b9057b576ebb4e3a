// Package accept runs scenarios and judges them by their acceptance limits.
package accept

import (
	"context"
	"math"
	"time"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Verdict is what a run came to, in SI, with the names of the JSON output.
type Verdict struct {
	Scenario string  `json:"scenario"`
	Ticks    int64   `json:"ticks"`
	Rate     float64 `json:"rate_hz"`
	Slowdown float64 `json:"slowdown"`
	Step     float64 `json:"dt_s"` // model seconds a tick
	Lanes    []Lane  `json:"lanes"`
	Compute  Compute `json:"compute"`

	Title string              `json:"-"`
	Drive quantity.Dim        `json:"-"`
	Time  float64             `json:"-"` // model seconds of the whole run
	Scene *scenarios.Scenario `json:"-"`
}

// Lane is the result of one lane with its judgement.
type Lane struct {
	rtloop.LaneResult
	Accept []Judgement `json:"accept"`
	Pass   bool        `json:"pass"`

	Ran float64 `json:"ran_s"` // model seconds that it ran
}

// Judgement is one acceptance limit against what was found. Channel is the
// worst one, where the limit is judged by channel.
type Judgement struct {
	Limit   string        `json:"limit"`
	Channel string        `json:"channel,omitempty"`
	Want    float64       `json:"want"`
	Got     rtloop.Figure `json:"got"`
	Pass    bool          `json:"pass"`

	Dim quantity.Dim `json:"-"`
}

// Compute says what the run cost.
type Compute struct {
	Wall      float64 `json:"wall_s"`
	NsPerTick float64 `json:"ns_per_tick"` // over all lanes and the reference together
}

// Options are what a run may be given beside the scenario.
type Options struct {
	// Observe returns, for a lane's name, what is called at every tick of that
	// lane; it may be nil.
	Observe  func(lane string) func(*rtloop.Loop) error
	Progress func(done, of int64)
}

// Run builds the scenario, runs it to its end or until ctx ends, and judges
// it. An error means that there is no verdict, or, with a verdict, that an
// observer failed (a log that could not be written).
func Run(ctx context.Context, s *scenarios.Scenario, o Options) (*Verdict, error) {
	rig, err := s.Build()
	if err != nil {
		return nil, err
	}
	return RunOn(ctx, s, rig, o)
}

// RunOn is Run on a rig that was built from the scenario and perhaps changed
// in ways that no setting describes.
func RunOn(ctx context.Context, s *scenarios.Scenario, rig *rtloop.Rig, o Options) (*Verdict, error) {
	if o.Observe != nil {
		for _, l := range rig.Lanes {
			l.Observe = o.Observe(l.Name)
		}
	}
	var progress func(int64)
	if o.Progress != nil {
		progress = func(done int64) { o.Progress(done, rig.Ticks) }
	}
	began := time.Now()
	err := rig.Run(ctx, progress)
	v := &Verdict{
		Scenario: s.Name, Title: s.Title, Ticks: rig.Ticks, Rate: s.Loop.Num("rate"), Slowdown: s.Loop.Num("slowdown"),
		Step: rig.Step, Time: float64(rig.Ticks) * rig.Step, Drive: s.Excitation.Drives.Dim(), Scene: s,
	}
	ticks := int64(1)
	for i, res := range rig.Results() {
		lane := judge(res, s.Accept)
		lane.Ran = rig.Lanes[i].Loop.Time()
		v.Lanes = append(v.Lanes, lane)
		ticks = max(ticks, rig.Lanes[i].Loop.Ticks())
	}
	v.Compute.Wall = time.Since(began).Seconds()
	v.Compute.NsPerTick = v.Compute.Wall * 1e9 / float64(ticks)
	return v, err
}

// Pass reports whether the configured lane, the first, met every limit. The
// other lanes are alternatives to compare with; they decide nothing.
func (v *Verdict) Pass() bool { return v.Lanes[0].Pass }

// limitNames are the acceptance limits in the order in which they are judged.
var limitNames = []string{"nrmse", "delay", "peak_error", "energy_margin", "response_error", "spectrum_error"}

// judge holds a lane's figures against the limits. A figure that is undefined
// fails: what could not be measured was not met.
func judge(res rtloop.LaneResult, limits kind.Values) Lane {
	lane := Lane{LaneResult: res, Accept: []Judgement{}, Pass: res.Outcome == rtloop.Completed}
	for _, name := range limitNames {
		if !limits.Has(name) {
			continue
		}
		j := measure(res, name)
		j.Want = limits.Num(name)
		if name == "energy_margin" {
			j.Pass = float64(j.Got) >= j.Want
		} else {
			j.Pass = math.Abs(float64(j.Got)) <= j.Want
		}
		lane.Pass = lane.Pass && j.Pass
		lane.Accept = append(lane.Accept, j)
	}
	return lane
}

// measure finds the figure that a limit judges, of the worst channel.
func measure(res rtloop.LaneResult, name string) Judgement {
	j := Judgement{Limit: name}
	switch name {
	case "energy_margin":
		j.Got = res.Energy.MarginMin
		return j
	case "response_error":
		j.Got = res.ResponseError
		return j
	}
	for i, c := range res.Channels {
		got := map[string]rtloop.Figure{"nrmse": c.NRMSE, "delay": c.Delay, "peak_error": c.PeakError, "spectrum_error": c.SpectrumError}[name]
		if i == 0 || j.Got.Defined() && !(math.Abs(float64(got)) <= math.Abs(float64(j.Got))) {
			j.Got, j.Channel = got, c.Name
		}
	}
	j.Dim = map[string]quantity.Dim{"delay": quantity.Time, "peak_error": quantity.Length}[name]
	return j
}
