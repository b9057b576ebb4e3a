package tui

import (
	"context"

	"antelag/rtloop"
	"antelag/scenarios"
)

// memory is how many physical seconds a loop remembers for a compensator that
// takes over.
const memory = 2.0

// openRig builds a scenario and puts it at t = 0, to be edited while it runs.
func openRig(s *scenarios.Scenario) (*rtloop.Rig, error) {
	rig, err := s.BuildLive(memory)
	if err != nil {
		return nil, err
	}
	return rig, rig.Open()
}

// readied is a rig that has been carried to where another stands, or will.
type readied struct {
	rig *rtloop.Rig
	at  int64
	err error
}

// catchUp builds a rig that goes through the same edits at the same ticks as
// the running one has, and carries it headless, faster than real time, to a
// tick that the running one will reach soon, or to where it stands still. It
// is for any goroutine but the engine's.
func (e *engine) catchUp(ctx context.Context, s *scenarios.Scenario, edits [][]rtloop.Edit, lead int64) readied {
	for ctx.Err() == nil {
		rig, err := openRig(s)
		if err != nil {
			return readied{err: err}
		}
		for i := range edits {
			rig.Lanes[i].Edits = edits[i]
		}
		if at, ok := e.follow(ctx, rig, lead); ok {
			return readied{rig: rig, at: at}
		}
	}
	return readied{err: ctx.Err()}
}

// follow carries a rig until it stands where the engine stands or soon will.
// It reports false when it went too far.
func (e *engine) follow(ctx context.Context, rig *rtloop.Rig, lead int64) (at int64, ok bool) {
	for ctx.Err() == nil {
		now, idle := e.tick.Load(), e.idle.Load()
		goal := now + lead
		switch {
		case idle && at == now, !idle && at >= now+lead/2:
			return at, true
		case idle && at > now:
			return 0, false
		case idle:
			goal = now
		}
		for at < goal {
			at++
			if !rig.Advance() {
				return at, true
			}
		}
	}
	return 0, false
}
