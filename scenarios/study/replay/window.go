package replay

import (
	"math"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
)

// Window is what the gauges find in one window of the record.
type Window struct {
	Start rtloop.Figure `json:"start_s"` // time of the log
	End   rtloop.Figure `json:"end_s"`
	// Quiet says that the target hardly moved: what would be ratios and delays
	// of noise is undefined.
	Quiet             bool             `json:"quiet"`
	NRMSE             rtloop.Figure    `json:"nrmse"`
	PeakError         rtloop.Figure    `json:"peak_error_m"`
	Delay             rtloop.Figure    `json:"delay_s"`
	AmplitudeRatio    rtloop.Figure    `json:"amplitude_ratio"`
	FEI               rtloop.FEIResult `json:"fei"`
	TrackingIndicator rtloop.Figure    `json:"tracking_indicator_m2"`
	Amplitude         rtloop.Figure    `json:"target_amplitude_m"` // √2 of the target's deviation
	Subspace          Ellipse          `json:"subspace"`
	Injected          rtloop.Figure    `json:"injected_J"`
	Margin            rtloop.Figure    `json:"energy_margin"` // least that was logged

	first, last int64 // samples
}

// Ellipse is the synchronization subspace of a window.
type Ellipse struct {
	Major          rtloop.Figure `json:"major_m"`
	Minor          rtloop.Figure `json:"minor_m"`
	Tilt           rtloop.Figure `json:"tilt_rad"`
	AmplitudeRatio rtloop.Figure `json:"amplitude_ratio"`
	Delay          rtloop.Figure `json:"delay_s"`
}

// resting is the share of the peak target below which the amplitude of a window
// says nothing of synchronization; the dashboard has the same.
const resting = 0.005

// windowsMost bounds how many windows are kept, some days of them. Beyond it, of
// every two the one with the larger error stays.
const windowsMost = 1 << 16

// windows cuts a channel's record into windows of so many samples, each half over
// the one before.
type windows struct {
	tick   float64
	length int
	spans  [2]span
	done   []Window
	thin   int // windows of which one is kept
	seen   int // of these
}

// span is a window that is being filled.
type span struct {
	tracking        *gauge.Tracking
	record          *gauge.Record
	first           int64
	n               int // samples; 0: not begun
	base, sum, sum2 float64
	injected        float64
	margin          float64
}

func newWindows(tick float64, length int) windows {
	w := windows{tick: tick, length: length, thin: 1}
	for i := range w.spans {
		w.spans[i] = span{tracking: gauge.NewTracking(length + 1), record: gauge.NewRecord(tick, length)}
	}
	return w
}

// add takes sample k of the record.
func (w *windows) add(k int64, x, y, injected, margin float64) {
	half := int64(w.length / 2)
	for i := range w.spans {
		s := &w.spans[i]
		if s.n == 0 {
			// They begin at even and odd multiples of half a window.
			if k%half != 0 || (k/half)%2 != int64(i) {
				continue
			}
			s.start(k, x, y, margin)
			continue
		}
		s.add(x, y, injected, margin)
		if s.n > w.length {
			w.keep(s.finish(w.tick))
			s.n = 0
			if k%half == 0 && (k/half)%2 == int64(i) { // the next begins where this one ends
				s.start(k, x, y, margin)
			}
		}
	}
}

func (s *span) start(k int64, x, y, margin float64) {
	s.tracking.Start(x, y)
	s.record.Start(x, y)
	s.first, s.n, s.base, s.sum, s.sum2, s.injected, s.margin = k, 1, x, 0, 0, 0, margin
}

func (s *span) add(x, y, injected, margin float64) {
	s.n++
	s.tracking.Add(x, y)
	s.record.Add(x, y)
	u := x - s.base
	s.sum += u
	s.sum2 += u * u
	s.injected += injected
	if margin < s.margin || s.margin != s.margin {
		s.margin = margin
	}
}

// finish works out the figures of the window.
func (s *span) finish(tick float64) Window {
	t, align, e := s.tracking, s.record.Finish(), s.tracking.Subspace()
	mean := s.sum / float64(s.n)
	return Window{
		NRMSE: rtloop.Figure(t.NRMSE()), PeakError: rtloop.Figure(t.PeakError()), Delay: rtloop.Figure(align.Delay), AmplitudeRatio: rtloop.Figure(t.AmplitudeRatio()),
		FEI:               rtloop.FEIResult{Amplitude: rtloop.Figure(align.FEI.Amplitude), Delay: rtloop.Figure(align.FEI.Delay), Frequency: rtloop.Figure(align.FEI.Frequency)},
		TrackingIndicator: rtloop.Figure(t.Indicator()),
		Amplitude:         rtloop.Figure(math.Sqrt(2 * max(0, s.sum2/float64(s.n)-mean*mean))),
		Subspace:          Ellipse{rtloop.Figure(e.Major), rtloop.Figure(e.Minor), rtloop.Figure(e.Tilt), rtloop.Figure(e.AmplitudeRatio), rtloop.Figure(e.Delay * tick)},
		Injected:          rtloop.Figure(s.injected), Margin: rtloop.Figure(s.margin),
		first: s.first, last: s.first + int64(s.n) - 1,
	}
}

// keep keeps a window, or the worse of so many.
func (w *windows) keep(one Window) {
	if w.seen > 0 {
		if last := &w.done[len(w.done)-1]; one.PeakError > last.PeakError {
			*last = one
		}
	} else {
		w.done = append(w.done, one)
	}
	if w.seen++; w.seen == w.thin {
		w.seen = 0
	}
	if w.seen > 0 || len(w.done) < windowsMost {
		return
	}
	half := w.done[:0]
	for i := 0; i+1 < len(w.done); i += 2 {
		worse := w.done[i]
		if w.done[i+1].PeakError > worse.PeakError {
			worse = w.done[i+1]
		}
		half = append(half, worse)
	}
	w.done, w.thin = half, 2*w.thin
}

// all returns all windows of a record that ended, and with them what has been
// begun and goes beyond the last, so that none of the record is left out. peak is
// the peak target.
func (w *windows) all(peak float64, at func(int64) float64) []Window {
	out := append([]Window(nil), w.done...)
	older := &w.spans[0]
	if b := &w.spans[1]; b.n > older.n {
		older = b
	}
	if older.n > w.length/2+1 || len(out) == 0 && older.n > 1 {
		out = append(out, older.finish(w.tick))
	}
	for i := range out {
		o := &out[i]
		o.Start, o.End = rtloop.Figure(at(o.first)), rtloop.Figure(at(o.last))
		if !(float64(o.Amplitude) >= resting*peak) || peak == 0 {
			o.hush()
		}
	}
	return out
}

// hush makes undefined what would be figures of noise.
func (o *Window) hush() {
	nan := rtloop.Figure(math.NaN())
	o.Quiet = true
	o.NRMSE, o.Delay, o.AmplitudeRatio = nan, nan, nan
	o.FEI = rtloop.FEIResult{Amplitude: nan, Delay: nan, Frequency: nan}
	o.Subspace.Tilt, o.Subspace.AmplitudeRatio, o.Subspace.Delay = nan, nan, nan
}
