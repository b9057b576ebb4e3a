package tui

import (
	"fmt"

	"antelag/tui/canvas"
)

// drawBottom is the last line: a question that waits for its answer, or what
// the last key did, and the keys that matter most.
func (d *Dashboard) drawBottom(s *Snapshot, b box) {
	if q := s.Prompt; q != nil {
		n := 1 + b.Text(1, 0, canvas.Warn, cut(q.Question, b.at.w*3/4)) + 1
		n += typing(b.sub(n, 0, b.at.w-n, 1), q.Text)
		const end = "Enter answers, Esc leaves it"
		if x := b.at.w - 1 - len(end); n+2 < x {
			b.Text(x, 0, canvas.Dim, end)
		}
		return
	}
	right := b.at.w - 1
	a := s.arranged()
	view := int(d.View) % len(a.views)
	tab := fmt.Sprintf("v view %d/%d: %s", view+1, len(a.views), a.views[view])
	if !a.all(d.w, d.h) && canvas.Width(s.Message)+canvas.Width(tab)+5 <= right {
		n := canvas.Width(tab)
		b.Text(right-n, 0, canvas.Accent, tab)
		d.clickAt(b, right-n, 0, n, Action{NextView, 0})
		right -= n + 3
	}
	x := 1
	if s.Message != "" {
		x += b.sub(0, 0, right, 1).Text(1, 0, canvas.Bold, s.Message) + 3
	}
	drawKeys(b, x, right, bottomKeys(&s.Editor, a.keys))
}

// drawKeys writes as many keys and their meaning as fit between two columns.
func drawKeys(b box, x, right int, keys []keyHelp) {
	for _, k := range keys {
		if x+canvas.Width(k.key)+1+canvas.Width(k.short) > right {
			continue
		}
		x += b.Text(x, 0, canvas.Accent, k.key) + 1
		x += b.Text(x, 0, canvas.Dim, k.short) + 2
	}
}

// bottomKeys are the keys to name, the most useful first.
func bottomKeys(e *EditorView, keys []keyHelp) []keyHelp {
	if e.Editing {
		return []keyHelp{{"Enter", "apply", ""}, {"Esc", "leave as it was", ""}}
	}
	out := []keyHelp{}
	for _, k := range keys {
		if k.short != "" {
			out = append(out, k)
		}
	}
	return out
}
