package tui

import (
	"fmt"

	"antelag/tui/canvas"
)

// keyHelp is a key, its meaning in a word for the bottom line, "" to leave it
// out there, and in full for the help page.
type keyHelp struct{ key, short, long string }

// keys are the keys in the order of their use.
var keys = []keyHelp{
	{"?", "help", "this page"},
	{"q", "quit", "quit; Ctrl-C too"},
	{"space", "pause", "pause and go on"},
	{"↑ ↓", "setting", "setting above, below"},
	{"Enter", "edit", "type a value; Esc leaves it"},
	{"← →", "", "less, more (Shift: much); kind"},
	{"u", "undo", "undo the last edit"},
	{"l", "lane", "next lane, L the one before; Tab"},
	{"c", "", "next channel"},
	{"v", "", "next view, on small screens"},
	{"f", "", "figure of the curve"},
	{"n", "", "new lane, a copy of this one"},
	{".", "", "a single tick while paused"},
	{"r", "", "restart the motion"},
	{"- +", "", "slower, faster; = real speed"},
	{"w", "", "write a scenario file"},
	{"p", "", "picture of the screen as text"},
}

// meanings are what each panel shows, for the help page.
var meanings = []meaning{
	{"displacement", "target of the integration, command sent, position measured"},
	{"error", "target less measured; the loop trips at the limit"},
	{"synchronization", "measured against target: 45° is right, an open ellipse late or early, another slope too large or too small"},
	{"energy margin", "100 % injects nothing; below 0 % the loop grows"},
	{"compensator", "settings of the selected lane; edits act between two ticks"},
	{"whole scenario", "every limit over the whole motion, before → after an edit"},
	{"curve", "a figure of it against the setting under the cursor"},
	{"lanes, pace, events", "lanes ranked so far; ticks released late; what happened"},
}

// DrawHelp draws the keys and the meaning of every panel, on one page that fits
// the smallest screen.
func (d *Dashboard) DrawHelp(g *canvas.Grid) { d.drawKeyHelp(g, keys, meanings) }

// meaning is what a panel shows, for the help page.
type meaning struct{ panel, text string }

// playMeanings are those of a log that is played.
var playMeanings = []meaning{
	{"displacement", "target and command as they were recorded, position measured"},
	{"error", "target less measured"},
	{"synchronization", "measured against target: 45° is right, an open ellipse late or early, another slope too large or too small"},
	{"delay", "of the last two seconds, against time"},
	{"record", "figures since the last seek"},
	{"energy margin", "as it was logged; below 0 % the loop grew"},
	{"events", "where it was worst, and what was mended in reading"},
}

func (d *Dashboard) drawKeyHelp(g *canvas.Grid, keys []keyHelp, meanings []meaning) {
	d.begin(g)
	if d.tooSmall(g) {
		return
	}
	page := centred(g, MinWidth, MinHeight)
	page.titled("help", "any key goes back", canvas.Accent, false)
	half := (len(keys) + 1) / 2
	for i, k := range keys {
		x, y := 1, 1+i
		if i >= half {
			x, y = 41, 1+i-half
		}
		page.Text(x, y, canvas.Accent, k.key)
		page.sub(x+6, y, 34, 1).Text(0, 0, canvas.Plain, k.long)
	}
	y := half + 2
	for _, m := range meanings {
		page.sub(1, y, 20, 1).Text(0, 0, canvas.Bold, m.panel)
		for _, line := range wrap(m.text, page.at.w-22, 2) {
			page.Text(21, y, canvas.Plain, line)
			y++
		}
	}
	page.Text(1, page.at.h-1, canvas.Warn, cautions[0])
}

// centred is a box of the given size in the middle of the grid.
func centred(g *canvas.Grid, w, h int) box {
	gw, gh := g.Size()
	w, h = min(w, gw), min(h, gh)
	x, y := (gw-w)/2, (gh-h)/2
	return box{g.Whole().Sub(x, y, w, h), rect{x, y, w, h}}
}

// warnings are the cautions of the first screen, one a line.
var warnings = []string{
	"This is a simulation: nothing here moves steel, and steel may move otherwise.",
	"It is no interlock: it protects neither people nor the specimen.",
	"Hydraulic actuators crush: keep the hardware limits, the emergency stop and",
	"the lab procedure.",
	"Local codes and the responsible licensed engineer decide.",
}

// DrawWelcome draws the first screen: what will run, and the cautions.
func (d *Dashboard) DrawWelcome(s *Snapshot, g *canvas.Grid) {
	d.begin(g)
	if d.tooSmall(g) {
		return
	}
	page := centred(g, min(d.w, 100), 19)
	in := page.titled("antelag bench", "", canvas.Plain, false)
	lines := []span{{}, {s.Title, canvas.Bold}, {"scenario " + s.Scenario, canvas.Plain},
		{fmt.Sprintf("%s of test, %s", whole(s.Clock.Duration), speed(&s.Clock, true)), canvas.Plain},
		{fmt.Sprintf("%s, %s", count(len(s.Lanes), "lane"), count(len(s.Channels), "channel")), canvas.Plain}, {}, {}}
	for _, w := range warnings {
		lines = append(lines, span{w, canvas.Warn})
	}
	lines = append(lines, span{}, span{}, span{"any key starts · q quits", canvas.Accent})
	for y, l := range lines {
		in.Text(2, y, l.ink, l.text)
	}
}

func count[N int | int64](n N, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// DrawTooSmall says which size is needed and which there is.
func (d *Dashboard) DrawTooSmall(g *canvas.Grid) {
	d.begin(g)
	in := box{g.Whole(), rect{0, 0, d.w, d.h}}
	text := fmt.Sprintf("The dashboard needs %d×%d characters, this terminal has %d×%d: enlarge it, or q quits.",
		MinWidth, MinHeight, d.w, d.h)
	lines := wrap(text, d.w, d.h)
	for i, line := range lines {
		in.Text(max(0, (d.w-canvas.Width(line))/2), (d.h-len(lines))/2+i, canvas.Warn, line)
	}
}
