package tui

import (
	"context"
	"time"

	"github.com/gdamore/tcell/v2"

	"antelag/rtloop/pace"
	"antelag/scenarios"
	"antelag/tui/canvas"
)

// page is what covers the screen.
type page int

const (
	pageWelcome page = iota
	pageDashboard
	pageHelp
)

// app is the dashboard on a terminal: it brings together keys, session and
// drawing, all in one goroutine.
type app struct {
	session *session
	desk

	page  page
	quit  bool
	dirty bool // something is to be drawn
}

// frames is how often the screen is drawn at most, a second.
const frames = 20

// Run shows the dashboard of a scenario on the terminal until it is quit or ctx
// ends. The terminal is left as it was found, whatever happens; a panic comes
// back as a *Panic. An error that is none means that there was no dashboard.
func Run(ctx context.Context, s *scenarios.Scenario) error {
	screen, err := newScreen()
	if err != nil {
		return err
	}
	return run(ctx, s, screen, nil)
}

// run is Run on any terminal and with any clock, nil for the machine's.
func run(ctx context.Context, s *scenarios.Scenario, term terminal, clock pace.Clock) error {
	session, err := newSession(s, clock)
	if err != nil {
		return err
	}
	defer session.close()
	if err := setUp(term); err != nil {
		return err
	}
	return newApp(session, term).loop(ctx)
}

func newApp(s *session, term terminal) *app {
	return &app{session: s, desk: newDesk(term)}
}

// loop is the dashboard's life, from the first frame on.
func (a *app) loop(ctx context.Context) error {
	return a.sit(func(events <-chan tcell.Event) error { return a.live(ctx, events) })
}

func (a *app) live(ctx context.Context, events <-chan tcell.Event) error {
	frame := time.NewTicker(time.Second / frames)
	defer frame.Stop()

	a.session.engine.start()
	a.session.askAll()
	a.session.log(false, "the loop stands at t = 0 and waits for a key")
	a.draw()
	for !a.quit {
		select {
		case <-ctx.Done():
			return nil
		case ev, open := <-events:
			if !open {
				return nil // the terminal is gone
			}
			a.event(ev)
		case x := <-a.session.judge.answers:
			a.session.judged(&x)
			a.dirty = true
		case r := <-a.session.copies:
			a.session.copied(r)
			a.dirty = true
		case p := <-a.session.judge.failed:
			return p
		case <-a.session.engine.done:
			if p := a.session.engine.failed; p != nil {
				return p
			}
			return nil
		case <-frame.C:
			if a.session.hear() || a.dirty {
				a.draw()
			}
		}
	}
	return nil
}

// event takes what the terminal says.
func (a *app) event(ev tcell.Event) {
	a.dirty = true
	switch ev := ev.(type) {
	case *tcell.EventResize:
		a.term.Sync()
	case *tcell.EventKey:
		a.session.hear()
		a.key(ev)
	case *tcell.EventMouse:
		a.session.hear()
		a.mouse(ev)
	}
}

// draw draws one frame.
func (a *app) draw() {
	a.dirty = false
	a.desk.draw(func(d *Dashboard, g *canvas.Grid) {
		switch a.page {
		case pageWelcome:
			d.DrawWelcome(a.session.snapshot(), g)
		case pageHelp:
			d.DrawHelp(g)
		default:
			d.Draw(a.session.snapshot(), g)
		}
	})
}
