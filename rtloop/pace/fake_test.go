package pace

import (
	"testing"
	"time"
)

// fake is a clock that stands still but for what the test and the Pacer do.
type fake struct {
	now       time.Duration
	oversleep func(n int) time.Duration // how late the n-th sleep ends
	sleeps    int
	slept     time.Duration // until when the last sleep was meant to last
	spun      time.Duration // in all
}

func (f *fake) Now() time.Duration { return f.now }

func (f *fake) Sleep(until time.Duration) {
	f.slept = until
	f.now = max(f.now, until)
	if f.oversleep != nil {
		f.now += f.oversleep(f.sleeps)
	}
	f.sleeps++
}

func (f *fake) Spin(until time.Duration) {
	if until > f.now {
		f.spun += until - f.now
		f.now = until
	}
}

// work is what a tick takes.
func (f *fake) work(d time.Duration) { f.now += d }

func onFake(t *testing.T, period float64) (*Pacer, *fake) {
	t.Helper()
	f := &fake{now: time.Hour}
	p, err := NewOn(period, f)
	if err != nil {
		t.Fatal(err)
	}
	return p, f
}

// wait waits for a tick and checks when it was released and how late.
func wait(t *testing.T, p *Pacer, f *fake, at, late time.Duration) {
	t.Helper()
	if got := p.Wait(); got != late || f.now != at {
		t.Fatalf("released at %v, %v late; want %v, %v late", f.now, got, at, late)
	}
}

// counts checks what has been counted.
func counts(t *testing.T, p *Pacer, ticks, late, overruns, shifts int64) {
	t.Helper()
	r := p.Report()
	if r.Ticks != ticks || r.Late != late || r.Overruns != overruns || r.Shifts != shifts {
		t.Fatalf("%d ticks, %d late, %d overruns, %d shifts; want %d, %d, %d, %d",
			r.Ticks, r.Late, r.Overruns, r.Shifts, ticks, late, overruns, shifts)
	}
}
