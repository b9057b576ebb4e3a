package report

import (
	"math"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/scenarios"
)

// rows keep a history for the pictures. Of one longer than mostRows ticks they
// keep every second, fourth, … tick, so that memory is bounded; the figures of
// the verdict come from every tick.
type rows struct {
	channels []trace
	time     []float64 // s
	margin   []float64 // energy margin, NaN while undefined
	stride   int64     // ticks from one kept row to the next
	seen     int64
}

// trace is the history of one channel: m, m, m, N.
type trace struct{ target, command, measured, force []float64 }

const mostRows = 1 << 19

func newRows(channels int) *rows { return &rows{channels: make([]trace, channels), stride: 1} }

// keep reports whether the next row is to be kept.
func (r *rows) keep() bool {
	k := r.seen
	r.seen++
	if k%r.stride != 0 {
		return false
	}
	if len(r.time) == mostRows {
		r.halve()
	}
	return k%r.stride == 0
}

// halve drops every second row.
func (r *rows) halve() {
	half := func(v []float64) []float64 {
		n := (len(v) + 1) / 2
		for i := range n {
			v[i] = v[2*i]
		}
		return v[:n]
	}
	r.stride *= 2
	r.time, r.margin = half(r.time), half(r.margin)
	for j := range r.channels {
		t := &r.channels[j]
		t.target, t.command, t.measured, t.force = half(t.target), half(t.command), half(t.measured), half(t.force)
	}
}

// recorder keeps the history of the configured lane of a run.
type recorder struct {
	*rows
	loop     *rtloop.Loop
	bands    []*gauge.Record // how measured answers target, by channel
	response [][]gauge.Band
}

func newRecorder(s *scenarios.Scenario) *recorder { return &recorder{rows: newRows(len(s.Channels))} }

// observe is an accept.Options.Observe.
func (r *recorder) observe(lane string) func(*rtloop.Loop) error {
	if lane != scenarios.Configured {
		return nil
	}
	return r.row
}

func (r *recorder) row(l *rtloop.Loop) error {
	if r.loop == nil {
		r.loop = l
		for range r.channels {
			b := gauge.NewRecord(l.Period(), 0)
			b.Response = true
			r.bands = append(r.bands, b)
		}
	}
	if l.Outcome() == rtloop.Diverged { // numbers that mean nothing any more
		return nil
	}
	for j := range r.channels {
		row := l.Row(j)
		if l.Ticks() == 0 {
			r.bands[j].Start(row.Target, row.Measured)
		} else {
			r.bands[j].Add(row.Target, row.Measured)
		}
	}
	if !r.keep() {
		return nil
	}
	r.time, r.margin = append(r.time, l.Time()), append(r.margin, l.Margin())
	for j := range r.channels {
		row, t := l.Row(j), &r.channels[j]
		t.target, t.command = append(t.target, row.Target), append(t.command, row.Command)
		t.measured, t.force = append(t.measured, row.Measured), append(t.force, row.Force)
	}
	return nil
}

// finish works out what needs the whole run.
func (r *recorder) finish() {
	for _, b := range r.bands {
		r.response = append(r.response, b.Finish().Bands)
	}
	r.bands = nil
}

// span is a stretch of rows, from the first to before the last.
type span struct{ from, to int }

// strongest is the stretch of about so many seconds of r.time in whose middle
// the target of channel j is largest.
func (r *rows) strongest(j int, seconds float64) span {
	best := 0
	for i, x := range r.channels[j].target {
		if math.Abs(x) > math.Abs(r.channels[j].target[best]) {
			best = i
		}
	}
	n := len(r.time)
	rows := n
	if n > 1 {
		rows = min(n, max(2, int(seconds/(r.time[1]-r.time[0]))))
	}
	from := min(max(0, best-rows/2), n-rows)
	return span{from, from + rows}
}

// scaled returns values times a factor.
func scaled(v []float64, factor float64) []float64 {
	out := make([]float64, len(v))
	for i := range v {
		out[i] = v[i] * factor
	}
	return out
}

// difference returns (a − b) times a factor.
func difference(a, b []float64, factor float64) []float64 {
	out := make([]float64, len(a))
	for i := range a {
		out[i] = (a[i] - b[i]) * factor
	}
	return out
}
