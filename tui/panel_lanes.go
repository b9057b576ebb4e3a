package tui

import (
	"cmp"
	"fmt"
	"slices"

	"antelag/rtloop"
	"antelag/tui/canvas"
)

// laneColumn is one column of the table of lanes.
type laneColumn struct {
	head  string
	right bool // figures end at the right
	text  func(*LaneView) string
}

// The columns in the order shown; when they do not all fit, those named in
// laneDrops are left out, the first first. The state comes behind them.
var laneColumns = []laneColumn{
	{"lane", false, func(l *LaneView) string { return l.Name }},
	{"compensator", false, func(l *LaneView) string { return l.Method }},
	{"delay", true, func(l *LaneView) string { return late(l.Delay) }},
	{"error, rms", true, func(l *LaneView) string { return share(l.NRMSE) }},
	{"margin", true, func(l *LaneView) string { return margin(l.Margin) }},
	{"response", true, func(l *LaneView) string { return share(l.Response) }},
}

var laneDrops = []string{"compensator", "delay", "margin", "response"}

// laneState is how a lane stands and, as far as there is room, when and which
// limit ended it.
func laneState(l *LaneView, room int) (string, canvas.Ink) {
	word, ink := outcome(l.Outcome)
	if l.Trip == nil {
		return word, ink
	}
	at := " at " + seconds(l.Trip.Time)
	for _, text := range []string{word + " " + l.Trip.Limit + at, word + at} {
		if canvas.Width(text) <= room && !(l.Outcome == rtloop.Diverged && text != word+at) {
			return text, ink
		}
	}
	return word, ink
}

// drawLanes is the table of lanes, best first, the selected one marked. Of more
// lanes than rows the best are shown, and the selected one below them.
func (d *Dashboard) drawLanes(s *Snapshot, b box) {
	order := make([]int, len(s.Lanes))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(s.Lanes[i].Rank, s.Lanes[j].Rank) })
	note := ""
	if room := max(b.at.h-2, 1); len(order) > room {
		note = fmt.Sprintf("%d of %d shown", room, len(order))
		if at := slices.Index(order, s.Lane); at >= room {
			order[room-1] = s.Lane
		}
		order = order[:room]
	}
	in := b.frame(panelLanes, note, canvas.Dim)
	if len(order) == 0 {
		in.Text(1, 0, canvas.Dim, "no lanes")
		return
	}
	columns, widths := fitLanes(s.Lanes, in.at.w-laneLeft)
	x := laneLeft
	for c, col := range columns {
		placeCell(in, x, 0, widths[c], col.right, canvas.Dim, col.head)
		x += widths[c] + 2
	}
	in.Text(x, 0, canvas.Dim, "state")
	for y, i := range order {
		d.drawLane(in, y+1, s, i, columns, widths)
	}
}

// laneLeft is the room for the marker and the rank.
const laneLeft = 5

func (d *Dashboard) drawLane(in box, y int, s *Snapshot, i int, columns []laneColumn, widths []int) {
	l := &s.Lanes[i]
	ink := canvas.Plain
	if i == s.Lane {
		ink = canvas.Selected
		in.Text(0, y, ink, "▸")
	}
	in.TextRight(laneLeft-1, y, ink, fmt.Sprintf("%d.", l.Rank))
	x := laneLeft
	for c, col := range columns {
		placeCell(in, x, y, widths[c], col.right, ink, col.text(l))
		x += widths[c] + 2
	}
	state, ink := laneState(l, in.at.w-x)
	in.Text(x, y, ink, state)
	d.click(in, y, Action{SelectLane, i})
}

// placeCell writes a cell of a table.
func placeCell(b box, x, y, w int, right bool, ink canvas.Ink, text string) {
	if right {
		b.sub(x, y, w, 1).TextRight(w, 0, ink, text)
	} else {
		b.sub(x, y, w, 1).Text(0, 0, ink, text)
	}
}

// The names may lose their ends down to shortName; stateRoom is for the state
// in a word.
const (
	shortName = 15
	stateRoom = len("completed")
)

// fitLanes chooses the columns that fit into room and their widths. A column
// that no lane has a figure for is left out.
func fitLanes(lanes []LaneView, room int) ([]laneColumn, []int) {
	columns := slices.DeleteFunc(slices.Clone(laneColumns), func(c laneColumn) bool {
		return c.right && !slices.ContainsFunc(lanes, func(l LaneView) bool { return c.text(&l) != undefined })
	})
	room -= 2 + stateRoom
	widths := laneWidths(columns, lanes)
	for _, drop := range laneDrops {
		if total(widths)-max(0, widths[0]-shortName) <= room {
			break
		}
		columns = slices.DeleteFunc(columns, func(c laneColumn) bool { return c.head == drop })
		widths = laneWidths(columns, lanes)
	}
	widths[0] = max(8, min(widths[0], widths[0]-total(widths)+room))
	return columns, widths
}

// laneWidths are the widths that the columns need. Figures get room for the
// longest that is common, so that the table holds still.
func laneWidths(columns []laneColumn, lanes []LaneView) []int {
	common := map[string]int{"delay": len("12.345 ms late"), "error, rms": len("error, rms"), "margin": len("-100.0 %"), "response": len("response")}
	widths := make([]int, len(columns))
	for c, col := range columns {
		widths[c] = max(canvas.Width(col.head), common[col.head])
		for i := range lanes {
			widths[c] = max(widths[c], canvas.Width(col.text(&lanes[i])))
		}
	}
	return widths
}

// total is the width of a row of columns two apart.
func total(widths []int) int {
	n := 2 * (len(widths) - 1)
	for _, w := range widths {
		n += w
	}
	return n
}
