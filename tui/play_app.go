package tui

import (
	"context"
	"fmt"
	"time"

	"github.com/gdamore/tcell/v2"

	"antelag/rtloop/runlog"
	"antelag/tui/canvas"
)

// Overview reads a whole log for Play, in the background: how long it is, and
// the moments where it was worst, which a key goes through.
type Overview func(ctx context.Context) (end float64, worst []Moment, err error)

// Moment is an instant of a log, s, and what about it.
type Moment struct {
	Time float64
	Text string
}

// Play plays a log through the dashboard's panels until it is quit or ctx ends.
// It leaves the terminal as Run does, and its errors are like those of Run.
func Play(ctx context.Context, path string, o PlayOptions, all Overview) error {
	screen, err := newScreen()
	if err != nil {
		return err
	}
	return play(ctx, path, o, all, screen)
}

// PlayOptions are how a log is read and played.
type PlayOptions struct {
	Log      runlog.Options
	Slowdown float64 // physical seconds that a second of the log took, > 0
	Speed    float64 // of the play, times the real one, > 0
}

func play(ctx context.Context, path string, o PlayOptions, all Overview, term terminal) error {
	p, err := newPlayer(path, o)
	if err != nil {
		return err
	}
	defer p.close()
	if err := setUp(term); err != nil {
		return err
	}
	a := &playApp{player: p, desk: newDesk(term)}
	return a.desk.sit(func(events <-chan tcell.Event) error { return a.loop(ctx, events, all) })
}

// playApp is the player at a terminal.
type playApp struct {
	player *player
	desk   desk
	help   bool
	quit   bool
	dirty  bool
	err    error
}

// read is what Overview came to.
type read struct {
	end   float64
	worst []Moment
	err   error
}

func (a *playApp) loop(ctx context.Context, events <-chan tcell.Event, all Overview) error {
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	whole := make(chan read, 1)
	if all != nil {
		go func() {
			end, worst, err := all(ctx)
			whole <- read{end, worst, err}
		}()
	}
	frame := time.NewTicker(time.Second / frames)
	defer frame.Stop()
	a.draw()
	was := time.Now()
	for !a.quit {
		select {
		case <-ctx.Done():
			return nil
		case ev, open := <-events:
			if !open {
				return nil
			}
			a.event(ev)
		case r := <-whole:
			a.read(r)
		case now := <-frame.C:
			changed, err := a.player.advance(now.Sub(was))
			was = now
			if err != nil {
				a.player.say(true, err.Error())
				a.player.ended = true
			}
			if changed || err != nil || a.dirty {
				a.draw()
			}
		}
		if a.err != nil {
			return a.err
		}
	}
	return nil
}

// read takes in what the whole log says.
func (a *playApp) read(r read) {
	a.dirty = true
	if r.err != nil {
		a.player.say(true, r.err.Error())
		return
	}
	a.player.overview = &overview{r.end, r.worst}
	for _, m := range r.worst {
		a.player.events = append(a.player.events, Event{Time: m.Time, Text: m.Text})
	}
}

func (a *playApp) event(ev tcell.Event) {
	a.dirty = true
	switch ev := ev.(type) {
	case *tcell.EventResize:
		a.desk.term.Sync()
	case *tcell.EventKey:
		a.key(ev)
	case *tcell.EventMouse:
		if hit, ok := a.desk.clicked(ev); ok {
			switch hit.Kind {
			case SelectChannel:
				a.err = a.player.look(hit.Index)
			case NextView:
				a.nextView()
			}
		}
	}
}

// playKeys are the keys in the order of their use.
var playKeys = []keyHelp{
	{"?", "help", "this page"},
	{"q", "quit", "quit; Ctrl-C too"},
	{"space", "pause", "pause and go on"},
	{"← →", "seek", "5 s back, on; Shift: 30 s"},
	{"w", "worst", "go to where it was worst; again: the next"},
	{"r", "", "from the start; Home too"},
	{"- +", "speed", "slower, faster; = real speed"},
	{".", "", "a single sample while paused"},
	{"c", "", "next channel"},
	{"v", "", "next view, on small screens"},
	{"p", "", "picture of the screen as text"},
}

// How far the arrows seek, s.
const (
	shortWay = 5
	longWay  = 30
)

func (a *playApp) key(ev *tcell.EventKey) {
	p := a.player
	p.message = ""
	if ev.Key() == tcell.KeyCtrlC {
		a.quit = true
		return
	}
	if a.help {
		a.help = false
		return
	}
	way := float64(shortWay)
	if ev.Modifiers()&tcell.ModShift != 0 {
		way = longWay
	}
	switch ev.Key() {
	case tcell.KeyLeft:
		a.err = p.seek(p.now() - way)
	case tcell.KeyRight:
		a.err = p.seek(p.now() + way)
	case tcell.KeyHome:
		a.err = p.seek(p.start())
	case tcell.KeyRune:
		a.rune(ev.Rune())
	}
}

func (a *playApp) rune(r rune) {
	p := a.player
	switch r {
	case 'q':
		a.quit = true
	case '?', 'h':
		a.help = true
	case ' ':
		p.paused = !p.paused
	case '.':
		if p.paused && !p.ended {
			p.goal++
		} else {
			p.message = "single samples are for a pause: press space first"
		}
	case 'r':
		a.err = p.seek(p.start())
	case 'w':
		a.err = p.nextWorst()
	case '+':
		p.setSpeed(2)
	case '-':
		p.setSpeed(0.5)
	case '=':
		p.setSpeed(0)
	case 'c':
		a.err = p.look(p.channel + 1)
	case 'v':
		a.nextView()
	case 's', 'p':
		p.message = screenshot(a.desk.grid)
	default:
		p.message = fmt.Sprintf("no key %q; ? shows the keys", r)
	}
}

func (a *playApp) nextView() {
	a.desk.board.View = (a.desk.board.View + 1) % playViews
}

func (a *playApp) draw() {
	a.dirty = false
	a.desk.draw(func(d *Dashboard, g *canvas.Grid) {
		if a.help {
			d.drawKeyHelp(g, playKeys, playMeanings)
			return
		}
		d.Draw(a.player.snapshot(), g)
	})
}
