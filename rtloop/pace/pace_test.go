package pace

import (
	"context"
	"math"
	"strings"
	"testing"
	"time"
)

const ms = time.Millisecond

// TestNoDrift: a day of ticks at rates whose period is no whole number of
// nanoseconds. The n-th second ends with tick n·rate, to the nanosecond; added
// up, a rounded period would be off by 44 ms at the end of the day at 2048 Hz.
func TestNoDrift(t *testing.T) {
	for _, rate := range []int64{64, 600, 1024, 2048, 4096} {
		p, f := onFake(t, 1/float64(rate))
		p.Wait()
		// The ticks in between change nothing but k.
		for _, n := range []int64{1, 2, 59, 3600, 86400} {
			p.k = n*rate - 1
			p.Wait()
			if want := time.Hour + time.Duration(n)*time.Second; f.now != want {
				t.Errorf("%d Hz: second %d ends %v too late", rate, n, f.now-want)
			}
		}
	}
}

// TestEveryDeadline: tick k is released at t0 + k·T, rounded to a nanosecond.
func TestEveryDeadline(t *testing.T) {
	p, f := onFake(t, 1.0/4096) // T = 244140.625 ns = 1953125/8 ns
	for k := int64(1); k <= 100_000; k++ {
		if late := p.Wait(); late != 0 {
			t.Fatalf("tick %d is %v late", k, late)
		}
		if want := time.Hour + time.Duration((k*1953125+4)/8); f.now != want {
			t.Fatalf("tick %d comes at %v, want %v", k, f.now, want)
		}
		f.work(time.Duration(k*7919%200_000) * time.Nanosecond) // never as long as T
	}
	counts(t, p, 100_000, 0, 0, 0)
}

// TestBounds: what counts as what, up to the nanosecond on either side of each
// bound.
func TestBounds(t *testing.T) {
	for _, c := range []struct {
		name                   string
		period                 float64 // s
		behind                 time.Duration
		late, overruns, shifts int64
	}{
		{"on time", 1e-3, 0, 0, 0, 0},
		{"within tolerance", 1e-3, ms / 10, 0, 0, 0},
		{"late", 1e-3, ms/10 + 1, 1, 0, 0},
		{"a period", 1e-3, ms, 1, 0, 0},
		{"overrun", 1e-3, ms + 1, 1, 1, 0},
		{"at the bound", 1e-3, 250 * ms, 1, 1, 0},
		{"shift", 1e-3, 250*ms + 1, 1, 1, 1},
		{"slow, within tolerance", 2, 200 * ms, 0, 0, 0},
		{"slow, late but no shift", 2, 251 * ms, 1, 0, 0},
		{"slow, a period", 2, 2000 * ms, 1, 0, 0},
		{"slow, shift", 2, 2000*ms + 1, 1, 1, 1},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, f := onFake(t, c.period)
			p.Wait()
			period := time.Duration(c.period * 1e9)
			f.work(period + c.behind)
			if late := p.Wait(); late != c.behind {
				t.Errorf("%v late, want %v", late, c.behind)
			}
			counts(t, p, 2, c.late, c.overruns, c.shifts)
			if r := p.Report(); r.Max != c.behind || r.Shifted != time.Duration(c.shifts)*c.behind {
				t.Errorf("the worst is %v, shifted by %v", r.Max, r.Shifted)
			}
		})
	}
}

// TestCatchUp: after a tick that takes 4.5 periods the ticks that are due come
// at once, one after the other, each counted; then all goes on as if nothing
// had been: none is skipped and no deadline moved.
func TestCatchUp(t *testing.T) {
	p, f := onFake(t, 1e-3)
	t0 := f.now
	wait(t, p, f, t0+1*ms, 0)
	f.work(4*ms + ms/2)
	for _, late := range []time.Duration{3*ms + ms/2, 2*ms + ms/2, ms + ms/2, ms / 2} {
		wait(t, p, f, t0+5*ms+ms/2, late)
	}
	counts(t, p, 5, 4, 3, 0)
	for k := range time.Duration(100) {
		wait(t, p, f, t0+(6+k)*ms, 0)
	}
	counts(t, p, 105, 4, 3, 0)
}

