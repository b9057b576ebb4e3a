package tui

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/gdamore/tcell/v2"

	"antelag/rtloop"
	"antelag/scenarios"
)

// slowClock is a fake clock that gives the others time: it passes some hundred
// times as fast as it is waited on by a real loop would, or as slowly as the
// machine will have it.
type slowClock struct{ fakeClock }

func (c *slowClock) Sleep(until time.Duration) {
	time.Sleep(100 * time.Microsecond)
	c.fakeClock.Sleep(until)
}

// screen is a simulated terminal whose last frame can be read while it runs.
type screen struct {
	tcell.SimulationScreen
	lock   sync.Mutex
	text   string
	frames int
	ended  int // times Fini was called
	breaks bool
}

func (s *screen) Show() {
	s.SimulationScreen.Show()
	cells, w, h := s.GetContents()
	var b strings.Builder
	for y := range h {
		for x := range w {
			if r := cells[y*w+x].Runes; len(r) > 0 {
				b.WriteRune(r[0])
			}
		}
		b.WriteByte('\n')
	}
	s.lock.Lock()
	defer s.lock.Unlock()
	s.text = b.String()
	s.frames++
}

func (s *screen) SetContent(x, y int, r rune, c []rune, style tcell.Style) {
	s.lock.Lock()
	breaks := s.breaks
	s.lock.Unlock()
	if breaks {
		panic("a slip of the pen")
	}
	s.SimulationScreen.SetContent(x, y, r, c, style)
}

func (s *screen) Fini() {
	s.lock.Lock()
	s.ended++
	s.lock.Unlock()
	s.SimulationScreen.Fini()
}

// rigged is the whole application on a simulated terminal.
type rigged struct {
	*testing.T
	screen *screen
	done   chan error
	cancel context.CancelFunc
}

func launch(t *testing.T, s *scenarios.Scenario, prepare ...func(*session)) *rigged {
	t.Helper()
	t.Chdir(t.TempDir())
	session, err := newSession(s, &slowClock{})
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range prepare {
		f(session)
	}
	sim := &screen{SimulationScreen: tcell.NewSimulationScreen("UTF-8")}
	if err := sim.Init(); err != nil {
		t.Fatal(err)
	}
	sim.SetSize(160, 48)
	ctx, cancel := context.WithCancel(context.Background())
	r := &rigged{t, sim, make(chan error, 1), cancel}
	go func() {
		defer session.close()
		r.done <- newApp(session, sim).loop(ctx)
	}()
	t.Cleanup(cancel)
	return r
}

func (r *rigged) keys(keys ...any) {
	for _, k := range keys {
		switch k := k.(type) {
		case string:
			for _, c := range k {
				r.screen.InjectKey(tcell.KeyRune, c, tcell.ModNone)
			}
		case tcell.Key:
			r.screen.InjectKey(k, 0, tcell.ModNone)
		}
	}
}

func (r *rigged) text() string {
	r.screen.lock.Lock()
	defer r.screen.lock.Unlock()
	return r.screen.text
}

// shows waits until the screen shows all of the texts.
func (r *rigged) shows(texts ...string) {
	r.Helper()
	for end := time.Now().Add(time.Minute); ; time.Sleep(5 * time.Millisecond) {
		screen, missing := r.text(), ""
		for _, t := range texts {
			if !strings.Contains(screen, t) {
				missing = t
			}
		}
		if missing == "" {
			return
		}
		select {
		case err := <-r.done:
			r.Fatalf("ended, %v, and never showed %q:\n%s", err, missing, screen)
		default:
		}
		if time.Now().After(end) {
			r.Fatalf("waited a minute for %q on\n%s", missing, screen)
		}
	}
}

// hides waits until the screen no longer shows a text.
func (r *rigged) hides(text string) {
	r.Helper()
	until(r.T, "the end of "+text, func() bool { return !strings.Contains(r.text(), text) })
}

func (r *rigged) ends() error {
	r.Helper()
	select {
	case err := <-r.done:
		if r.screen.ended != 1 {
			r.Errorf("the terminal was given back %d times", r.screen.ended)
		}
		return err
	case <-time.After(time.Minute):
		r.Fatal("it does not end")
		return nil
	}
}

func (r *rigged) quits() {
	r.Helper()
	r.keys("q")
	if err := r.ends(); err != nil {
		r.Error(err)
	}
}

func live(t *testing.T) *scenarios.Scenario {
	return load(t, "archive", "loop.duration=60 s", "loop.rate=256 Hz")
}

