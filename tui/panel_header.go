package tui

import (
	"fmt"
	"math"
	"strconv"

	"antelag/rtloop"
	"antelag/tui/canvas"
)

// The caution in as many words as there is room for.
var cautions = []string{
	"SIMULATION, no interlock: keep hardware limits, emergency stop, lab procedure",
	"SIMULATION, no interlock: keep the emergency stop",
	"SIMULATION, no interlock",
	"SIMULATION",
}

// drawHeader says what runs and where it stands: the state of the run in a
// word, the time, the speed, lane and channel. On two rows the second holds the
// scenario and the caution.
func (d *Dashboard) drawHeader(s *Snapshot, b box) {
	first := b.sub(0, 0, b.at.w, 1)
	d.drawState(s, first, b.at.h < 2)
	if b.at.h < 2 {
		return
	}
	second := b.sub(0, 1, b.at.w, 1)
	text := s.Scenario
	if s.Title != "" {
		text += ": " + s.Title
	}
	text = cut(text, max(24, b.at.w-canvas.Width(cautions[2])-3))
	n := second.Text(1, 0, canvas.Plain, text)
	drawCaution(s, second, n+4)
}

// recordCautions are those of a log: it is no simulation.
var recordCautions = []string{
	"RECORD of a test: it shows what happened, not what will",
	"RECORD of a test",
	"RECORD",
}

// drawCaution writes the longest caution that fits to the right of column from.
func drawCaution(s *Snapshot, b box, from int) {
	texts := cautions
	if s.Record != nil {
		texts = recordCautions
	}
	for _, c := range texts {
		if canvas.Width(c) <= b.at.w-1-from {
			b.TextRight(b.at.w-1, 0, canvas.Warn, c)
			return
		}
	}
}

func (d *Dashboard) drawState(s *Snapshot, b box, caution bool) {
	word, ink := state(s)
	x := 1 + b.Text(1, 0, ink, word)
	b.Tint(0, 0, x+1, ink)
	x += 3
	end := x + canvas.Width(seconds(s.Clock.Duration)) // so that nothing moves as digits are added
	b.TextRight(end, 0, canvas.Bold, seconds(s.Clock.Time))
	x = end + 1
	x += b.Text(x, 0, canvas.Plain, "of "+whole(s.Clock.Duration)) + 2
	x += b.Text(x, 0, canvas.Plain, speed(&s.Clock, b.at.w >= 100)) + 2

	lane, channel := "", ""
	if l := s.lane(); l != nil {
		lane = fmt.Sprintf("lane %d/%d %s", s.Lane+1, len(s.Lanes), l.Name)
	}
	if s.Channel >= 0 && s.Channel < len(s.Channels) {
		channel = fmt.Sprintf("channel %d/%d %s", s.Channel+1, len(s.Channels), s.Channels[s.Channel])
	}
	room := b.at.w - 1 - x
	if len(s.Channels) == 1 && canvas.Width(lane)+2+canvas.Width(channel) > room {
		channel = "" // the only one needs no name
	}
	lane, channel = fitTwo(lane, channel, room)
	n := b.Text(x, 0, canvas.Accent, lane)
	if n > 0 {
		d.clickAt(b, x, 0, n, Action{SelectLane, next(s.Lane, len(s.Lanes))})
		x += n + 2
	}
	n = b.Text(x, 0, canvas.Accent, channel)
	if n > 0 {
		d.clickAt(b, x, 0, n, Action{SelectChannel, next(s.Channel, len(s.Channels))})
		x += n + 2
	}
	if caution {
		drawCaution(s, b, x)
	}
}

// fitTwo shortens lane and channel until both fit into room columns.
func fitTwo(lane, channel string, room int) (string, string) {
	l, c := canvas.Width(lane), canvas.Width(channel)
	if l+2+c <= room {
		return lane, channel
	}
	if least := 18; c > 0 && room >= 2*least {
		c = min(c, max(least, room-2-l))
		return cut(lane, room-2-c), cut(channel, c)
	}
	return cut(lane, max(0, room)), ""
}

// next is the entry after i, the first after the last.
func next(i, n int) int {
	if n == 0 {
		return 0
	}
	return (i + 1) % n
}

// lane is the selected lane, nil if there is none.
func (s *Snapshot) lane() *LaneView {
	if s.Lane < 0 || s.Lane >= len(s.Lanes) {
		return nil
	}
	return &s.Lanes[s.Lane]
}

// state is the state of the run in a word.
func state(s *Snapshot) (string, canvas.Ink) {
	l := s.lane()
	if s.Record != nil && s.Record.Seeking {
		return "SEEKING", canvas.Warn
	}
	stopped := l != nil && (l.Outcome == rtloop.Tripped || l.Outcome == rtloop.Diverged)
	switch {
	case stopped:
		word, ink := outcome(l.Outcome)
		if s.Clock.Paused && !s.Clock.Ended {
			word += ", paused"
		}
		return word, ink
	case s.Clock.Ended:
		return "ENDED", canvas.Accent
	case s.Clock.Paused:
		return "PAUSED", canvas.Warn
	}
	if s.Record != nil {
		return "PLAYING", canvas.Good
	}
	return "RUNNING", canvas.Good
}

// speed says how fast ticks are released, and how slow the test itself is.
func speed(c *Clock, long bool) string {
	times := strconv.FormatFloat(c.Speed, 'g', 3, 64) + "× speed"
	switch {
	case c.Speed == 1:
		times = "real speed"
	case math.IsInf(c.Speed, 1):
		times = "full speed"
	case !defined(c.Speed):
		times = ""
	}
	if !long || !defined(c.Rate) {
		return times
	}
	rate := strconv.FormatFloat(c.Rate, 'f', -1, 64) + " ticks/s"
	if c.Speed != 1 {
		rate = "of " + rate
	} else {
		rate = "at " + rate
	}
	times += " " + rate
	if c.Slowdown != 1 && defined(c.Slowdown) {
		times += ", slowed down " + strconv.FormatFloat(c.Slowdown, 'g', 4, 64) + " times"
	}
	return times
}
