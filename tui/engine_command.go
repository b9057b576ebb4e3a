package tui

import (
	"antelag/rtloop"
)

// commandKind is what the engine can be asked to do.
type commandKind int

const (
	stopEngine commandKind = iota
	setPaused              // on
	stepOnce               // one tick, while paused
	setSpeed               // speed
	selectView             // lane, channel
	applyEdit              // edits
	startRun               // rig, opened: another run begins
	swapRig                // rig, opened and carried to at: the run goes on with it
)

// command is what the engine is asked to do between two ticks.
type command struct {
	do            commandKind
	on            bool
	speed         float64
	lane, channel int
	edits         []laneEdit
	rig           *rtloop.Rig
	at            int64
}

// laneEdit is a change of one channel of one lane.
type laneEdit struct {
	lane int
	rtloop.Edit
}

// replyKind is what the engine answers.
type replyKind int

const (
	applied   replyKind = iota // edits, with the ticks after which they were applied
	refused                    // edits, err: nothing was changed
	swapped                    // at
	notYet                     // the rig did not fit: ready another
	failedRun                  // err
)

// reply is what the engine says of a command.
type reply struct {
	did   replyKind
	edits []laneEdit
	at    int64
	err   error
}

// obey does what was asked for since the last tick. With nothing asked, it
// costs two loads.
func (e *engine) obey() {
	for e.commands.waiting() {
		c, _ := e.commands.get()
		e.do(&c)
	}
	if e.next != nil {
		e.takeOver()
	}
}

func (e *engine) do(c *command) {
	switch c.do {
	case stopEngine:
		e.stopped = true
	case setPaused:
		e.now.paused = c.on
		e.settle()
	case stepOnce:
		if e.now.paused && !e.now.ended {
			e.advance()
		}
	case setSpeed:
		e.now.speed = c.speed
		e.rate()
	case selectView:
		if c.lane < len(e.rig.Lanes) && c.channel < e.rig.Lanes[0].Loop.Channels() {
			e.now.lane, e.now.channel = c.lane, c.channel
			e.now.view++
			e.sample()
			e.publish()
		}
	case applyEdit:
		e.apply(c.edits)
	case startRun:
		e.next = nil
		e.adopt(c.rig, 0)
		e.begin()
		e.publish()
	case swapRig:
		e.next = &command{do: swapRig, rig: c.rig, at: c.at}
	}
}

// apply changes compensators now. It is recorded with the ticks that the lane
// has done, so that a run with these edits comes to the same.
func (e *engine) apply(edits []laneEdit) {
	for i := range edits {
		loop := e.rig.Lanes[edits[i].lane].Loop
		edits[i].After = loop.Ticks()
		if err := loop.Apply(edits[i].Edit); err != nil {
			e.replies.put(reply{did: refused, edits: edits[i:], err: err})
			return
		}
	}
	e.replies.put(reply{did: applied, edits: edits, at: e.now.tick})
	e.publish()
}

// takeOver goes on with the rig that was handed over once it stands where this
// one stands. One that never will is given back.
func (e *engine) takeOver() {
	at := e.next.at
	switch {
	case at == e.now.tick:
		rig, ended := e.next.rig, e.now.ended
		e.next = nil
		e.adopt(rig, at)
		if ended && !e.now.ended {
			e.finish()
		}
		e.replies.put(reply{did: swapped, at: at})
		e.publish()
	case at < e.now.tick || e.now.paused || e.now.ended:
		e.next = nil
		e.replies.put(reply{did: notYet, at: at})
	}
}
