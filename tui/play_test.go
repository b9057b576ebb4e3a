package tui

import (
	"bytes"
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/gdamore/tcell/v2"
)

// recorded writes an invented log of two channels at 256 Hz: each follows a
// 1 Hz target of 20 mm late by 8 and 16 ms.
func recorded(t *testing.T, seconds float64) string {
	t.Helper()
	var b bytes.Buffer
	b.WriteString("time_s,ground_m_s2,near.target_m,near.command_m,near.measured_m,near.force_N,far.target_m,far.command_m,far.measured_m,far.force_N,energy_margin\n")
	x := func(t float64) float64 { return 0.020 * math.Sin(2*math.Pi*t) }
	for k := range int(seconds * 256) {
		t := float64(k) / 256
		fmt.Fprintf(&b, "%g,0,%g,%g,%g,0,%g,%g,%g,0,%g\n", t, x(t), x(t), x(t-0.008), x(t), x(t), x(t-0.016), 0.8)
	}
	path := filepath.Join(t.TempDir(), "test.csv")
	if err := os.WriteFile(path, b.Bytes(), 0o666); err != nil {
		t.Fatal(err)
	}
	return path
}

func played(t *testing.T, path string) *player {
	t.Helper()
	p, err := newPlayer(path, PlayOptions{Slowdown: 1, Speed: 1})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(p.close)
	return p
}

// goOn lets so many seconds pass, frame by frame.
func goOn(t *testing.T, p *player, seconds float64) {
	t.Helper()
	for range int(math.Round(seconds * frames)) {
		for {
			if _, err := p.advance(time.Second / frames); err != nil {
				t.Fatal(err)
			}
			if !p.seeking() {
				break
			}
		}
	}
}

// A sine that is late by 8 ms has an ellipse that is late by 8 ms.
func TestPlayShowsTheDelay(t *testing.T) {
	p := played(t, recorded(t, 20))
	goOn(t, p, 5)
	s := p.snapshot()
	if got := s.Clock.Time; math.Abs(got-5) > 0.1 {
		t.Errorf("after 5 s it stands at %g s", got)
	}
	if got := s.Subspace.Delay; math.Abs(got-0.008) > 1e-6 {
		t.Errorf("late by %g s, want 0.008 s", got)
	}
	if err := p.look(1); err != nil {
		t.Fatal(err)
	}
	goOn(t, p, 0.1)
	s = p.snapshot()
	if got := s.Subspace.Delay; math.Abs(got-0.016) > 1e-6 || math.Abs(s.Clock.Time-5) > 0.3 {
		t.Errorf("the other channel is late by %g s at %g s, want 0.016 s at about 5 s", got, s.Clock.Time)
	}
	if s.Energy.Margin != 0.8 || len(s.Record.Delay) == 0 {
		t.Errorf("margin %g and %d delays", s.Energy.Margin, len(s.Record.Delay))
	}
}

// What is on the screen at an instant does not depend on how it was reached.
func TestSeekShowsWhatPlayingShows(t *testing.T) {
	path := recorded(t, 40)
	there := func(seek ...float64) *Snapshot {
		p := played(t, path)
		for _, to := range seek {
			if err := p.seek(to); err != nil {
				t.Fatal(err)
			}
			p.paused = true
			goOn(t, p, 1)
		}
		return p.snapshot()
	}
	want := there(30)
	for _, seek := range [][]float64{{35, 30}, {2, 30}, {31, 29.5, 30}, {1e9, 30}, {30, -5, 30}} {
		got := there(seek...)
		if got.Clock.Time != want.Clock.Time || got.Clock.Ended {
			t.Errorf("seeking %v: at %g s, ended %v; want %g s", seek, got.Clock.Time, got.Clock.Ended, want.Clock.Time)
		}
		if got.Subspace.Ellipse != want.Subspace.Ellipse || last(got.Trace.Target) != last(want.Trace.Target) {
			t.Errorf("seeking %v: another ellipse or target", seek)
		}
	}
}

func TestPlayEnds(t *testing.T) {
	p := played(t, recorded(t, 3))
	goOn(t, p, 4)
	s := p.snapshot()
	if !s.Clock.Ended || math.Abs(s.Clock.Time-(3-1.0/256)) > 1e-9 {
		t.Errorf("ended %v at %g s", s.Clock.Ended, s.Clock.Time)
	}
	if err := p.seek(1); err != nil {
		t.Fatal(err)
	}
	goOn(t, p, 0.5)
	if s := p.snapshot(); s.Clock.Ended || math.Abs(s.Clock.Time-1.5) > 0.1 {
		t.Errorf("after seeking back it stands at %g s, ended %v", s.Clock.Time, s.Clock.Ended)
	}
}

// The whole on a simulated terminal: keys, views, the worst moments, quit.
func TestPlayOnATerminal(t *testing.T) {
	t.Chdir(t.TempDir())
	sim := &screen{SimulationScreen: tcell.NewSimulationScreen("UTF-8")}
	path := recorded(t, 20)
	done := make(chan error, 1)
	go func() {
		done <- play(context.Background(), path, PlayOptions{Slowdown: 1, Speed: 1}, func(context.Context) (float64, []Moment, error) {
			return 19.996, []Moment{{12.5, "late by 16 ms"}}, nil
		}, sim)
	}()
	r := &rigged{T: t, screen: sim, done: done, cancel: func() {}}
	r.shows("PLAYING", "of 19.996 s", "RECORD of a test")
	r.keys(" ")
	r.shows("PAUSED")
	r.keys("w")
	r.shows("12.500 s", "late by 16 ms", "late by 8.000 ms")
	r.keys("c")
	r.shows("channel 2/2 far", "late by 16.000 ms")
	r.keys("v")
	r.shows("events", "energy margin")
	r.keys("?")
	r.shows("where it was worst")
	r.keys(" ")
	r.shows("PAUSED")
	r.keys("p")
	r.shows("screen written")
	r.quits()
	if text, err := os.ReadFile("antelag-screen-1.txt"); err != nil || !strings.Contains(string(text), "PAUSED") {
		t.Errorf("the screenshot: %v", err)
	}
	if sim.ended != 1 {
		t.Errorf("the terminal was given back %d times", sim.ended)
	}
}

// Every key that the help names is a key.
func TestHelpNamesRealKeys(t *testing.T) {
	const none = "no key"
	single := func(keys []keyHelp, press func(r rune) (message string)) {
		for _, k := range keys {
			for _, name := range strings.Fields(k.key) {
				r := []rune(name)
				if len(r) != 1 || r[0] > '~' {
					continue // named, like Enter, or an arrow
				}
				if m := press(r[0]); strings.HasPrefix(m, none) {
					t.Errorf("%s, %s: %s", name, k.long, m)
				}
			}
		}
	}
	sim := tcell.NewSimulationScreen("UTF-8")
	if err := sim.Init(); err != nil {
		t.Fatal(err)
	}
	defer sim.Fini()
	t.Chdir(t.TempDir())
	a := newApp(liveSession(t), sim)
	single(keys, func(r rune) string {
		a.session.message, a.session.prompt = "", nil
		a.rune(r)
		return a.session.message
	})
	if a.rune('%'); !strings.HasPrefix(a.session.message, none) {
		t.Error("% is a key")
	}
	p := &playApp{player: played(t, recorded(t, 3)), desk: newDesk(sim)}
	single(playKeys, func(r rune) string {
		p.player.message = ""
		p.rune(r)
		return p.player.message
	})
}
