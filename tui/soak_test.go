package tui

import (
	"math"
	"os"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"antelag/scenarios"
)

// soakClock is a clock that never waits, but leaves the processor to the others
// for a moment now and then, as a real one does at every tick.
type soakClock struct {
	fakeClock
	sleeps int
}

func (c *soakClock) Sleep(until time.Duration) {
	if c.sleeps++; c.sleeps%256 == 0 {
		time.Sleep(500 * time.Microsecond)
	}
	c.fakeClock.Sleep(until)
}

// BenchmarkSoak is the dashboard as somebody leaves it running: one iteration
// is a simulated hour at 2048 Hz, as fast as it goes, with the screen drawn and
// a setting changed, and judged, twice a second all the while. It reports, half
// an hour from the start and at the end, the memory that is alive and the
// memory that the system counts; with -benchtime 8x that is a working day.
func BenchmarkSoak(b *testing.B) {
	b.Chdir(b.TempDir())
	judged := load(b, scenarios.Default)
	a := running(b, strconv.Itoa(3600*b.N)+" s", &soakClock{}, 120, 40)
	session := a.session
	frame := time.NewTicker(time.Second / frames)
	defer frame.Stop()
	const hour = 3600 * 2048
	var first [2]float64
	drawn := 0
	for session.engine.tick.Load() < int64(b.N)*hour {
		<-frame.C
		if drawn++; drawn%(frames/2) == 0 {
			session.nudge(drawn%frames == 0, false)
			session.judge.ask(delayQuestion(b, judged, drawn))
		}
		for len(session.judge.answers) > 0 {
			x := <-session.judge.answers
			session.judged(&x)
		}
		if session.hear() {
			a.draw()
		}
		if first[0] == 0 && session.engine.tick.Load() >= hour/2 {
			session.judge.cancel() // what it works on is not kept
			first = inUse()
		}
	}
	session.judge.cancel()
	last := inUse()
	b.ReportMetric(first[0], "alive-first-MiB")
	b.ReportMetric(last[0], "alive-last-MiB")
	b.ReportMetric(first[1], "system-first-MiB")
	b.ReportMetric(last[1], "system-last-MiB")
	b.ReportMetric(float64(drawn), "frames")
	b.ReportMetric(float64(len(session.edits[0])), "edits")
}

// inUse is what is alive on the heap, and what the process has in use as the
// system counts it (0 where it does not say), MiB.
func inUse() (v [2]float64) {
	v[0] = math.Inf(1)
	for range 10 { // the judge may still be letting go of what it worked on
		time.Sleep(500 * time.Millisecond)
		runtime.GC()
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		v[0] = min(v[0], float64(m.HeapAlloc)/(1<<20))
	}
	text, _ := os.ReadFile("/proc/self/statm")
	if fields := strings.Fields(string(text)); len(fields) > 1 {
		pages, _ := strconv.Atoi(fields[1])
		v[1] = float64(pages*os.Getpagesize()) / (1 << 20)
	}
	return v
}