// TestCatchUpWithWork: ticks that take 0.6 periods make up 0.4 periods each.
func TestCatchUpWithWork(t *testing.T) {
	p, f := onFake(t, 1e-3)
	p.Wait()
	f.work(3 * ms) // due: at 2, 3 and 4; the first two periods late
	for i, late := range []time.Duration{20, 16, 12, 8, 4, 0, 0} {
		if got := p.Wait(); got != late*ms/10 {
			t.Errorf("tick %d is %v late, want %v", i+2, got, late*ms/10)
		}
		f.work(6 * ms / 10)
	}
	counts(t, p, 8, 5, 3, 0)
}

// TestShift: when the machine stood still for 10 s, one tick is late by it,
// and the next comes a period after that one.
func TestShift(t *testing.T) {
	p, f := onFake(t, 1e-3)
	t0 := f.now
	wait(t, p, f, t0+ms, 0)
	f.work(10 * time.Second)
	t1 := t0 + ms + 10*time.Second
	wait(t, p, f, t1, 9999*ms)
	for k := range time.Duration(10) {
		wait(t, p, f, t1+(k+1)*ms, 0)
	}
	counts(t, p, 12, 1, 1, 1)
	if r := p.Report(); r.Shifted != 9999*ms || r.Max != 9999*ms {
		t.Errorf("shifted by %v, the worst is %v", r.Shifted, r.Max)
	}
}

// TestTooMuchWork: ticks that always take 1.5 periods fall behind by half a
// period each. From the first tick, or from a shift, the m-th tick is m/2 ms
// late: above a period from m = 3, above the bound of 250 ms at m = 501.
func TestTooMuchWork(t *testing.T) {
	p, f := onFake(t, 1e-3)
	const rounds = 5
	for range 1 + rounds*501 {
		p.Wait()
		f.work(ms + ms/2)
	}
	counts(t, p, 1+rounds*501, rounds*501, rounds*(501-2), rounds)
	if r := p.Report(); r.Max != 250*ms+ms/2 || r.Shifted != rounds*r.Max {
		t.Errorf("the worst is %v, shifted by %v", r.Max, r.Shifted)
	}
}

// TestSetPeriod: a new period counts from the deadline of the last tick.
func TestSetPeriod(t *testing.T) {
	p, f := onFake(t, 1e-3)
	t0 := f.now
	set := func(period float64) {
		t.Helper()
		if err := p.SetPeriod(period); err != nil {
			t.Fatal(err)
		}
	}
	set(2e-3) // before the first tick
	wait(t, p, f, t0+2*ms, 0)
	wait(t, p, f, t0+4*ms, 0)
	f.work(ms)
	set(4e-3) // slower, within a tick
	wait(t, p, f, t0+8*ms, 0)
	set(1e-3) // faster
	wait(t, p, f, t0+9*ms, 0)
	f.work(3*ms + ms/2)
	set(2e-3) // due at 11: behind, and caught up at the new rate
	wait(t, p, f, t0+12*ms+ms/2, ms+ms/2)
	wait(t, p, f, t0+13*ms, 0)
	counts(t, p, 6, 1, 0, 0)
	f.work(time.Second)
	wait(t, p, f, t0+1013*ms, 998*ms)
	set(1e-3) // a shift moved the deadline from which it counts
	wait(t, p, f, t0+1014*ms, 0)
	p.Pause()
	f.work(time.Second)
	set(5e-3) // while it pauses
	wait(t, p, f, t0+2019*ms, 0)
	if r := p.Report(); r.Period != 5e-3 {
		t.Errorf("the period is %g s", r.Period)
	}
}

func TestPeriodRefused(t *testing.T) {
	p, f := onFake(t, 1e-3)
	t0 := f.now
	p.Wait()
	for _, period := range []float64{0, -1e-3, 0.99e-6, 10.1, math.NaN(), math.Inf(1), math.Inf(-1)} {
		if _, err := New(period); err == nil || !strings.HasPrefix(err.Error(), "period: ") {
			t.Errorf("New(%g): %v", period, err)
		}
		if err := p.SetPeriod(period); err == nil {
			t.Errorf("SetPeriod(%g) is taken", period)
		}
	}
	wait(t, p, f, t0+2*ms, 0) // nothing has changed
}