func TestFirstScreenHoldsTheCautionsAndAKeyStarts(t *testing.T) {
	r := launch(t, live(t))
	r.shows("simulation", "no interlock", "crush", "engineer")
	r.keys(" ")
	r.shows("RUNNING", "configured", "polynomial", "PASS")
	r.quits()
}

func TestEditChangesVerdictAndCurve(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ")
	r.shows("PASS")
	r.keys(tcell.KeyUp)
	r.shows("▸ order")
	r.keys(tcell.KeyDown)
	r.shows("▸ delay", "against delay", "best")
	r.keys(tcell.KeyEnter, tcell.KeyCtrlU, "30 ms", tcell.KeyEnter)
	r.shows("delay 14 ms → 30 ms", "FAIL", " → ")
	r.keys("u")
	r.shows("undone: configured: delay 14 ms → 30 ms", "PASS")
	r.keys(tcell.KeyRight)
	r.shows("14 ms → 14.5 ms")
	r.keys("f")
	r.shows("curve: delay against delay")
	r.quits()
}

func TestWrongInputIsRefusedInPlace(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ", tcell.KeyEnter, tcell.KeyCtrlU, "12", tcell.KeyEnter)
	r.shows(`"12" has no unit`, "12▏")
	r.keys(" ms", tcell.KeyEnter)
	r.shows("delay 14 ms → 12 ms")
	r.hides("refused")
	r.keys(tcell.KeyEnter, tcell.KeyCtrlU, "9 s", tcell.KeyEnter)
	r.shows("9 s is above 500 ms")
	r.keys(tcell.KeyEscape)
	r.hides("refused")
	r.shows("delay  12 ms")
	r.quits()
}

func TestKindIsSwitchedAndUndone(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ", tcell.KeyHome, tcell.KeyEnter, tcell.KeyCtrlU, "invers", tcell.KeyEnter)
	r.shows(`did you mean "inverse"`)
	r.keys("e", tcell.KeyEnter)
	r.shows("configured: polynomial → inverse", "kind   inverse", "delay  14 ms")
	r.keys("u")
	r.shows("undone", "kind   polynomial", "order  3")
	r.keys(tcell.KeyLeft) // the kind before: none
	r.shows("▸ kind  none")
	r.keys(tcell.KeyRight)
	r.shows("kind   polynomial")
	r.quits()
}

func TestLaneIsCopiedWhileItRuns(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ", "k")
	r.shows("lane 3/3 configured-2", "lane configured-2 is a copy of configured")
	r.keys("k")
	r.shows("lane 4/4 configured-3")
	r.keys(tcell.KeyTab)
	r.shows("lane 1/4 configured")
	r.quits()
}

func TestPauseTickSpeedRestartHelp(t *testing.T) {
	r := launch(t, live(t))
	r.keys("x") // any key starts
	r.shows("RUNNING")
	r.keys(".")
	r.shows("press space first")
	r.keys(" ")
	r.shows("PAUSED")
	r.keys("r")
	r.shows("0.000 s of 60 s", "restarted")
	r.keys("..")
	r.shows("0.008 s of 60 s")
	r.keys("+")
	r.shows("2 times as fast as real")
	r.keys("-", "-")
	r.shows("slowed 2 times")
	r.keys("=")
	r.shows("real speed")
	r.keys("?")
	r.shows("any key goes back", "undo")
	r.keys("x")
	r.shows("PAUSED")
	r.keys("#")
	r.shows("no key")
	r.quits()
}

