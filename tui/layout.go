package tui

import (
	"antelag/tui/canvas"
)

// The smallest screen on which the dashboard says what it must.
const (
	MinWidth  = 80
	MinHeight = 24
)

// View is which panels are shown where the screen has no room for all.
type View int

// The views, in the order in which they follow each other.
const (
	ViewTracking View = iota
	ViewEnergy
	ViewEditor
	views
)

var viewNames = [views]string{"tracking", "energy and lanes", "editor and curve"}

// String names what the view shows.
func (v View) String() string {
	if v < 0 || v >= views {
		return "unknown"
	}
	return viewNames[v]
}

// Next is the view after this one.
func (v View) Next() View { return (v + 1) % views }

// Dashboard draws snapshots. It keeps what must outlast a frame: the scales of
// the plots, which do not jump, and what can be clicked on.
type Dashboard struct {
	View View // changes nothing where everything has room

	plots plots
	hits  []hit
	w, h  int
}

// NewDashboard returns a dashboard that has drawn nothing yet.
func NewDashboard() *Dashboard {
	d := &Dashboard{}
	d.plots.init()
	return d
}

// ActionKind is what a click means.
type ActionKind int

// What can be clicked on.
const (
	None          ActionKind = iota
	SelectLane               // Index into Snapshot.Lanes
	SelectSetting            // Index into EditorView.Settings, −1 for the kind
	SelectChannel            // Index into Snapshot.Channels
	NextView
)

// Action is what a click means, and of what.
type Action struct {
	Kind  ActionKind
	Index int
}

type hit struct {
	rect
	Action
}

// Hit returns what the cell in column x, row y of the last frame does when it
// is clicked on.
func (d *Dashboard) Hit(x, y int) Action {
	for _, h := range d.hits {
		if h.has(x, y) {
			return h.Action
		}
	}
	return Action{}
}

// Draw draws one frame over the whole grid.
func (d *Dashboard) Draw(s *Snapshot, g *canvas.Grid) {
	d.begin(g)
	if d.tooSmall(g) {
		return
	}
	d.plots.follow(s)
	for _, p := range s.arranged().places(d.w, d.h, d.View) {
		b := box{g.Whole().Sub(p.x, p.y, p.w, p.h), p.rect}
		panels[p.panel].draw(d, s, b)
	}
}

// begin blanks the grid and forgets the last frame's clickable places.
func (d *Dashboard) begin(g *canvas.Grid) {
	g.Clear()
	d.w, d.h = g.Size()
	d.hits = d.hits[:0]
}

func (d *Dashboard) tooSmall(g *canvas.Grid) bool {
	if d.w < MinWidth || d.h < MinHeight {
		d.DrawTooSmall(g)
		return true
	}
	return false
}

// box is a part of the screen that knows where it lies.
type box struct {
	canvas.Region
	at rect
}

// frame heads the box with its title, and a note at the right end of the rule
// where there is room for both, and returns the inside.
func (b box) frame(p panelID, note string, ink canvas.Ink) box {
	return b.titled(panels[p].title, note, ink, false)
}

func (b box) titled(title, note string, ink canvas.Ink, selected bool) box {
	var in canvas.Region
	if selected {
		in = b.FrameSelected(title)
	} else {
		in = b.Frame(title)
	}
	if room := b.at.w - canvas.Width(title) - 8; note != "" && room > 4 {
		note = cut(note, room)
		b.TextRight(b.at.w-2, 0, ink, " "+note+" ")
	}
	w, h := in.Size()
	return box{in, rect{b.at.x, b.at.y + b.at.h - h, w, h}}
}

// sub is a part of the box.
func (b box) sub(x, y, w, h int) box {
	in := b.Sub(x, y, w, h)
	w, h = in.Size()
	return box{in, rect{b.at.x + x, b.at.y + y, w, h}}
}

