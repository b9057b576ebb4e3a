package tui

import (
	"slices"
	"strings"

	"antelag/tui/canvas"
)

// drawEditor lists the kind and the settings of the selected lane's
// compensator on the selected channel, and explains the one under the cursor:
// its range, what it is, and why what was typed is refused.
func (d *Dashboard) drawEditor(s *Snapshot, b box) {
	v := &s.Editor
	note := ""
	if l := s.lane(); l != nil {
		note = l.Name
	}
	if len(s.Channels) > 1 && s.Channel >= 0 && s.Channel < len(s.Channels) {
		note += " · " + s.Channels[s.Channel]
	}
	in := b.titled(panels[panelEditor].title, note, canvas.Accent, v.Editing)

	all := len(v.Settings) + 1
	help := editorHelp(v, in.at.w-3, max(4, in.at.h-1-all))
	if least := min(all, 3); len(help) > in.at.h-least {
		help = help[:max(0, in.at.h-least)]
	}
	rows := min(all, in.at.h-len(help))
	first := window(v.Cursor+1, all, rows)
	widths := settingWidths(v)
	for y := range rows {
		d.drawSetting(in.sub(0, y, in.at.w-1, 1), v, first+y-1, widths)
	}
	if first > 0 {
		in.Text(in.at.w-1, 0, canvas.Accent, "↑")
	}
	if first+rows < all {
		in.Text(in.at.w-1, rows-1, canvas.Accent, "↓")
	}
	y := rows
	if in.at.h-y > len(help) {
		y++ // a blank row where there is room
	}
	for i, h := range help {
		in.Text(2, y+i, h.ink, h.text)
	}
}

// settingWidths are the widths of the columns of names and of values.
func settingWidths(v *EditorView) [2]int {
	w := [2]int{len("kind"), 0}
	for i := range v.Settings {
		w[0] = max(w[0], canvas.Width(v.Settings[i].Name))
		w[1] = max(w[1], canvas.Width(v.Settings[i].Value))
	}
	return w
}

// drawSetting writes setting i on a row of its own, the kind when i is −1.
func (d *Dashboard) drawSetting(in box, v *EditorView, i int, widths [2]int) {
	name, value, adapts := "kind", v.Method, ""
	if i >= 0 {
		name, value, adapts = v.Settings[i].Name, v.Settings[i].Value, v.Settings[i].Adapts
	}
	ink, under := canvas.Plain, i == v.Cursor
	if under {
		ink = canvas.Selected
		in.Text(0, 0, canvas.Cursor, "▸")
	}
	x := 2 + min(widths[0], max(4, in.at.w-4-widths[1])) + 2
	if i < 0 && x+canvas.Width(value) > in.at.w {
		x = 2 + len("kind") + 2
	}
	in.sub(2, 0, x-4, 1).Text(0, 0, ink, name)
	d.click(in, 0, Action{SelectSetting, i})
	if under && v.Editing {
		x += typing(in.sub(x, 0, in.at.w-x, 1), v.Text) + 1
		textIfFits(in, x, canvas.Dim, "was "+value)
		return
	}
	in.Text(x, 0, canvas.Bold, value)
	if adapts != "" {
		textIfFits(in, x+max(widths[1], canvas.Width(value))+2, canvas.Accent, "now "+adapts)
	}
}

// textIfFits writes a text whole or not at all.
func textIfFits(in box, x int, ink canvas.Ink, text string) {
	if x+canvas.Width(text) <= in.at.w {
		in.Text(x, 0, ink, text)
	}
}

// typing writes what is being typed with the place where the next letter goes;
// of a long text its end stays in view.
func typing(in box, text string) int {
	for canvas.Width(text) > in.at.w-1 && text != "" {
		_, size := splitFirst(text)
		text = text[size:]
	}
	n := in.Text(0, 0, canvas.Selected, text)
	return n + in.Text(n, 0, canvas.Cursor, "▏")
}

func splitFirst(s string) (string, int) {
	for i := range s {
		if i > 0 {
			return s[:i], i
		}
	}
	return s, len(s)
}

// editorHelp explains what is under the cursor on at most most lines of n
// columns. Why something was refused takes the place of everything else.
func editorHelp(v *EditorView, n, most int) []span {
	var out []span
	add := func(ink canvas.Ink, text string) {
		for _, line := range wrap(text, n, most-len(out)) {
			out = append(out, span{line, ink})
		}
	}
	switch {
	case v.Problem != "":
		add(canvas.Bad, "refused: "+v.Problem)
	case v.Cursor < 0:
		add(canvas.Plain, kindsText(v))
	case v.Cursor < len(v.Settings):
		s := &v.Settings[v.Cursor]
		add(canvas.Plain, s.Range)
		if s.Adapts != "" {
			add(canvas.Accent, "now "+s.Adapts+", by adapting")
		}
		add(canvas.Dim, s.Doc)
	}
	return out
}

// kindsText lists the kinds from the one that comes next.
func kindsText(v *EditorView) string {
	if len(v.Kinds) == 0 {
		return ""
	}
	at := slices.Index(v.Kinds, v.Method)
	ordered := append(slices.Clone(v.Kinds[at+1:]), v.Kinds[:max(at, 0)]...)
	return "other kinds: " + strings.Join(ordered, ", ")
}

// window is the first of n entries shown on room rows such that entry at is
// among them, in the middle where it can be.
func window(at, n, room int) int {
	return max(0, min(at-room/2, n-room))
}
