package tui

import (
	"context"
	"math"
	"testing"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
)

// liveSession is a session whose engine runs on a clock that passes at once.
func liveSession(t *testing.T) *session {
	t.Helper()
	s, err := newSession(short(t), &fakeClock{})
	if err != nil {
		t.Fatal(err)
	}
	s.engine.start()
	t.Cleanup(s.close)
	return s
}

// hears waits until what the engine says makes something so.
func (s *session) hears(t *testing.T, what string, so func() bool) {
	t.Helper()
	until(t, what, func() bool {
		s.hear()
		select {
		case r := <-s.copies:
			s.copied(r)
		default:
		}
		return so()
	})
}

// A restart replays no edit: it is the run of the scenario as it is now.
func TestRestartRunsThePresentSettings(t *testing.T) {
	s := liveSession(t)
	s.engine.post(command{do: stepOnce})
	if err := s.editSetting(kind.Num(0.012)); err != nil {
		t.Fatal(err)
	}
	s.hears(t, "the edit", func() bool { return s.waiting == 0 })
	if len(s.edits[0]) != 1 || s.edits[0][0].After != 1 {
		t.Errorf("recorded %+v, want one edit after 1 tick", s.edits[0])
	}
	run := s.seen.status.run
	s.restart()
	s.setPaused(false)
	s.hears(t, "the end", func() bool { return s.seen.status.run > run && s.seen.status.ended })
	if s.began != s.now || len(s.edits[0]) != 0 {
		t.Error("a restart begins with the present scenario and no edits")
	}
	v, err := accept.Run(context.Background(), s.now, accept.Options{})
	if err != nil {
		t.Fatal(err)
	}
	for i, lane := range v.Lanes {
		if got, want := s.seen.status.lanes[i].nrmse, float64(lane.Channels[0].NRMSE); got != want {
			t.Errorf("lane %s: nrmse %g, run %g", lane.Name, got, want)
		}
	}
}

// A copy takes over the edits of what it was copied from, and undo still
// reaches what was edited before.
func TestCopyKeepsEditsAndUndo(t *testing.T) {
	s := liveSession(t)
	if err := s.editSetting(kind.Num(0.012)); err != nil {
		t.Fatal(err)
	}
	s.copyLane()
	if err := s.editSetting(kind.Num(0.013)); err == nil {
		t.Error("a lane was edited while it was copied")
	}
	s.hears(t, "the copy", func() bool { return s.copying == nil })
	if len(s.now.Lanes) != 2 || s.lane != 2 || len(s.edits) != 3 || len(s.edits[2]) != 1 {
		t.Fatalf("%d lanes, selected %d, edits %v", len(s.now.Lanes), s.lane, s.edits)
	}
	if got := s.part().in(s.now).Values.Num("delay"); got != 0.012 {
		t.Errorf("the copy has a delay of %g s, want 0.012", got)
	}
	if err := s.editSetting(kind.Num(0.02)); err != nil {
		t.Fatal(err)
	}
	if own, copied := partOf(s.now, 0, 0).in(s.now).Values.Num("delay"), s.part().in(s.now).Values.Num("delay"); own != 0.012 || copied != 0.02 {
		t.Errorf("the original has %g s and the copy %g s", own, copied)
	}
	s.undoLast()
	s.undoLast()
	if own, copied := partOf(s.now, 0, 0).in(s.now).Values.Num("delay"), s.part().in(s.now).Values.Num("delay"); own != 0.014 || copied != 0.012 {
		t.Errorf("undone, the original has %g s and the copy %g s", own, copied)
	}
	s.hears(t, "the edits", func() bool { return s.waiting == 0 })
	if got := s.message; got == "" {
		t.Error("undo said nothing")
	}
}

// An edit that the loop refuses is taken back.
func TestEditThatTheLoopRefusesIsTakenBack(t *testing.T) {
	s := quietSession(t, short(t))
	if err := s.editSetting(kind.Num(0.02)); err != nil {
		t.Fatal(err)
	}
	s.reply(&reply{did: refused, err: context.DeadlineExceeded})
	if got := s.part().in(s.now).Values.Num("delay"); got != 0.014 || len(s.undo) != 0 {
		t.Errorf("delay %g s with %d to undo", got, len(s.undo))
	}
}

func TestRank(t *testing.T) {
	nan := math.NaN()
	lanes := []LaneView{
		{Name: "late trip", Trip: &rtloop.Trip{Time: 9}, Response: 0.001},
		{Name: "second", Response: 0.02},
		{Name: "early trip", Trip: &rtloop.Trip{Time: 3}, Response: 0.001},
		{Name: "unknown", Response: nan, NRMSE: nan},
		{Name: "best", Response: 0.01},
	}
	rank(lanes)
	for i, want := range []int{4, 2, 5, 3, 1} {
		if lanes[i].Rank != want {
			t.Errorf("%s is %d, want %d", lanes[i].Name, lanes[i].Rank, want)
		}
	}
}

func TestSpeedStaysWithinReason(t *testing.T) {
	s := quietSession(t, short(t))
	for range 20 {
		s.setSpeed(2)
	}
	if s.speed != fastest {
		t.Errorf("at most %g", s.speed)
	}
	for range 20 {
		s.setSpeed(0.5)
	}
	if s.speed != slowest {
		t.Errorf("at least %g", s.speed)
	}
	if s.setSpeed(0); s.speed != 1 {
		t.Errorf("real speed is %g", s.speed)
	}
}

func TestFreeNames(t *testing.T) {
	s := quietSession(t, short(t))
	for from, want := range map[string]string{"configured": "configured-2", "inverse": "inverse-2", "inverse-2": "inverse-3", "x-y": "x-y-2"} {
		if from == "inverse-2" {
			next, err := s.now.WithLane("inverse-2", "inverse", "damper")
			if err != nil {
				t.Fatal(err)
			}
			was := s.now
			s.now = next
			if got := s.freeName(from); got != want {
				t.Errorf("%s: %s, want %s", from, got, want)
			}
			s.now = was
			continue
		}
		if got := s.freeName(from); got != want {
			t.Errorf("%s: %s, want %s", from, got, want)
		}
	}
}

// What is kept of a run that never ends is bounded.
func TestHistoriesAreBounded(t *testing.T) {
	s := quietSession(t, short(t))
	for i := range 100_000 {
		s.seen.trail.add(&sample{view: 1, time: float64(i)})
		s.seen.status.time = float64(i)
		if i%10 == 0 {
			s.log(false, "again")
		}
	}
	if n := len(s.seen.trail.time); n >= 2*s.seen.trail.keep || cap(s.seen.trail.time) > 8*s.seen.trail.keep {
		t.Errorf("%d samples in room for %d", n, cap(s.seen.trail.time))
	}
	if len(s.events) > eventsKept {
		t.Errorf("%d events", len(s.events))
	}
	last := newest(s.seen.trail.time, s.seen.trail.keep)
	for i, x := range last {
		if x != float64(100_000-len(last)+i) {
			t.Fatalf("sample %d is of %g", i, x)
		}
	}
}