// click makes row y of the box clickable.
func (d *Dashboard) click(b box, y int, a Action) { d.clickAt(b, 0, y, b.at.w, a) }

func (d *Dashboard) clickAt(b box, x, y, w int, a Action) {
	if y < b.at.h {
		d.hits = append(d.hits, hit{rect{b.at.x + x, b.at.y + y, w, 1}, a})
	}
}

// panelID names one panel.
type panelID int

const (
	panelHeader panelID = iota
	panelTrace
	panelError
	panelSubspace
	panelEnergy
	panelPace
	panelLanes
	panelEditor
	panelVerdict
	panelCurve
	panelEvents
	panelBottom
	panelRecord
	panelDelay
	panelCount
)

// panels say how each panel is headed, what it means, and how it is drawn.
var panels [panelCount]struct {
	title string
	draw  func(*Dashboard, *Snapshot, box)
}

func init() {
	for id, p := range map[panelID]struct {
		title string
		draw  func(*Dashboard, *Snapshot, box)
	}{
		panelHeader:   {"", (*Dashboard).drawHeader},
		panelTrace:    {"displacement", (*Dashboard).drawTrace},
		panelError:    {"error", (*Dashboard).drawError},
		panelSubspace: {"synchronization", (*Dashboard).drawSubspace},
		panelEnergy:   {"energy margin", (*Dashboard).drawEnergy},
		panelPace:     {"pace", (*Dashboard).drawPace},
		panelLanes:    {"lanes, best first", (*Dashboard).drawLanes},
		panelEditor:   {"compensator", (*Dashboard).drawEditor},
		panelVerdict:  {"whole scenario", (*Dashboard).drawVerdict},
		panelCurve:    {"curve", (*Dashboard).drawCurve},
		panelEvents:   {"events", (*Dashboard).drawEvents},
		panelBottom:   {"", (*Dashboard).drawBottom},
		panelRecord:   {"record", (*Dashboard).drawRecord},
		panelDelay:    {"delay", (*Dashboard).drawDelay},
	} {
		panels[id] = p
	}
}

// arrangement is how the panels of one kind of dashboard are placed.
type arrangement struct {
	places func(w, h int, v View) []place
	all    func(w, h int) bool // the screen has room for every panel at once
	views  []string            // what each view shows, where it has not
	keys   []keyHelp
}

var (
	loopArranged   = arrangement{layout, allShown, viewNames[:], keys}
	recordArranged = arrangement{playLayout, allPlayed, playViewNames[:], playKeys}
)

func (s *Snapshot) arranged() *arrangement {
	if s.Record != nil {
		return &recordArranged
	}
	return &loopArranged
}

// place is where a panel goes.
type place struct {
	panel panelID
	rect
}

// allShown reports whether a screen has room for every panel at once, so that
// there is only one view.
func allShown(w, h int) bool { return w >= 150 && h >= 36 }

// layout places the panels of a view on a screen of at least the smallest size.
func layout(w, h int, v View) []place {
	out, body := headAndFoot(w, h)
	switch {
	case allShown(w, h):
		return everything(out, body)
	case v == ViewEnergy:
		return energyPage(out, body)
	case v == ViewEditor:
		return editorPage(out, body)
	case w >= 150:
		return wideTracking(out, body)
	case h >= 38:
		return tallTracking(out, body)
	}
	return smallTracking(out, body)
}

// headAndFoot places header and bottom line, and returns what is left.
func headAndFoot(w, h int) (out []place, body rect) {
	head := 1
	if h >= 34 {
		head = 2
	}
	r := rect{0, 0, w, h}.rows(head, -1, 1)
	return append(make([]place, 0, panelCount), place{panelHeader, r[0]}, place{panelBottom, r[2]}), r[1]
}

// verdictRows is the height of the verdict: a title, six limits and how the run
// ended.
const verdictRows = 8

