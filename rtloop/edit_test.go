package rtloop

import (
	"math"
	"testing"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

func resolved(t *testing.T, method string, given kind.Values) kind.Values {
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

// editedRig is a lane that is retuned, switched to another kind and back, beside
// one that is left alone.
func editedRig(t *testing.T, ticks int64) *Rig {
	t.Helper()
	delay := func(d float64) kind.Values { return kind.Values{"delay": kind.Num(d)} }
	lane := func(name string) *Lane {
		l := noisyLane(t, "polynomial")
		l.Name = name
		l.Loop.channels[0].memory.ticks = make([]moment, 1024)
		return l
	}
	edited := lane("edited")
	edited.Edits = []Edit{
		{After: 1000, Method: "polynomial", Values: resolved(t, "polynomial", delay(0.012))},
		{After: 2500, Method: "adaptive-time-series", Values: resolved(t, "adaptive-time-series", nil)},
		{After: 2500, Method: "adaptive-time-series", Values: resolved(t, "adaptive-time-series", delay(0.013))},
		{After: 5000, Method: "inverse", Values: resolved(t, "inverse", delay(0.014))},
	}
	return &Rig{Motion: &fixedMotion{samples: shaking(int(ticks)+1, standardTick)}, Ticks: ticks, Step: standardTick,
		Lanes: []*Lane{edited, lane("alone")}}
}

// Tick by tick or in blocks, with edits at known ticks: the same bits.
func TestAdvanceEqualsRun(t *testing.T) {
	const ticks = 7000
	rows := func(r *Rig, run func(*Rig)) [2][]Row {
		var out [2][]Row
		for i, l := range r.Lanes {
			l.Observe = func(loop *Loop) error { out[i] = append(out[i], loop.Row(0)); return nil }
		}
		run(r)
		return out
	}
	blocks := rows(editedRig(t, ticks), func(r *Rig) { runRig(t, r) })
	steps := rows(editedRig(t, ticks), func(r *Rig) {
		if err := r.Open(); err != nil {
			t.Fatal(err)
		}
		n := 1
		for r.Advance() {
			n++
		}
		if err := r.Close(); err != nil || n != ticks || r.Lanes[0].Loop.Outcome() != Completed {
			t.Fatalf("%d steps, %v, %v", n, r.Lanes[0].Loop.Outcome(), err)
		}
	})
	for i := range blocks {
		if len(blocks[i]) != ticks+1 || len(steps[i]) != ticks+1 {
			t.Fatalf("lane %d: %d and %d rows", i, len(blocks[i]), len(steps[i]))
		}
		for k := range blocks[i] {
			if blocks[i][k] != steps[i][k] {
				t.Fatalf("lane %d, row %d: %+v and %+v", i, k, blocks[i][k], steps[i][k])
			}
		}
	}
	different := false
	for k := range blocks[0] {
		same := blocks[0][k] == blocks[1][k]
		if k <= 1000 && !same {
			t.Fatalf("row %d differs before the first edit", k)
		}
		different = different || !same
	}
	if !different {
		t.Error("the edits did nothing")
	}
}

// A compensator that takes over commands what it would have, had it watched the
// same ticks from the start: the loop remembers enough.
func TestTakingOverDoesNotJump(t *testing.T) {
	const watched = 3000
	motion := shaking(watched+2, standardTick)
	for _, from := range []string{"none", "polynomial", "adaptive-time-series"} {
		for _, to := range compensator.Kinds.Names() {
			if to == from {
				continue
			}
			var commands [2]float64
			for i, remembered := range []int{2048, 2 * watched} {
				l := standardLoop(t, from, watched)
				l.channels[0].memory.ticks = make([]moment, remembered)
				l.Start(Drive{X: motion[0]})
				for k := 1; k <= watched; k++ {
					l.Tick(Drive{X: motion[k]})
				}
				old := l.Row(0).Command
				if err := l.Apply(Edit{Method: to, Values: resolved(t, to, nil)}); err != nil {
					t.Fatal(err)
				}
				l.Tick(Drive{X: motion[watched+1]})
				commands[i] = l.Row(0).Command
				// Methods differ by what they think the delay is: here 10 ms
				// against none at most, at the motion's speed, and what the
				// motion does in a tick.
				speed := math.Abs(l.channels[0].in.V)
				if d := math.Abs(commands[i] - old); d > (0.016+2*standardTick)*speed+1e-3 {
					t.Errorf("%s to %s: the command jumps by %g m at %g m/s", from, to, d, speed)
				}
			}
			// The time series still moves its coefficients, no faster than their
			// rates, from the assumed to the fitted ones; all others remember
			// less than is kept.
			bound := 0.0
			if to == "adaptive-time-series" {
				bound = 1e-4
			}
			if d := math.Abs(commands[0] - commands[1]); d > bound {
				t.Errorf("%s to %s: commands %g m, had it watched from the start %g m", from, to, commands[0], commands[1])
			}
		}
	}
}

func TestApplyRefuses(t *testing.T) {
	l := standardLoop(t, "polynomial", 100)
	l.Start(Drive{})
	before := l.channels[0].Compensator
	for _, e := range []Edit{
		{Channel: 1, Method: "none"},
		{Method: "nothing"},
		{Method: "polynomial", Values: kind.Values{"order": kind.Num(9), "delay": kind.Num(0.01)}},
	} {
		if err := l.Apply(e); err == nil {
			t.Errorf("%+v was applied", e)
		}
	}
	if l.channels[0].Compensator != before || l.channels[0].Method != "polynomial" {
		t.Error("a refused edit changed the loop")
	}
}

func TestAdvanceAllocatesNothing(t *testing.T) {
	r := editedRig(t, 1<<15)
	r.Lanes[0].Edits = nil
	if err := r.Open(); err != nil {
		t.Fatal(err)
	}
	if n := testing.AllocsPerRun(5000, func() { r.Advance() }); n != 0 {
		t.Errorf("%g allocations", n)
	}
}
