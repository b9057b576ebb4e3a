//go:build !linux

package pace

import "time"

type machineClock struct{ monotonic }

func newClock() Clock { return &machineClock{monotonic{time.Now()}} }

func (c *machineClock) Sleep(until time.Duration) { time.Sleep(until - c.Now()) }
