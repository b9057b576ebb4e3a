package tui

import (
	"os"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/gdamore/tcell/v2"

	"antelag/scenarios"
)

// BenchmarkSoak is the dashboard as somebody leaves it running: one iteration
// is a simulated hour at 2048 Hz, as fast as it goes, with the screen drawn and
// a setting changed, and judged, twice a second all the while. It reports the
// memory in use after the first hour and after the last; with -benchtime 8x
// that is a working day.
func BenchmarkSoak(b *testing.B) {
	b.Chdir(b.TempDir())
	s := load(b, scenarios.Default, "loop.duration="+strconv.Itoa(3600*b.N)+" s")
	session, err := newSession(s, &fakeClock{})
	if err != nil {
		b.Fatal(err)
	}
	defer session.close()
	judged := load(b, scenarios.Default)
	sim := tcell.NewSimulationScreen("UTF-8")
	if err := sim.Init(); err != nil {
		b.Fatal(err)
	}
	defer sim.Fini()
	sim.SetSize(120, 40)
	a := newApp(session, sim)
	a.page = pageDashboard
	session.engine.start()
	session.setPaused(false)
	frame := time.NewTicker(time.Second / frames)
	defer frame.Stop()
	const hour = 3600 * 2048
	first, drawn := 0.0, 0
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
		if first == 0 && session.engine.tick.Load() >= hour/2 {
			first = resident()
		}
	}
	b.ReportMetric(first, "first-MiB")
	b.ReportMetric(resident(), "last-MiB")
	b.ReportMetric(float64(drawn), "frames")
	b.ReportMetric(float64(len(session.edits[0])), "edits")
}

// resident is the memory that the process has in use, MiB: as the system counts
// it, or else as Go does.
func resident() float64 {
	if text, err := os.ReadFile("/proc/self/statm"); err == nil {
		if fields := strings.Fields(string(text)); len(fields) > 1 {
			if pages, err := strconv.Atoi(fields[1]); err == nil {
				return float64(pages*os.Getpagesize()) / (1 << 20)
			}
		}
	}
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return float64(m.Sys) / (1 << 20)
}
