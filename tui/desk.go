package tui

import (
	"fmt"
	"runtime/debug"

	"github.com/gdamore/tcell/v2"

	"antelag/tui/canvas"
)

// desk is a terminal that is drawn on: what the dashboard of a loop and that of
// a log have in common.
type desk struct {
	term    terminal
	board   *Dashboard
	grid    *canvas.Grid
	palette *palette
	pressed bool // the mouse button
}

func newDesk(term terminal) desk {
	return desk{term: term, board: NewDashboard(), grid: canvas.NewGrid(0, 0), palette: paletteFor(term.Colors())}
}

const noDesk = "this terminal cannot show the dashboard: %w"

// newScreen finds the terminal that the program runs on.
func newScreen() (tcell.Screen, error) {
	screen, err := tcell.NewScreen()
	if err != nil {
		return nil, fmt.Errorf(noDesk, err)
	}
	return screen, nil
}

// setUp makes a terminal ready to be drawn on; sit gives it back.
func setUp(term terminal) error {
	if err := term.Init(); err != nil {
		return fmt.Errorf(noDesk, err)
	}
	return nil
}

// sit gives body the events of a terminal that has been set up, and leaves the
// terminal as it was found however body ends. A panic comes back as a *Panic.
func (d *desk) sit(body func(events <-chan tcell.Event) error) (err error) {
	defer d.term.Fini()
	defer func() {
		if r := recover(); r != nil {
			err = &Panic{Where: "the dashboard", Value: r, Stack: debug.Stack()}
		}
	}()
	d.term.EnableMouse(tcell.MouseButtonEvents)
	d.term.HideCursor()
	events, quit := make(chan tcell.Event, 64), make(chan struct{})
	defer close(quit)
	go d.term.ChannelEvents(events, quit)
	return body(events)
}

// draw draws one frame, or how large the terminal must be.
func (d *desk) draw(frame func(*Dashboard, *canvas.Grid)) {
	w, h := d.term.Size()
	if gw, gh := d.grid.Size(); gw != w || gh != h {
		d.grid.Resize(w, h)
	}
	frame(d.board, d.grid)
	d.palette.paint(d.grid, d.term)
}

// clicked returns what a click of the mouse means; ok is false for anything that
// is not the beginning of one.
func (d *desk) clicked(ev *tcell.EventMouse) (Action, bool) {
	down := ev.Buttons()&tcell.Button1 != 0
	begins := down && !d.pressed
	d.pressed = down
	return d.board.Hit(ev.Position()), begins
}
