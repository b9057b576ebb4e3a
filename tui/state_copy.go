package tui

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"antelag/rtloop"
	"antelag/rtloop/pace"
	"antelag/scenarios"
)

// copying is a lane that is being copied.
type copying struct {
	began, now *scenarios.Scenario // with the copy
	edits      [][]rtloop.Edit
	name       string
	from       int
	lead       int64
	tries      int
	working    bool
	cancel     context.CancelFunc
}

// copyTries is how often a rig is readied before the copy is given up.
const copyTries = 20

var errCopying = errors.New("a lane is being copied; a moment")

// copyLane begins to copy the selected lane with all that it has been through.
func (s *session) copyLane() {
	if s.copying != nil {
		s.say("%v", errCopying)
		return
	}
	from, channel := s.laneName(s.lane), s.now.Channels[s.channel].Name
	name := s.freeName(from)
	now, err := s.now.WithLane(name, from, channel)
	if err == nil {
		var began *scenarios.Scenario
		if began, err = s.began.WithLane(name, from, channel); err == nil {
			s.copying = &copying{began: began, now: now, name: name, from: s.lane,
				lead: int64(math.Ceil(0.1 * s.speed / s.seen.period))}
			s.say("copying lane %s", from)
			s.readyCopy()
			return
		}
	}
	s.say("cannot copy lane %s: %v", from, plainly(err))
}

// freeName is a name for a copy that no lane has yet.
func (s *session) freeName(from string) string {
	base := from
	if i := strings.LastIndex(from, "-"); i > 0 && strings.Trim(from[i+1:], "0123456789") == "" {
		base = from[:i]
	}
	for n := 2; ; n++ {
		name := fmt.Sprintf("%s-%d", base, n)
		if s.now.CheckLane(name) != nil {
			return name
		}
	}
}

// readyCopy begins to ready the rig with the copied lane, once the engine has
// said of every edit when it was applied.
func (s *session) readyCopy() {
	c := s.copying
	if c == nil || c.working || s.waiting > 0 {
		return
	}
	c.edits = make([][]rtloop.Edit, 0, len(s.edits)+1)
	for _, e := range append(slices.Clone(s.edits), s.edits[c.from]) {
		c.edits = append(c.edits, slices.Clone(e))
	}
	c.working = true
	c.tries++
	ctx, cancel := context.WithCancel(context.Background())
	c.cancel = cancel
	began, edits, lead, engine, copies, judge := c.began, c.edits, c.lead, s.engine, s.copies, s.judge
	go func() {
		defer judge.guard()
		defer pace.Background()()
		copies <- engine.catchUp(ctx, began, edits, lead)
	}()
}

// copied takes a rig that has been readied.
func (s *session) copied(r readied) {
	c := s.copying
	if c == nil {
		return
	}
	c.cancel()
	c.working = false
	if r.err != nil {
		s.copying = nil
		s.say("cannot copy the lane: %v", plainly(r.err))
		return
	}
	s.engine.post(command{do: swapRig, rig: r.rig, at: r.at})
}

// swapped is told when the run goes on with the copied lane.
func (s *session) swapped() {
	c := s.copying
	if c == nil {
		return
	}
	for _, v := range s.verdicts {
		if v.of == s.now {
			v.of = c.now
		}
	}
	s.began, s.now, s.edits = c.began, c.now, c.edits
	s.copying = nil
	s.say("lane %s is a copy of %s", c.name, s.laneName(c.from))
	s.log(false, "lane %s copied from %s", c.name, s.laneName(c.from))
	if v := s.verdicts[s.laneName(c.from)]; v != nil {
		copied := *v
		copied.was = nil
		s.verdicts[c.name] = &copied
	}
	s.show(len(s.now.Lanes), s.channel)
}

// again readies another rig, further ahead.
func (s *session) again() {
	c := s.copying
	if c == nil {
		return
	}
	if c.tries >= copyTries {
		s.copying = nil
		s.say("the lane could not be copied: the loop is too fast to catch up with; pause it and try again")
		return
	}
	c.lead *= 2
	s.readyCopy()
}

// cancelCopy gives up a copy that is not there yet.
func (s *session) cancelCopy() {
	if c := s.copying; c != nil && c.working {
		c.cancel()
		s.say("copy of lane %s given up", s.laneName(c.from))
	}
}
