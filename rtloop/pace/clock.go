package pace

import "time"

// Clock is what a Pacer waits on. Times are counted from any fixed moment.
type Clock interface {
	Now() time.Duration
	Sleep(until time.Duration) // gives the processor away; may end late, not early
	Spin(until time.Duration)  // keeps the processor; ends on time
}

// monotonic is Go's monotonic clock: no setting of the date moves it.
type monotonic struct{ start time.Time }

func (m *monotonic) Now() time.Duration { return time.Since(m.start) }

func (m *monotonic) Spin(until time.Duration) {
	for time.Since(m.start) < until {
	}
}