func TestWriteNeverOverwritesUnasked(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ", tcell.KeyRight, "w")
	r.shows("write lane configured", "archive-tuned.toml")
	r.keys(tcell.KeyEnter)
	r.shows("lane configured written to archive-tuned.toml   ") // on the bottom line: all is done
	s, err := scenarios.Load("archive-tuned.toml")
	if err != nil {
		t.Fatal(err)
	}
	if got := s.Channels[0].Compensator.Values.Num("delay"); got != 0.0145 || len(s.Lanes) != 0 {
		t.Errorf("delay %g with %d lanes, want 0.0145 s alone", got, len(s.Lanes))
	}
	const precious = "not to be lost"
	if err := os.WriteFile("archive-tuned.toml", []byte(precious), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, no := range [][]any{{tcell.KeyEscape}, {"y", tcell.KeyEnter}} {
		r.keys("w", tcell.KeyEnter)
		r.shows("exists; overwrite it?")
		r.keys(no...)
		r.shows("nothing written")
		if text, err := os.ReadFile("archive-tuned.toml"); err != nil || string(text) != precious {
			t.Fatalf("the file holds %q, %v", text, err)
		}
	}
	r.keys("w", tcell.KeyEnter)
	r.shows("exists; overwrite it?")
	r.keys("yes", tcell.KeyEnter)
	until(t, "the file", func() bool { _, err := scenarios.Load("archive-tuned.toml"); return err == nil })
	r.keys("w", tcell.KeyCtrlU, filepath.Join("no", "such", "place.toml"), tcell.KeyEnter)
	r.shows("not written:")
	r.quits()
}

func TestScreenshotsAreNumbered(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ")
	r.shows("RUNNING")
	r.keys("s")
	r.shows("screen written to antelag-screen-1.txt")
	r.keys("s")
	r.shows("screen written to antelag-screen-2.txt")
	text, err := os.ReadFile("antelag-screen-1.txt")
	if err != nil || !strings.Contains(string(text), "RUNNING") {
		t.Errorf("%q, %v", text, err)
	}
	r.quits()
}

func TestResizingAndTooSmall(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ")
	r.shows("RUNNING")
	resize := func(w, h int) {
		r.screen.SetSize(w, h)
		if err := r.screen.PostEvent(tcell.NewEventResize(w, h)); err != nil {
			t.Fatal(err)
		}
	}
	resize(79, 24)
	r.shows("80")
	r.hides("RUNNING")
	resize(80, 24)
	r.shows("RUNNING", "view 1/3")
	r.keys("v")
	r.shows("view 2/3")
	resize(200, 60)
	r.shows("RUNNING", "events")
	r.quits()
}

func TestMouseSelects(t *testing.T) {
	r := launch(t, live(t))
	r.keys(" ")
	r.shows("RUNNING")
	r.keys(" ") // so that the ranks stay as they are
	r.shows("PAUSED", ". inverse ")
	lines := strings.Split(r.text(), "\n")
	for row, line := range lines {
		if at := strings.Index(line, ". inverse "); at >= 0 {
			column := len([]rune(line[:at])) + 3
			r.screen.InjectMouse(column, row, tcell.Button1, tcell.ModNone)
			r.screen.InjectMouse(column, row, tcell.ButtonNone, tcell.ModNone)
			break
		}
	}
	r.shows("lane 2/2 inverse")
	r.screen.InjectMouse(1, 1, tcell.WheelUp, tcell.ModNone)
	r.shows("▸ kind")
	r.quits()
}

func TestCtrlCAndSignalsEnd(t *testing.T) {
	r := launch(t, live(t))
	r.keys(tcell.KeyCtrlC)
	if err := r.ends(); err != nil {
		t.Error(err)
	}
	r = launch(t, live(t))
	r.shows("simulation")
	r.cancel()
	if err := r.ends(); err != nil {
		t.Error(err)
	}
}

func TestPanicInDrawingGivesTheTerminalBack(t *testing.T) {
	r := launch(t, live(t))
	r.shows("simulation")
	r.screen.lock.Lock()
	r.screen.breaks = true
	r.screen.lock.Unlock()
	r.keys(" ")
	var p *Panic
	if err := r.ends(); !errors.As(err, &p) || p.Value != "a slip of the pen" || len(p.Stack) == 0 {
		t.Errorf("got %v", err)
	}
}

func TestPanicInTheLoopGivesTheTerminalBack(t *testing.T) {
	r := launch(t, live(t), func(s *session) {
		s.engine.rig.Lanes[0].Observe = func(l *rtloop.Loop) error {
			if l.Ticks() == 50 {
				panic("a slip of the loop")
			}
			return nil
		}
	})
	r.keys(" ")
	var p *Panic
	if err := r.ends(); !errors.As(err, &p) || p.Value != "a slip of the loop" || !strings.Contains(p.Error(), "the loop") {
		t.Errorf("got %v", err)
	}
}

// A run that trips says so, ends, and can be put right.
func TestTripIsShown(t *testing.T) {
	r := launch(t, load(t, "archive", "loop.duration=60 s", "loop.rate=256 Hz", "damper.compensator.delay=0 ms", "damper.limits.error=1 mm"))
	r.keys(" ")
	r.shows("TRIPPED", "error")
	r.quits()
}

// Nothing is drawn while nothing happens.
func TestStillScreenIsNotRedrawn(t *testing.T) {
	r := launch(t, live(t))
	r.shows("simulation")
	count := func() int {
		r.screen.lock.Lock()
		defer r.screen.lock.Unlock()
		return r.screen.frames
	}
	// The verdict and the curve come in first; then frames must stop coming.
	until(t, "rest", func() bool {
		n := count()
		time.Sleep(200 * time.Millisecond)
		return count() == n
	})
	r.quits()
}
