package tui

import (
	"antelag/tui/canvas"
)

// drawEvents lists what happened, the newest at the bottom; what is bad starts
// with an exclamation mark.
func (d *Dashboard) drawEvents(s *Snapshot, b box) {
	in := b.frame(panelEvents, "", canvas.Plain)
	if len(s.Events) == 0 {
		in.Text(1, 0, canvas.Dim, "nothing yet")
		return
	}
	from := max(0, len(s.Events)-in.at.h)
	for y, e := range s.Events[from:] {
		in.TextRight(11, y, canvas.Dim, seconds(e.Time))
		ink := canvas.Plain
		if e.Bad {
			ink = canvas.Bad
			in.Text(12, y, ink, "!")
		}
		in.Text(14, y, ink, e.Text)
	}
}
