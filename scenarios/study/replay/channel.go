package replay

import (
	"math"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/rtloop/runlog"
)

// channel is one channel of the record with its gauges.
type channel struct {
	runlog.Channel
	tick     float64 // physical seconds between samples
	tracking *gauge.Tracking
	record   *gauge.Record
	spectrum *gauge.Spectrum // nil unless asked for

	began          bool
	x, u, y, r     float64 // last sample
	peakCommand    float64
	peakHurry      float64
	peakForce      float64
	peakError      float64
	peakErrorAt    int64 // sample
	work, injected gauge.Sum

	windows windows
}

func newChannel(c runlog.Channel, tick, step float64, window int, expected int64, spectra bool) *channel {
	out := &channel{
		Channel: c, tick: tick,
		tracking: gauge.NewTracking(window), record: gauge.NewRecord(tick, int(min(expected, math.MaxInt32))),
		windows: newWindows(tick, window),
	}
	out.record.Response = true
	if spectra {
		out.spectrum = gauge.NewSpectrum(step)
	}
	return out
}

// add takes a block of samples, of which the first is number first.
func (c *channel) add(first int64, s *runlog.Samples, margin []float64) {
	target, measured := s[runlog.Target], s[runlog.Measured]
	command, force := s[runlog.Command], s[runlog.Force]
	for k, x := range target {
		y, u, r, m := measured[k], 0.0, 0.0, math.NaN()
		if command != nil {
			u = command[k]
		}
		if force != nil {
			r = force[k]
		}
		if margin != nil {
			m = margin[k]
		}
		c.sample(first+int64(k), x, u, y, r, m)
	}
}

// sample takes one sample, as a loop takes a tick: the first is where it starts.
func (c *channel) sample(k int64, x, u, y, r, margin float64) {
	injected := 0.0
	if !c.began {
		c.began = true
		c.tracking.Start(x, y)
		c.record.Start(x, y)
		if c.spectrum != nil {
			c.spectrum.Start(x, y)
		}
	} else {
		c.tracking.Add(x, y)
		c.record.Add(x, y)
		if c.spectrum != nil {
			c.spectrum.Add(x, y)
		}
		c.peakHurry = max(c.peakHurry, math.Abs(u-c.u)/c.tick)
		mean, dy := 0.5*(c.r+r), y-c.y
		injected = mean * (dy - (x - c.x))
		c.injected.Add(injected)
		c.work.Add(mean * dy)
	}
	if e := math.Abs(x - y); e > c.peakError {
		c.peakError, c.peakErrorAt = e, k
	}
	c.peakCommand, c.peakForce = max(c.peakCommand, math.Abs(u)), max(c.peakForce, math.Abs(r))
	c.x, c.u, c.y, c.r = x, u, y, r
	c.windows.add(k, x, y, injected, margin)
}

// result gathers the figures of the whole record, as a loop's do.
func (c *channel) result() rtloop.ChannelResult {
	t, align := c.tracking, c.record.Finish()
	nan := rtloop.Figure(math.NaN())
	res := rtloop.ChannelResult{
		Name: c.Name, Compensator: Recorded,
		NRMSE: rtloop.Figure(t.NRMSE()), PeakError: rtloop.Figure(t.PeakError()), PeakErrorRatio: rtloop.Figure(t.PeakErrorRatio()),
		Delay: rtloop.Figure(align.Delay), AmplitudeRatio: rtloop.Figure(t.AmplitudeRatio()),
		FEI:               rtloop.FEIResult{Amplitude: rtloop.Figure(align.FEI.Amplitude), Delay: rtloop.Figure(align.FEI.Delay), Frequency: rtloop.Figure(align.FEI.Frequency)},
		TrackingIndicator: rtloop.Figure(t.Indicator()), PeakTarget: rtloop.Figure(t.PeakTarget()),
		PeakCommand: nan, PeakVelocity: nan, PeakHurry: nan, PeakForce: nan, SpectrumError: nan,
		Coefficients: map[string]rtloop.Figure{},
	}
	if c.Has[runlog.Command] {
		res.PeakCommand, res.PeakHurry = rtloop.Figure(c.peakCommand), rtloop.Figure(c.peakHurry)
	}
	if c.Has[runlog.Force] {
		res.PeakForce = rtloop.Figure(c.peakForce)
	}
	if c.spectrum != nil {
		res.SpectrumError = rtloop.Figure(c.spectrum.Error())
	}
	for _, b := range align.Bands {
		res.Response = append(res.Response, rtloop.BandResult{Frequency: rtloop.Figure(b.Frequency), Amplitude: rtloop.Figure(b.Amplitude), Delay: rtloop.Figure(b.Delay)})
	}
	return res
}