// TestPause: what passes while it pauses makes no tick late.
func TestPause(t *testing.T) {
	p, f := onFake(t, 1e-3)
	f.work(time.Minute) // it begins paused
	wait(t, p, f, time.Hour+time.Minute+ms, 0)
	for range 3 {
		p.Pause()
		f.work(time.Minute)
		now := f.now
		wait(t, p, f, now+ms, 0)
		wait(t, p, f, now+2*ms, 0)
	}
	counts(t, p, 7, 0, 0, 0)
	if r := p.Report(); r.Max != 0 {
		t.Errorf("the worst is %v", r.Max)
	}
}

// TestRun: as many ticks as asked for, or as many as there are until ctx ends.
func TestRun(t *testing.T) {
	p, f := onFake(t, 1e-3)
	t0, n := f.now, 0
	p.Run(context.Background(), 500, func() { n++ })
	if n != 500 || f.now != t0+500*ms {
		t.Errorf("%d ticks in %v", n, f.now-t0)
	}
	ctx, cancel := context.WithCancel(context.Background())
	p.Run(ctx, 500, func() {
		if n++; n == 600 {
			cancel()
		}
	})
	counts(t, p, 600, 0, 0, 0)
	p.Run(ctx, 500, func() { t.Error("a tick after the end") })
}

// TestTickAllocatesNothing: on time, late, and shifting, with the clock of the
// tests and that of the machine.
func TestTickAllocatesNothing(t *testing.T) {
	p, f := onFake(t, 1e-3)
	k := 0
	if n := testing.AllocsPerRun(1000, func() {
		p.Wait()
		k++
		f.work([]time.Duration{ms / 2, 3 * ms, 400 * ms}[k%3])
	}); n != 0 {
		t.Errorf("%g allocations a tick", n)
	}
	if r := p.Report(); r.Overruns == 0 || r.Shifts == 0 {
		t.Errorf("%+v", r)
	}
	p, err := New(1e-6)
	if err != nil {
		t.Fatal(err)
	}
	if n := testing.AllocsPerRun(1000, func() { p.Wait() }); n != 0 {
		t.Errorf("%g allocations a tick", n)
	}
}

// TestMachineClock: neither a sleep nor a spin ends early, and a tick is never
// released before it is due.
func TestMachineClock(t *testing.T) {
	c := newClock()
	for _, d := range []time.Duration{-ms, 0, 1, 20 * time.Microsecond, 300 * time.Microsecond, 2 * ms} {
		until := c.Now() + d
		if c.Sleep(until); c.Now() < until {
			t.Errorf("a sleep of %v ends early", d)
		}
		until = c.Now() + d
		if c.Spin(until); c.Now() < until {
			t.Errorf("a spin of %v ends early", d)
		}
	}
	p, err := New(100e-6)
	if err != nil {
		t.Fatal(err)
	}
	start := time.Now()
	for range 100 {
		if late := p.Wait(); late < 0 {
			t.Errorf("released %v early", -late)
		}
	}
	if took := time.Since(start); took < 10*ms {
		t.Errorf("100 ticks of 100 µs took %v", took)
	}
}

func TestVerdict(t *testing.T) {
	for _, c := range []struct {
		r    Report
		want Verdict
	}{
		{Report{Period: 1e-3}, Fails},
		{Report{Period: 1e-3, Ticks: 1000, P999: ms / 10, Max: ms, Late: 1}, Holds},
		{Report{Period: 1e-3, Ticks: 1000, P999: ms/10 + 1, Max: ms, Late: 2}, HoldsLate},
		{Report{Period: 1e-3, Ticks: 1000000, P999: 1, Max: ms + 1, Late: 1, Overruns: 1}, Fails},
	} {
		if got := c.r.Verdict(); got != c.want {
			t.Errorf("%+v: %v, want %v", c.r, got, c.want)
		}
	}
}

func BenchmarkWaitBookkeeping(b *testing.B) {
	f := &fake{}
	p, err := NewOn(1e-3, f)
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		p.Wait()
	}
}
