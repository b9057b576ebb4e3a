// Package pace releases the ticks of a loop at a fixed rate and measures how
// late each was released. It knows nothing of what a tick does.
//
// The deadline of tick k is t0 + k·T, T the period: deadlines are computed
// anew from t0, never added up, so that the rate has no drift. A tick is
// never skipped. What comes too late is named so:
//
//   - late: released more than a tenth of the period (Tolerance) after its deadline;
//   - overrun: released more than a whole period after its deadline, when the
//     next tick was due already; it counts as late too;
//   - shift: released more than 250 ms (StallBound; or a period, if that is
//     longer) after its deadline: the program or the machine stood still, or
//     ticks have long taken longer than a period. All further deadlines are
//     moved by as much. The tick counts as an overrun too.
//
// Up to the bound of a shift, ticks that are due are released one after the
// other, at once, each counted, until the loop has caught up.
package pace

import (
	"context"
	"fmt"
	"math"
	"sync"
	"sync/atomic"
	"time"
)

const (
	// Tolerance is the part of the period by which a tick may be released
	// after its deadline without being late.
	Tolerance = 0.1

	// StallBound is how far behind its deadlines the loop may be and still
	// catch up by running the due ticks at once.
	StallBound = 250 * time.Millisecond

	// ShortestPeriod and LongestPeriod are the periods that can be set, s.
	ShortestPeriod, LongestPeriod = 1e-6, 10.0
)

// Pacer releases ticks. Everything but Report is for one goroutine alone, the
// one that runs the ticks:
//
//	p, err := pace.New(1.0 / 2048)
//	…
//	p.Lock()
//	defer p.Unlock() // after a panic too
//	for running {
//		p.Wait()
//		tick()
//	}
//
// Report may be called from any goroutine at any time and never delays a tick.
type Pacer struct {
	clock    Clock
	period   float64 // ns; a Duration would round 1/2048 s
	running  bool
	origin   time.Duration // t0
	k        int64         // ticks since t0
	deadline time.Duration // of the last tick
	late     time.Duration // the lateness above which a tick is late,
	overrun  time.Duration // an overrun,
	shift    time.Duration // or shifts the deadlines
	margin   margin
	tally    tally
	undo     []func() // what Unlock does, in reverse order

	shown   sync.Mutex // of granted; Wait never takes it
	granted grants
}

// New makes a Pacer that waits on the clock of this machine. The period is in
// seconds, from ShortestPeriod to LongestPeriod.
func New(period float64) (*Pacer, error) { return NewOn(period, newClock()) }

// NewOn makes a Pacer that waits on a clock of the caller's, for tests that
// must not depend on the speed of the machine.
func NewOn(period float64, clock Clock) (*Pacer, error) {
	p := &Pacer{clock: clock, margin: margin{deviation: 12.5e3}} // Linux rounds timers to 50 µs
	p.tally.init()
	if err := p.SetPeriod(period); err != nil {
		return nil, err
	}
	return p, nil
}

// SetPeriod changes the period, s, from the next tick on: it is due one new
// period after the deadline of the last.
func (p *Pacer) SetPeriod(period float64) error {
	if !(period >= ShortestPeriod && period <= LongestPeriod) {
		return fmt.Errorf("period: %g s is not between %g s and %g s", period, ShortestPeriod, LongestPeriod)
	}
	p.origin, p.k = p.deadline, 0
	p.period = period * 1e9
	p.overrun = time.Duration(math.Round(p.period))
	p.late = time.Duration(math.Round(Tolerance * p.period))
	p.shift = max(StallBound, p.overrun)
	p.margin.limit(p.overrun)
	p.tally.period.Store(math.Float64bits(period))
	return nil
}

// Pause forgets the deadlines. The next Wait resumes: it counts from the
// moment it is called, so that the pause makes no tick late. A Pacer begins
// paused.
func (p *Pacer) Pause() { p.running = false }

// Wait returns when the next tick is due, or at once if it was due already,
// and says how long after its deadline that is. The first tick, and the first
// after Pause, is due one period after the call.
//
// Wait sleeps until shortly before the deadline and spins over the rest; how
// shortly is learned from how late the sleep ends, see margin. It allocates
// nothing and takes no lock.
func (p *Pacer) Wait() (late time.Duration) {
	now := p.clock.Now()
	if !p.running {
		p.running, p.origin, p.k = true, now, 0
	}
	p.k++
	p.deadline = p.origin + time.Duration(math.Round(float64(p.k)*p.period))
	if wake := p.deadline - p.margin.length(); now < wake {
		p.clock.Sleep(wake)
		now = p.clock.Now()
		p.margin.learn(now - wake)
	}
	if now < p.deadline {
		p.clock.Spin(p.deadline)
		now = p.clock.Now()
	}
	late = now - p.deadline
	p.tally.count(late, late > p.late, late > p.overrun)
	if late > p.shift {
		p.tally.shift(late)
		p.origin += late
		p.deadline = now
	}
	return late
}

// Run releases so many ticks, or fewer if ctx ends.
func (p *Pacer) Run(ctx context.Context, ticks int64, tick func()) {
	done := ctx.Done()
	for range ticks {
		select {
		case <-done:
			return
		default:
		}
		p.Wait()
		tick()
	}
}

// tally is what Wait counts and Report reads. Each value has one writer, so
// that an atomic store of value + 1 loses nothing.
type tally struct {
	period                        atomic.Uint64 // s, as the bits of a float64
	ticks, late, overruns, shifts atomic.Int64
	shifted, worst                atomic.Int64 // ns
	lateness
}

func (t *tally) count(late time.Duration, isLate, isOverrun bool) {
	// Ticks first: a reader, who reads them last, never sees more late ticks
	// than ticks.
	t.ticks.Store(t.ticks.Load() + 1)
	t.record(late)
	if int64(late) > t.worst.Load() {
		t.worst.Store(int64(late))
	}
	if isLate {
		t.late.Store(t.late.Load() + 1)
	}
	if isOverrun {
		t.overruns.Store(t.overruns.Load() + 1)
	}
}

func (t *tally) shift(by time.Duration) {
	t.shifts.Store(t.shifts.Load() + 1)
	t.shifted.Store(t.shifted.Load() + int64(by))
}
