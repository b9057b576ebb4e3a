package pace

import (
	"math/rand/v2"
	"testing"
	"time"
)

const us = time.Microsecond

// TestMargin: sleeps are meant to end by about as much before the deadline as
// they end late, so that the rest that is spun over is short, and hardly a
// tick is late for its sleep's sake.
func TestMargin(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for _, c := range []struct {
		name        string
		period      float64
		oversleep   func(int) time.Duration
		least, most time.Duration // that the margin settles between
	}{
		// No deviation: the margin is the lateness itself, or 5 µs.
		{"a timer on time", 1e-3, func(int) time.Duration { return 0 }, 5 * us, 5 * us},
		{"a timer that is always as late", 1e-3, func(int) time.Duration { return 60 * us }, 60*us - 1, 60*us + 1},
		// Uniform from 0 to 60 µs: mean 30 µs and mean deviation 15 µs, so 90 µs,
		// give or take the ripple of the two running means: 2 µs, and 4 × 2 µs.
		{"a timer late at random", 1e-3, func(int) time.Duration { return time.Duration(random.Int64N(60e3)) }, 75 * us, 105 * us},
		// Beyond the bounds.
		{"a timer that is too late", 1e-3, func(int) time.Duration { return 3 * ms }, 200 * us, 200 * us},
		{"a timer that is too late for a short period", 1e-4, func(int) time.Duration { return 3 * ms }, 25 * us, 25 * us},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, f := onFake(t, c.period)
			f.oversleep = c.oversleep
			for range 2000 {
				before := f.sleeps
				p.Wait()
				if m := p.deadline - f.slept; f.sleeps > before && m > time.Duration(c.period*1e9)/4 {
					t.Fatalf("spins over %v", m)
				}
			}
			if m := p.margin.length(); m < c.least || m > c.most {
				t.Errorf("the margin is %v, want %v to %v", m, c.least, c.most)
			}
		})
	}
}

// TestMarginKeepsCool: one long hold-up in 1000 does not widen the margin for
// long; what is spun over is little more than without.
func TestMarginKeepsCool(t *testing.T) {
	spun := func(holdup time.Duration) time.Duration {
		p, f := onFake(t, 1e-3)
		f.oversleep = func(n int) time.Duration {
			if n%1000 == 999 {
				return holdup
			}
			return 10 * us
		}
		for range 10_000 {
			p.Wait()
		}
		return f.spun
	}
	calm, hectic := spun(10*us), spun(50*ms)
	// Held up, the deviation rises by 400 µs/16 = 25 µs and the margin by
	// 100 µs; that decays with 1/16 a tick, in all 16 × 100 µs, and the mean's
	// 6 µs with 1/64, for each of the ten. Twice that, as mean and deviation
	// feed each other.
	if more := hectic - calm; more > 10*2*(16*100*us+64*6*us) {
		t.Errorf("spins %v instead of %v", hectic, calm)
	}
}

// TestSpinsLittle: on a common timer, 60 µs late, the processor is kept for 1
// part in 20 of the time at most, and no tick is late for it once the margin
// has been learned.
func TestSpinsLittle(t *testing.T) {
	p, f := onFake(t, 1.0/1024)
	random := rand.New(rand.NewPCG(3, 4))
	f.oversleep = func(int) time.Duration { return 55*us + time.Duration(random.Int64N(10e3)) }
	for range 1024 { // learning
		p.Wait()
	}
	before := p.Report()
	f.spun = 0
	for range 10 * 1024 {
		if late := p.Wait(); late != 0 {
			t.Fatalf("%v late", late)
		}
	}
	counts(t, p, 11*1024, before.Late, 0, 0)
	if f.spun > 10*time.Second/20 {
		t.Errorf("spins %v of 10 s", f.spun)
	}
}
