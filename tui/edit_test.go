package tui

import (
	"math"
	"strings"
	"testing"

	"antelag/compensator"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var (
	aDelay  = kind.Number("delay", quantity.Time, "a delay").Range(0, 0.5)
	anOrder = kind.Integer("order", "an order").Range(0, 4)
	aGain   = kind.Number("gain", quantity.None, "a gain").Range(0.5, 2)
	aWord   = kind.Word("adapt", "what adapts", "none", "delay", "both")
	aList   = kind.Numbers("lengths", quantity.Length, "lengths").Range(0, 10)
)

// Steps are round and of about a twentieth.
func TestNudge(t *testing.T) {
	for _, c := range []struct {
		s       kind.Setting
		from    float64
		up, big bool
		want    float64
	}{
		{aDelay, 0.014, true, false, 0.0145},
		{aDelay, 0.014, false, false, 0.0135},
		{aDelay, 0.014, true, true, 0.020}, // ten steps of 0.5 ms, from the nearest multiple of 5 ms
		{aDelay, 0.0143, true, false, 0.015},
		{aDelay, 0.4999, true, false, 0.5},
		{aDelay, 0.0002, false, false, 0.00019},
		{aGain, 1, true, false, 1.05},
		{aGain, 1.05, false, false, 1},
		{aGain, 1.99, true, true, 2},
		{anOrder, 3, true, false, 4},
		{anOrder, 1, false, false, 0},
		{anOrder, 1, true, true, 4},
	} {
		got, err := nudge(&c.s, kind.Num(c.from), c.up, c.big)
		if err != nil || got.Num != c.want {
			t.Errorf("%s %v up %v big %v: %v, %v; want %v", c.s.Name, c.from, c.up, c.big, got.Num, err, c.want)
		}
	}
	for _, c := range []struct {
		s    kind.Setting
		v    kind.Value
		up   bool
		want string
	}{
		{aDelay, kind.Num(0.5), true, "delay goes no further: 0 s to 500 ms"},
		{aDelay, kind.Num(0), false, "delay goes no further"},
		{anOrder, kind.Num(4), true, "order goes no further: 0 to 4"},
		{aList, kind.List(1), true, "lengths is typed: press enter"},
	} {
		if _, err := nudge(&c.s, c.v, c.up, false); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %s", c.s.Name, err, c.want)
		}
	}
	if v, err := nudge(&aDelay, kind.Num(0), true, false); err != nil || !(v.Num > 0) {
		t.Errorf("from nothing: %v, %v", v.Num, err)
	}
	for from, want := range map[string]string{"none": "delay", "both": "none"} {
		if v, err := nudge(&aWord, kind.Text(from), true, false); err != nil || v.Text != want {
			t.Errorf("%s: %v, %v, want %s", from, v.Text, err, want)
		}
	}
}

func TestBelow125(t *testing.T) {
	for v, want := range map[float64]float64{0.0007: 0.0005, 0.05: 0.05, 1: 1, 1.99: 1, 2: 2, 4.9: 2, 5: 5, 9.99: 5, 1e6: 1e6, 3e-9: 2e-9} {
		if got := below125(v); got != want {
			t.Errorf("%g: %g, want %g", v, got, want)
		}
	}
}

// What the editor offers for typing reads back as what it was.
func TestTypableReadsBack(t *testing.T) {
	for _, entry := range compensator.Kinds.Entries {
		values, err := entry.Resolve(nil)
		if err != nil {
			t.Fatal(err)
		}
		for i := range entry.Settings {
			s := &entry.Settings[i]
			v, given := values[s.Name]
			if !given {
				continue
			}
			back, err := readTyped(s, typable(s, v))
			if err != nil || math.Abs(back.Num-v.Num) > 1e-6*math.Abs(v.Num) || back.Text != v.Text { // six digits are shown
				t.Errorf("%s of %s: %q reads as %v, %v", s.Name, entry.Name, typable(s, v), back, err)
			}
		}
	}
	if v, err := readTyped(&aList, "1 mm, 2 m"); err != nil || len(v.List) != 2 || v.List[1] != 2 {
		t.Errorf("%v, %v", v, err)
	}
}

// Every kind can be made of every other, and undone to the very settings.
func TestEveryKindFromEveryKind(t *testing.T) {
	s := quietSession(t, short(t))
	for _, from := range compensator.Kinds.Names() {
		for _, to := range compensator.Kinds.Names() {
			if err := s.setKind(from); err != nil {
				t.Fatalf("%s: %v", from, err)
			}
			before, undos := s.part().in(s.now), len(s.undo)
			if err := s.setKind(to); err != nil {
				t.Errorf("%s → %s: %v", from, to, err)
				continue
			}
			if got := s.part().in(s.now).Kind.Name; got != to {
				t.Errorf("%s → %s: %s", from, to, got)
			}
			if len(s.undo) == undos {
				continue // from a kind to itself is no edit
			}
			s.undoLast()
			after := s.part().in(s.now)
			if after.Kind.Name != from || !sameValues(after.Values, before.Values) {
				t.Errorf("%s → %s undone: %v, was %v", from, to, after.Values, before.Values)
			}
		}
	}
}

func sameValues(a, b kind.Values) bool {
	if len(a) != len(b) {
		return false
	}
	for name, v := range a {
		if w, ok := b[name]; !ok || v.Num != w.Num || v.Text != w.Text {
			return false
		}
	}
	return true
}

// quietSession is a session whose engine does not run.
func quietSession(t *testing.T, sc *scenarios.Scenario) *session {
	t.Helper()
	s, err := newSession(sc, &fakeClock{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.judge.close)
	return s
}

// An edit of a compensator that several lanes use reaches all of them, and
// only them.
func TestEditReachesAllThatUseThePart(t *testing.T) {
	s := load(t, "piperack")
	if len(s.Channels) < 2 {
		t.Fatal("the scenario must have several channels")
	}
	with, err := s.WithLane("one", scenarios.Configured, s.Channels[0].Name)
	if err != nil {
		t.Fatal(err)
	}
	lane := len(with.Lanes)
	users := func(p part) map[[2]int]bool {
		out := map[[2]int]bool{}
		for _, e := range p.edits(with) {
			out[[2]int{e.lane, e.Channel}] = true
		}
		return out
	}
	if got := users(partOf(with, lane, 0)); len(got) != 1 || !got[[2]int{lane, 0}] {
		t.Errorf("the lane's own compensator is used by %v", got)
	}
	borrowed := partOf(with, lane, 1)
	if borrowed != (part{own, 1}) {
		t.Errorf("the other channel uses %v", borrowed)
	}
	if got := users(borrowed); !got[[2]int{0, 1}] || !got[[2]int{lane, 1}] {
		t.Errorf("the channel's own compensator is used by %v", got)
	}
}

func TestRefusedEditChangesNothing(t *testing.T) {
	s := quietSession(t, short(t))
	was := s.now
	for _, wrong := range []string{"", "12", "9 s", "-1 ms", "3 mm", "x"} {
		s.cursor = 1
		s.beginTyping()
		s.typing = wrong
		s.apply()
		if s.now != was || s.problem == "" || !s.editing || len(s.undo) != 0 {
			t.Errorf("%q: problem %q, editing %v, %d to undo", wrong, s.problem, s.editing, len(s.undo))
		}
	}
}
