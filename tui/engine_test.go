package tui

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/rtloop/pace"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// fakeClock passes as fast as it is waited on.
type fakeClock struct{ now time.Duration }

func (c *fakeClock) Now() time.Duration        { return c.now }
func (c *fakeClock) Sleep(until time.Duration) { c.now = max(c.now, until) }
func (c *fakeClock) Spin(until time.Duration)  { c.now = max(c.now, until) }

func load(t testing.TB, name string, changes ...string) *scenarios.Scenario {
	t.Helper()
	var list []scenarios.Change
	for _, text := range changes {
		c, err := scenarios.ParseChange(text)
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, c)
	}
	s, err := scenarios.Load(name, list...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func short(t testing.TB) *scenarios.Scenario {
	return load(t, "archive", "loop.duration=4 s", "loop.rate=512 Hz")
}

// rows are what every lane did at every tick, as bits.
type rows [][][4]uint64

func watch(rig *rtloop.Rig, into rows) {
	for i, l := range rig.Lanes {
		l.Observe = func(loop *rtloop.Loop) error {
			r := loop.Row(0)
			into[i] = append(into[i], [4]uint64{math.Float64bits(r.Target), math.Float64bits(r.Command), math.Float64bits(r.Measured), math.Float64bits(r.Force)})
			return nil
		}
	}
}

func settings(t testing.TB, method string, given kind.Values) kind.Values {
	t.Helper()
	entry, err := compensator.Kinds.Find(method)
	if err != nil {
		t.Fatal(err)
	}
	v, err := entry.Resolve(given)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// script is what is edited, and after how many ticks.
func script(t testing.TB) map[int64]laneEdit {
	delay := func(v float64) kind.Values { return kind.Values{"delay": kind.Num(v)} }
	return map[int64]laneEdit{
		300:  {0, rtloop.Edit{Method: "polynomial", Values: settings(t, "polynomial", delay(0.010))}},
		700:  {1, rtloop.Edit{Method: "adaptive-time-series", Values: settings(t, "adaptive-time-series", nil)}},
		1100: {0, rtloop.Edit{Method: "inverse", Values: settings(t, "inverse", delay(0.013))}},
		1500: {1, rtloop.Edit{Method: "adaptive-time-series", Values: settings(t, "adaptive-time-series", kind.Values{"window": kind.Num(0.5)})}},
	}
}

// startedEngine is an engine on a clock that passes at once.
func startedEngine(t *testing.T, rig *rtloop.Rig, paused bool) *engine {
	t.Helper()
	pacer, err := pace.NewOn(rig.Lanes[0].Loop.Period(), &fakeClock{})
	if err != nil {
		t.Fatal(err)
	}
	return newEngine(rig, pacer, paused)
}

// drain collects the edits that the engine says it has applied.
func drain(t *testing.T, e *engine, edits [][]rtloop.Edit) {
	t.Helper()
	for {
		r, ok := e.replies.get()
		if !ok {
			return
		}
		if r.err != nil {
			t.Fatal(r.err)
		}
		for _, x := range r.edits {
			edits[x.lane] = append(edits[x.lane], x.Edit)
		}
	}
}

func idle(t *testing.T, e *engine) {
	t.Helper()
	until(t, "the engine to stand still", func() bool { return e.idle.Load() })
}

// until waits for something that comes about by itself.
func until(t *testing.T, what string, come func() bool) {
	t.Helper()
	for end := time.Now().Add(time.Minute); !come(); time.Sleep(time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("waited a minute for %s", what)
		}
	}
}

// A live run that was edited comes to the very bits of the headless run with
// the same edits at the same ticks.
func TestLiveIsHeadless(t *testing.T) {
	s := short(t)
	rig, err := openRig(s)
	if err != nil {
		t.Fatal(err)
	}
	live, headless := make(rows, 2), make(rows, 2)
	e := startedEngine(t, rig, false)
	plan := script(t)
	watch(rig, live)
	inner := rig.Lanes[1].Observe
	rig.Lanes[1].Observe = func(l *rtloop.Loop) error {
		if edit, ok := plan[l.Ticks()]; ok {
			e.post(command{do: applyEdit, edits: []laneEdit{edit}})
		}
		return inner(l)
	}
	e.start()
	idle(t, e)
	e.stop()
	edits := make([][]rtloop.Edit, 2)
	drain(t, e, edits)
	for tick, want := range plan {
		if !slices.ContainsFunc(edits[want.lane], func(x rtloop.Edit) bool { return x.After == tick }) {
			t.Errorf("no edit of lane %d after %d ticks in %v", want.lane, tick, edits)
		}
	}

	other, err := s.BuildLive(memory)
	if err != nil {
		t.Fatal(err)
	}
	watch(other, headless)
	for i := range edits {
		other.Lanes[i].Edits = edits[i]
	}
	if err := other.Run(context.Background(), nil); err != nil {
		t.Fatal(err)
	}
	for i := range live {
		headless[i] = headless[i][1:] // the start, which the live one had before it was watched
		if !slices.Equal(live[i], headless[i]) {
			t.Errorf("lane %d: %d rows live, %d headless, and not the same", i, len(live[i]), len(headless[i]))
		}
	}
	if got, want := results(t, rig), results(t, other); got != want {
		t.Errorf("live     %s\nheadless %s", got, want)
	}
}

func results(t *testing.T, rig *rtloop.Rig) string {
	t.Helper()
	text, err := json.Marshal(rig.Results())
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// A lane that is copied into a run comes to the bits that it would have come to
// had it been there from the start.
func TestCopiedLaneHadAlwaysBeenThere(t *testing.T) {
	s := short(t)
	with, err := s.WithLane("copy", scenarios.Configured, "damper")
	if err != nil {
		t.Fatal(err)
	}
	for _, paused := range []bool{true, false} {
		rig, err := openRig(s)
		if err != nil {
			t.Fatal(err)
		}
		e := startedEngine(t, rig, true)
		e.start()
		edit := script(t)[300]
		for range 300 {
			for !e.post(command{do: stepOnce}) {
				time.Sleep(time.Millisecond)
			}
		}
		until(t, "300 ticks", func() bool { return e.tick.Load() == 300 })
		e.post(command{do: applyEdit, edits: []laneEdit{edit}})
		edits := make([][]rtloop.Edit, 2)
		until(t, "the edit", func() bool { drain(t, e, edits); return len(edits[0]) == 1 })
		edits = append(edits, slices.Clone(edits[0]))

		// Not paused, the engine is let run from a rig readied for a later tick.
		var r readied
		if paused {
			r = e.catchUp(context.Background(), with, edits, 50)
		} else {
			e.idle.Store(false)
			r = e.catchUp(context.Background(), with, edits, 50)
			e.idle.Store(true)
		}
		if r.err != nil {
			t.Fatal(r.err)
		}
		if want := map[bool]int64{true: 300, false: 350}[paused]; r.at != want {
			t.Fatalf("paused %v: readied for tick %d, want %d", paused, r.at, want)
		}
		live := make(rows, 3)
		watch(r.rig, live)
		if !paused {
			e.commands.put(command{do: setPaused, on: false}) // it wakes for the next
		}
		e.post(command{do: swapRig, rig: r.rig, at: r.at})
		var said reply
		until(t, "an answer", func() bool { x, ok := e.replies.get(); said = x; return ok })
		if said.did == notYet && !paused {
			e.stop()
			continue // a slow machine; what was refused harms nothing
		}
		if said.did != swapped || said.at != r.at {
			t.Fatalf("the engine said %+v", said)
		}
		e.post(command{do: setPaused, on: false})
		until(t, "the end", func() bool { st, _ := e.statuses.latest(); return st.ended })
		e.stop()

		other, err := with.BuildLive(memory)
		if err != nil {
			t.Fatal(err)
		}
		headless := make(rows, 3)
		watch(other, headless)
		for i := range edits {
			other.Lanes[i].Edits = edits[i]
		}
		if err := other.Run(context.Background(), nil); err != nil {
			t.Fatal(err)
		}
		for i := range live {
			if want := headless[i][r.at+1:]; !slices.Equal(live[i], want) || len(want) == 0 {
				t.Errorf("paused %v, lane %d: %d rows live, %d headless, and not the same", paused, i, len(live[i]), len(want))
			}
		}
		if !slices.Equal(live[0], live[2]) {
			t.Error("the copy does something else than what it was copied from")
		}
	}
}

// A tick with its sample and its status allocates nothing.
func TestEngineTickDoesNotAllocate(t *testing.T) {
	rig, err := openRig(short(t))
	if err != nil {
		t.Fatal(err)
	}
	e := startedEngine(t, rig, false)
	e.every = 1
	if n := testing.AllocsPerRun(500, func() {
		e.obey()
		e.pacer.Wait()
		e.advance()
	}); n != 0 {
		t.Errorf("%g allocations a tick", n)
	}
}

// Samples that nobody takes are dropped and counted; ticks are not.
func TestFullRingDropsSamplesNeverTicks(t *testing.T) {
	s := load(t, "archive", "loop.duration=20 s")
	rig, err := openRig(s)
	if err != nil {
		t.Fatal(err)
	}
	e := startedEngine(t, rig, false)
	e.start()
	idle(t, e)
	e.stop()
	st, _ := e.statuses.latest()
	if st.tick != rig.Ticks || !st.ended {
		t.Errorf("%d of %d ticks done, ended %v", st.tick, rig.Ticks, st.ended)
	}
	if want := rig.Ticks + 1 - sampleSlots; st.dropped != want { // the start is a sample too
		t.Errorf("%d samples dropped, want %d", st.dropped, want)
	}
}

func TestPanicInTheLoopIsCaught(t *testing.T) {
	rig, err := openRig(short(t))
	if err != nil {
		t.Fatal(err)
	}
	rig.Lanes[0].Observe = func(*rtloop.Loop) error { panic("a slip") }
	e := startedEngine(t, rig, false)
	e.start()
	<-e.done
	var p *Panic
	if !errors.As(error(e.failed), &p) || p.Value != "a slip" || !strings.Contains(string(p.Stack), "Advance") {
		t.Errorf("got %+v", e.failed)
	}
}

func TestPauseSingleTickAndSpeed(t *testing.T) {
	rig, err := openRig(short(t))
	if err != nil {
		t.Fatal(err)
	}
	e := startedEngine(t, rig, true)
	e.start()
	e.post(command{do: stepOnce})
	e.post(command{do: stepOnce})
	e.post(command{do: setSpeed, speed: 4})
	until(t, "two ticks", func() bool {
		st, _ := e.statuses.latest()
		return st.tick == 2 && st.speed == 4 && st.paused
	})
	e.stop()
	if got, want := e.pacer.Report().Period, rig.Lanes[0].Loop.Period()/4; math.Abs(got-want) > 1e-12 {
		t.Errorf("period %g, want %g", got, want)
	}
}
