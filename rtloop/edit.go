package rtloop

import (
	"fmt"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

// Edit is a change of one channel's compensator between two ticks.
type Edit struct {
	After   int64 // ticks done when it is applied
	Channel int
	Method  string // the kind; another than the present one replaces it
	Values  kind.Values
}

// Apply changes a compensator now. The same kind is retuned and keeps its
// history; another kind is built anew and primed with the ticks that the
// loop remembers (Config.Memory), as if it had watched all along. It is for
// between two ticks. On an error nothing is changed.
func (l *Loop) Apply(e Edit) error {
	if e.Channel < 0 || e.Channel >= len(l.channels) {
		return fmt.Errorf("there is no channel %d", e.Channel)
	}
	c := &l.channels[e.Channel]
	if e.Method == c.Method {
		return c.Compensator.Retune(e.Values)
	}
	entry, err := compensator.Kinds.Find(e.Method)
	if err != nil {
		return err
	}
	next, err := entry.New(l.cfg.Tick, e.Values)
	if err != nil {
		return err
	}
	c.prime(next)
	c.Compensator, c.Method = next, e.Method
	return nil
}

// memory is the last ticks of a channel, a ring.
type memory struct {
	ticks []moment
	at    int // where the next one goes
	full  bool
}

// moment is what a compensator was told, and what was commanded.
type moment struct {
	in compensator.Input
	u  float64
}

func (m *memory) add(in compensator.Input, u float64) {
	m.ticks[m.at] = moment{in, u}
	if m.at++; m.at == len(m.ticks) {
		m.at, m.full = 0, true
	}
}

// prime shows a compensator what the channel remembers, oldest first.
func (c *channel) prime(next compensator.Compensator) {
	m := &c.memory
	older, newer := m.ticks[:0], m.ticks[:m.at]
	if m.full {
		older = m.ticks[m.at:]
	}
	switch {
	case len(older) > 0:
		next.Start(older[0].in.X, older[0].in.Y)
	case len(newer) > 0:
		next.Start(newer[0].in.X, newer[0].in.Y)
	default:
		next.Start(c.target, c.measured)
	}
	for _, part := range [][]moment{older, newer} {
		for i := range part {
			next.Prime(part[i].in, part[i].u)
		}
	}
}

// applyDue applies the edits that are due before the next tick.
func (l *Lane) applyDue() {
	for l.nextEdit < len(l.Edits) && l.Edits[l.nextEdit].After <= l.Loop.ticks {
		if err := l.Loop.Apply(l.Edits[l.nextEdit]); err != nil && l.err == nil {
			l.err = fmt.Errorf("edit after %d ticks: %w", l.Edits[l.nextEdit].After, err)
			l.Loop.outcome = Interrupted
		}
		l.nextEdit++
	}
}
