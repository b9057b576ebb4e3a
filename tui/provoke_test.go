package tui

import (
	"context"
	"fmt"
	"os"
	"testing"

	"github.com/gdamore/tcell/v2"

	"antelag/rtloop"
	"antelag/scenarios"
)

// TestMain runs the tests, or, where ANTELAG_PROVOKE says "drawing" or "loop",
// the dashboard on the real terminal with a panic there a second after its
// start: the checks look whether the terminal then is as it was.
func TestMain(m *testing.M) {
	where := os.Getenv("ANTELAG_PROVOKE")
	if where == "" {
		os.Exit(m.Run())
	}
	fmt.Println(provoke(where))
	os.Exit(1)
}

func provoke(where string) error {
	s, err := scenarios.Load(scenarios.Default)
	if err != nil {
		return err
	}
	screen, err := tcell.NewScreen()
	if err != nil {
		return err
	}
	session, err := newSession(s, nil)
	if err != nil {
		return err
	}
	defer session.close()
	fragile := &fragile{Screen: screen}
	switch where {
	case "drawing":
		fragile.left = 20
	case "loop":
		session.engine.rig.Lanes[0].Observe = func(l *rtloop.Loop) error {
			if l.Ticks() == 2048 {
				panic("a slip of the loop")
			}
			return nil
		}
	default:
		return fmt.Errorf("there is no %q to break", where)
	}
	if err := fragile.Init(); err != nil {
		return err
	}
	a := newApp(session, fragile)
	a.page = pageDashboard
	session.setPaused(false)
	return a.loop(context.Background())
}

// fragile is a terminal that breaks at one of its frames.
type fragile struct {
	tcell.Screen
	left int // frames until then; 0 never
}

func (f *fragile) Show() {
	f.Screen.Show()
	if f.left--; f.left == 0 {
		panic("a slip of the pen")
	}
}
