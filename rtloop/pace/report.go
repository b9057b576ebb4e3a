package pace

import (
	"math"
	"slices"
	"time"
)

// Report is what a Pacer has measured so far. Late, Overruns and Shifts are
// as the package defines them: every shift is an overrun, every overrun late.
type Report struct {
	Period   float64       // s
	Ticks    int64         // released
	Late     int64         // more than Tolerance of the period after their deadline
	Overruns int64         // more than a period after it
	Shifts   int64         // times the deadlines were moved
	Shifted  time.Duration // by how much in all

	// The lateness of all ticks: percentiles to three digits, and the worst.
	P50, P90, P99, P999, Max time.Duration

	Granted  []string // what Lock was granted, in words; empty without Lock
	RealTime bool     // whether that includes real-time priority
}

// Report says how the ticks have been released so far. It may be called from
// any goroutine; it does not delay a tick.
func (p *Pacer) Report() Report {
	t := &p.tally
	var r Report
	r.Shifts, r.Shifted = t.shifts.Load(), time.Duration(t.shifted.Load())
	r.Overruns = t.overruns.Load()
	r.Late = t.late.Load()
	v := t.percentiles(50, 90, 99, 99.9)
	r.Max = time.Duration(t.worst.Load())
	for i, to := range []*time.Duration{&r.P50, &r.P90, &r.P99, &r.P999} {
		*to = min(v[i], r.Max) // a bucket may reach beyond the worst in it
	}
	r.Ticks = t.ticks.Load()
	r.Period = math.Float64frombits(t.period.Load())
	p.shown.Lock()
	defer p.shown.Unlock()
	r.Granted, r.RealTime = slices.Clone(p.granted.words), p.granted.realTime
	return r
}

// Verdict says whether a rate was held.
type Verdict int

const (
	Fails     Verdict = iota // an overrun, or no tick at all
	HoldsLate                // no overrun, but one tick in a thousand or more was late
	Holds                    // no overrun, and P999 within Tolerance of the period
)

// Verdict judges what was measured.
func (r *Report) Verdict() Verdict {
	switch {
	case r.Ticks == 0 || r.Overruns > 0:
		return Fails
	case r.P999.Seconds() > Tolerance*r.Period:
		return HoldsLate
	}
	return Holds
}