func smallTracking(out []place, body rect) []place {
	c := body.columns(-8, -5)
	left := c[0].rows(-3, -2, verdictRows)
	right := c[1].rows(-3, -2, max(9, body.h/3))
	return append(out,
		place{panelTrace, left[0]}, place{panelError, left[1]}, place{panelVerdict, left[2]},
		place{panelSubspace, right[0]}, place{panelEnergy, right[1]}, place{panelEditor, right[2]})
}

func tallTracking(out []place, body rect) []place {
	c := body.columns(-4, -3)
	left := c[0].rows(-12, -8, verdictRows, -9)
	right := c[1].rows(-10, -8, -11, -9)
	return append(out,
		place{panelTrace, left[0]}, place{panelError, left[1]}, place{panelVerdict, left[2]}, place{panelLanes, left[3]},
		place{panelSubspace, right[0]}, place{panelEnergy, right[1]}, place{panelEditor, right[2]}, place{panelCurve, right[3]})
}

func wideTracking(out []place, body rect) []place {
	c := body.columns(-4, -3, -3)
	left, mid, right := c[0].rows(-3, -2), c[1].rows(-3, -2), c[2].rows(-1, verdictRows)
	return append(out,
		place{panelTrace, left[0]}, place{panelError, left[1]},
		place{panelSubspace, mid[0]}, place{panelEnergy, mid[1]},
		place{panelEditor, right[0]}, place{panelVerdict, right[1]})
}

func energyPage(out []place, body rect) []place {
	r := body.rows(-11, -7, -4)
	top := r[0].columns(-8, -5)
	return append(out, place{panelEnergy, top[0]}, place{panelPace, top[1]},
		place{panelLanes, r[1]}, place{panelEvents, r[2]})
}

func editorPage(out []place, body rect) []place {
	c := body.columns(-2, -3)
	right := c[1].rows(-1, verdictRows)
	return append(out, place{panelEditor, c[0]}, place{panelCurve, right[0]}, place{panelVerdict, right[1]})
}

func everything(out []place, body rect) []place {
	c := body.columns(-4, -3, -3)
	left := c[0].rows(-13, -8, -9, -6)
	mid := c[1].rows(-15, -11, 12)
	right := c[2].rows(-4, verdictRows, -4)
	return append(out,
		place{panelTrace, left[0]}, place{panelError, left[1]}, place{panelLanes, left[2]}, place{panelEvents, left[3]},
		place{panelSubspace, mid[0]}, place{panelEnergy, mid[1]}, place{panelPace, mid[2]},
		place{panelEditor, right[0]}, place{panelVerdict, right[1]}, place{panelCurve, right[2]})
}

// rect is a rectangle of cells.
type rect struct{ x, y, w, h int }

func (r rect) has(x, y int) bool {
	return x >= r.x && x < r.x+r.w && y >= r.y && y < r.y+r.h
}

// rows cuts the rectangle from top to bottom: a positive part is so many rows,
// a negative one that share of the rest.
func (r rect) rows(parts ...int) []rect {
	out, at := make([]rect, len(parts)), r.y
	for i, n := range divide(r.h, parts) {
		out[i] = rect{r.x, at, r.w, n}
		at += n
	}
	return out
}

// columns cuts the rectangle from left to right, like rows.
func (r rect) columns(parts ...int) []rect {
	out, at := make([]rect, len(parts)), r.x
	for i, n := range divide(r.w, parts) {
		out[i] = rect{at, r.y, n, r.h}
		at += n
	}
	return out
}

func divide(total int, parts []int) []int {
	rest, shares := total, 0
	for _, p := range parts {
		if p > 0 {
			rest -= p
		} else {
			shares -= p
		}
	}
	out, sum, given := make([]int, len(parts)), 0, 0
	for i, p := range parts {
		if p > 0 {
			out[i] = p
			continue
		}
		sum -= p
		upTo := (2*max(rest, 0)*sum + shares) / (2 * shares)
		out[i], given = upTo-given, upTo
	}
	return out
}
