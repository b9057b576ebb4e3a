package identified

import (
	"path/filepath"

	"antelag/scenarios/accept"
	picture "antelag/scenarios/report/figure"
)

// Curves are the answer against frequency, for drawing: what was measured, with
// its standard error, and what the fit says.
type Curves struct {
	Hz                          []float64
	Gain, GainLow, GainHigh     []float64
	Delay, DelayLow, DelayHigh  []float64 // ms
	Coherence                   []float64
	FitGain, FitDelay           []float64
	Amplitude, ByAmplitude      []float64 // mm, ms
	AmplitudeLow, AmplitudeHigh []float64
}

// sure is how many standard errors a band is wide to each side: it holds 95 %.
const sure = 1.96

// Curves samples the report.
func (r *Report) Curves() *Curves {
	c := &Curves{}
	f := r.Best()
	for _, b := range r.Response {
		gain, delay := f.At(b.Hz)
		c.Hz = append(c.Hz, b.Hz)
		c.Gain = append(c.Gain, b.Gain)
		c.GainLow = append(c.GainLow, b.Gain-sure*b.GainSigma)
		c.GainHigh = append(c.GainHigh, b.Gain+sure*b.GainSigma)
		c.Delay = append(c.Delay, 1e3*b.Delay)
		c.DelayLow = append(c.DelayLow, 1e3*(b.Delay-sure*b.DelaySigma))
		c.DelayHigh = append(c.DelayHigh, 1e3*(b.Delay+sure*b.DelaySigma))
		c.Coherence = append(c.Coherence, b.Coherence)
		c.FitGain = append(c.FitGain, gain)
		c.FitDelay = append(c.FitDelay, 1e3*delay)
	}
	for _, g := range r.Groups {
		c.Amplitude = append(c.Amplitude, 1e3*g.Amplitude)
		c.ByAmplitude = append(c.ByAmplitude, 1e3*g.Delay)
		c.AmplitudeLow = append(c.AmplitudeLow, 1e3*(g.Delay-sure*g.DelaySigma))
		c.AmplitudeHigh = append(c.AmplitudeHigh, 1e3*(g.Delay+sure*g.DelaySigma))
	}
	return c
}

// Figure is the picture of the report.
func (r *Report) Figure() picture.Figure {
	c := r.Curves()
	x := picture.Axis{Label: "frequency", Unit: "Hz", Log: r.Band[1] > 4*r.Band[0]}
	fit := r.Best().Kind + " fit"
	panels := []picture.Panel{
		{Title: "gain, measured over command", X: x, Y: picture.Axis{Label: "gain"}, Lines: []picture.Line{
			{Name: "record, with 95 % limits", X: c.Hz, Y: c.Gain, Low: c.GainLow, High: c.GainHigh},
			{Name: fit, X: c.Hz, Y: c.FitGain},
		}},
		{Title: "delay against frequency", X: x, Y: picture.Axis{Label: "phase delay", Unit: "ms"}, Lines: []picture.Line{
			{Name: "record, with 95 % limits", X: c.Hz, Y: c.Delay, Low: c.DelayLow, High: c.DelayHigh},
			{Name: fit, X: c.Hz, Y: c.FitDelay},
		}},
		{Title: "coherence", X: x, Y: picture.Axis{Label: "coherence", High: 1.02}, Lines: []picture.Line{{X: c.Hz, Y: c.Coherence}}, Share: 0.6},
	}
	if len(c.Amplitude) > 1 {
		panels = append(panels, picture.Panel{Title: "delay against amplitude", X: picture.Axis{Label: "amplitude", Unit: "mm"},
			Y: picture.Axis{Label: "delay", Unit: "ms"}, Lines: []picture.Line{
				{X: c.Amplitude, Y: c.ByAmplitude, Low: c.AmplitudeLow, High: c.AmplitudeHigh, Points: true, Joined: true},
			}})
	}
	return picture.Figure{Title: accept.Printable(filepath.Base(r.Log)) + ", channel " + accept.Printable(r.Channel), Panels: panels}
}
