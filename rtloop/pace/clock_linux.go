package pace

import (
	"runtime"
	"time"

	"golang.org/x/sys/unix"
)

// machineClock sleeps in the kernel, until an absolute time of
// CLOCK_MONOTONIC, the clock behind Go's: a thread that is held up on its way
// to sleep does not wake later for it, and Go's own timers are coarser. That
// clock stands still while the machine is suspended, so that a suspension
// delays no tick.
type machineClock struct {
	monotonic
	zero    int64         // CLOCK_MONOTONIC when Now is 0, ns
	yielded time.Duration // when Go last had the goroutine
}

func newClock() Clock {
	c := &machineClock{monotonic: monotonic{time.Now()}}
	closest := time.Duration(1 << 62)
	for range 16 { // both clocks, read one right after the other
		var t unix.Timespec
		before := c.Now()
		if err := unix.ClockGettime(unix.CLOCK_MONOTONIC, &t); err != nil {
			continue // Sleep then returns at once, and Spin does it all
		}
		if took := c.Now() - before; took < closest {
			closest = took
			c.zero = t.Nano() - int64(before+took/2)
		}
	}
	return c
}

// Go takes a goroutine off its thread that has kept it for 10 ms, whatever it
// does just then, and needs some 50 µs to put it on again. Sleep lets that
// happen before it comes to that, and where there is time for it.
const (
	turn    = 9 * time.Millisecond
	turning = 100 * time.Microsecond
)

func (c *machineClock) Sleep(until time.Duration) {
	if now := c.Now(); now-c.yielded > turn && until-now > turning {
		c.yielded = now
		runtime.Gosched()
	}
	t := unix.NsecToTimespec(c.zero + int64(until))
	for c.Now() < until { // signals wake it early
		_ = unix.ClockNanosleep(unix.CLOCK_MONOTONIC, unix.TIMER_ABSTIME, &t, nil)
	}
}
