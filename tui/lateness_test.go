package tui

import (
	"testing"
	"time"

	"github.com/gdamore/tcell/v2"

	"antelag/rtloop/pace"
	"antelag/scenarios"
)

// How late ticks are released with the screen off, with it redrawn twenty times
// a second, and with verdicts and curves computed all the while besides:
//
//	go test -run ^$ -bench Lateness -benchtime 20000x ./tui
func BenchmarkLateness(b *testing.B) {
	for _, c := range []struct {
		name         string
		draws, edits bool
	}{{"off", false, false}, {"drawing", true, false}, {"judging", true, true}} {
		b.Run(c.name, func(b *testing.B) { lateness(b, c.draws, c.edits) })
	}
}

// running is a dashboard of the default scenario on a simulated screen, its loop
// going on for so long.
func running(b *testing.B, duration string, clock pace.Clock, w, h int) *app {
	session, err := newSession(load(b, scenarios.Default, "loop.duration="+duration), clock)
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(session.close)
	sim := tcell.NewSimulationScreen("UTF-8")
	if err := sim.Init(); err != nil {
		b.Fatal(err)
	}
	b.Cleanup(sim.Fini)
	sim.SetSize(w, h)
	a := newApp(session, sim)
	a.page = pageDashboard
	session.engine.start()
	session.setPaused(false)
	return a
}

func lateness(b *testing.B, draws, edits bool) {
	judged := load(b, scenarios.Default)
	a := running(b, "86400 s", nil, 200, 60)
	session := a.session
	session.judge.cancel()
	frame := time.NewTicker(time.Second / frames)
	defer frame.Stop()
	number := 0
	for session.engine.tick.Load() < int64(b.N) {
		<-frame.C
		if edits && number%frames == 0 {
			q := delayQuestion(b, judged, number)
			session.judge.ask(q)
		}
		number++
		if !draws {
			continue
		}
		for len(session.judge.answers) > 0 {
			<-session.judge.answers
		}
		if session.hear() {
			a.draw()
		}
	}
	report(b, session.engine.pacer.Report())
}

func report(b *testing.B, r pace.Report) {
	micro := func(d time.Duration) float64 { return float64(d) / 1e3 }
	b.ReportMetric(micro(r.P50), "p50-µs")
	b.ReportMetric(micro(r.P99), "p99-µs")
	b.ReportMetric(micro(r.P999), "p99.9-µs")
	b.ReportMetric(micro(r.Max), "max-µs")
	b.ReportMetric(float64(r.Late), "late")
	b.ReportMetric(float64(r.Overruns), "overruns")
}

// How long a verdict takes, and a verdict with its curve, on the default
// scenario:
//
//	go test -run ^$ -bench Judge ./tui
func BenchmarkJudge(b *testing.B) {
	s := load(b, scenarios.Default)
	for _, curve := range []bool{false, true} {
		name := map[bool]string{false: "verdict", true: "verdict-and-curve"}[curve]
		b.Run(name, func(b *testing.B) {
			j := newJudge()
			defer j.close()
			for i := range b.N {
				q := delayQuestion(b, s, i)
				if !curve {
					q.vary = nil
				}
				j.ask(q)
				for a := range j.answers {
					if a.err != nil {
						b.Fatal(a.err)
					}
					if a.number == i && (a.done || !curve) {
						break
					}
				}
			}
			b.ReportMetric(float64(b.Elapsed().Milliseconds())/float64(b.N), "ms")
		})
	}
}
