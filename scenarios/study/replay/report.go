package replay

import (
	"math"
	"os"

	"antelag/rtloop"
	"antelag/scenarios/accept"
)

// Report is what a record came to, in SI, with the names of the JSON output.
type Report struct {
	Log      string        `json:"log"`
	Rate     float64       `json:"rate_hz"` // samples a physical second
	Slowdown float64       `json:"slowdown"`
	Start    rtloop.Figure `json:"start_s"` // time of the log
	Time     rtloop.Figure `json:"time_s"`  // from the first sample to the last
	Samples  int64         `json:"samples"`
	Notes    []string      `json:"notes"`
	Window   float64       `json:"window_s"`
	Channels []Channel     `json:"channels"`
	Energy   Energy        `json:"energy"`
	Against  *Against      `json:"against"`

	Interrupted bool   `json:"interrupted"`
	Title       string `json:"-"` // of the scenario that it comes from, "" unknown
}

// Channel is one channel: the figures of the whole record, with the names that run
// has for them, and those over time.
type Channel struct {
	rtloop.ChannelResult
	Windows []Window `json:"windows"`
	Worst   []Moment `json:"worst"`
}

// Moment is where a figure was worst: at an instant, or in a window.
type Moment struct {
	Figure string        `json:"figure"`
	Value  rtloop.Figure `json:"value"`
	Start  rtloop.Figure `json:"start_s"`
	End    rtloop.Figure `json:"end_s"`
}

// Energy is that of the whole record: what the tracking error put into the
// structure, what the specimens took, both from displacements and forces as they
// were measured, and the margins that were logged.
type Energy struct {
	Injected    rtloop.Figure `json:"injected_J"`
	Specimen    rtloop.Figure `json:"specimen_J"`
	MarginMin   rtloop.Figure `json:"margin_min"`
	MarginWhen  rtloop.Figure `json:"margin_min_s"` // time of the least
	MarginFinal rtloop.Figure `json:"margin_final"`
}

// Against is what a scenario's actuator makes of the recorded target under every
// lane.
type Against struct {
	Scenario string           `json:"scenario"`
	Channels []AgainstChannel `json:"channels"`
	OpenLoop string           `json:"open_loop"` // what it does not say
}

// AgainstChannel is one channel of it. The first lane is the record itself.
type AgainstChannel struct {
	Name  string        `json:"name"`
	Lanes []accept.Lane `json:"lanes"`
}

// Pass reports whether every configured lane that was driven met the limits on
// tracking. Without a scenario there is nothing to fail.
func (r *Report) Pass() bool {
	if r.Against == nil {
		return true
	}
	for _, c := range r.Against.Channels {
		for _, l := range c.Lanes[1:2] {
			if !l.Pass {
				return false
			}
		}
	}
	return true
}

// worst finds the moments at which the figures of channel j were worst.
func (p *Replay) worst(j int, windows []Window) []Moment {
	c := p.channels[j]
	var out []Moment
	if c.began {
		at := rtloop.Figure(p.Time(c.peakErrorAt))
		out = append(out, Moment{"peak_error_m", rtloop.Figure(c.peakError), at, at})
	}
	for _, f := range []struct {
		name  string
		of    func(*Window) rtloop.Figure
		worse func(float64) float64 // the larger the worse
	}{
		{"nrmse", func(w *Window) rtloop.Figure { return w.NRMSE }, func(v float64) float64 { return v }},
		{"delay_s", func(w *Window) rtloop.Figure { return w.Delay }, math.Abs},
		{"amplitude_ratio", func(w *Window) rtloop.Figure { return w.AmplitudeRatio }, func(v float64) float64 { return math.Abs(v - 1) }},
		{"injected_J", func(w *Window) rtloop.Figure { return w.Injected }, func(v float64) float64 { return v }},
	} {
		best := -1
		for i := range windows {
			if v := f.of(&windows[i]); v.Defined() && (best < 0 || f.worse(float64(v)) > f.worse(float64(f.of(&windows[best])))) {
				best = i
			}
		}
		if best >= 0 && f.worse(float64(f.of(&windows[best]))) > 0 {
			w := &windows[best]
			out = append(out, Moment{f.name, f.of(w), w.Start, w.End})
		}
	}
	return out
}

func exists(path string) bool {
	_, err := os.Stat(path)
	return err == nil
}
