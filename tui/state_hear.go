package tui

import (
	"math"
	"slices"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/rtloop/pace"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
)

// seen is what the engine has told: the newest status, the last seconds of
// samples, and the margins of every lane over time.
type seen struct {
	period   float64 // physical seconds of a tick
	step     float64 // model seconds of a tick
	window   float64 // model seconds that the subspace covers
	status   status
	trail    trail
	energy   []history
	outcomes []rtloop.Outcome // as they were logged
	ended    bool
	dropped  int64
	pace     pace.Report
}

// What is kept of samples and of margins.
const (
	trailSeconds = 4.0 // physical
	margins      = 2048
)

// trail is the last samples of one view, oldest first.
type trail struct {
	view                            uint32
	keep                            int
	time, target, command, measured []float64
	lag                             []float64
}

// history is the energy margin of a lane over time.
type history struct{ time, margin []float64 }

func (h *history) add(t, v float64) {
	h.time = keepLast(append(h.time, t), margins)
	h.margin = keepLast(append(h.margin, v), margins)
}

func newSeen(period float64, rig *rtloop.Rig) seen {
	rate := min(1/period, sampleRate)
	return seen{
		period: period, step: rig.Step, window: rig.Lanes[0].Loop.Window(),
		trail: trail{keep: max(16, int(math.Ceil(trailSeconds*rate)))},
		pace:  pace.Report{Period: period},
	}
}

func (t *trail) add(x *sample) {
	if x.view != t.view {
		*t = trail{view: x.view, keep: t.keep, time: t.time[:0], target: t.target[:0],
			command: t.command[:0], measured: t.measured[:0], lag: t.lag[:0]}
	}
	for _, c := range []struct {
		to *[]float64
		v  float64
	}{{&t.time, x.time}, {&t.target, x.target}, {&t.command, x.command}, {&t.measured, x.measured}, {&t.lag, x.target - x.measured}} {
		*c.to = keepLast(append(*c.to, c.v), t.keep)
	}
}

// keepLast forgets all but the last n values, now and then.
func keepLast(v []float64, n int) []float64 {
	if len(v) < 2*n {
		return v
	}
	return v[:copy(v, v[len(v)-n:])]
}

// newest are the last n values.
func newest(v []float64, n int) []float64 { return v[max(0, len(v)-n):] }

// hear takes in all that the engine and the judge have said, and reports
// whether there was anything.
func (s *session) hear() bool {
	heard := false
	for {
		r, ok := s.engine.replies.get()
		if !ok {
			break
		}
		heard = true
		s.reply(&r)
	}
	for range sampleSlots { // more may come while these are taken
		x, ok := s.engine.samples.get()
		if !ok {
			break
		}
		heard = true
		s.seen.trail.add(&x)
	}
	if st, newer := s.engine.statuses.latest(); newer {
		heard = true
		s.standing(st)
	}
	return heard
}

// reply takes what the engine says of a command.
func (s *session) reply(r *reply) {
	switch r.did {
	case applied:
		s.waiting--
		for _, e := range r.edits {
			s.edits[e.lane] = append(s.edits[e.lane], e.Edit)
		}
		s.readyCopy()
	case refused:
		s.waiting--
		s.say("refused by the loop: %v", r.err)
		s.log(true, "refused by the loop: %v", r.err)
		if n := len(s.undo); n > 0 {
			step := s.undo[n-1]
			s.undo = s.undo[:n-1]
			if next, err := s.try(step.at, step.at.replace(step.kind, step.values, step.at.in(s.now).Kind.Name)...); err == nil {
				s.now = next
				s.clampCursor()
				s.askAll()
			}
		}
	case swapped:
		s.swapped()
	case notYet:
		s.again()
	case failedRun:
		s.log(true, "%v", r.err)
	}
}

// standing takes in a status and notes what has changed with it.
func (s *session) standing(st *status) {
	old := &s.seen.status
	if st.run != old.run {
		s.seen.energy, s.seen.outcomes, s.seen.ended = nil, nil, false
	}
	keepLanes, keepCoefficients := old.lanes[:0], old.coefficients[:0]
	*old = *st
	old.lanes = append(keepLanes, st.lanes...)
	old.coefficients = append(keepCoefficients, st.coefficients...)
	for len(s.seen.energy) < len(st.lanes) {
		s.seen.energy = append(s.seen.energy, history{})
		s.seen.outcomes = append(s.seen.outcomes, rtloop.Running)
	}
	for i := range st.lanes {
		s.laneStands(i, &st.lanes[i])
	}
	if st.ended && !s.seen.ended {
		s.log(false, "the run has ended")
	}
	s.seen.ended = st.ended
	if st.dropped > s.seen.dropped {
		s.seen.dropped = st.dropped
	}
	s.seen.pace = s.engine.pacer.Report()
}

// laneStands takes in how one lane stands.
func (s *session) laneStands(i int, l *laneStatus) {
	h := &s.seen.energy[i]
	if n := len(h.time); n == 0 || s.seen.status.time > h.time[n-1] {
		h.add(s.seen.status.time, l.margin)
	}
	if l.outcome != s.seen.outcomes[i] {
		s.seen.outcomes[i] = l.outcome
		switch l.outcome {
		case rtloop.Tripped, rtloop.Diverged:
			s.log(true, "%s %s", l.name, tripText(l.outcome, l.trip))
		case rtloop.Completed:
			s.log(false, "%s completed", l.name)
		}
	}
}

// askAll asks for the verdict of the selected lane, where it is not known, and
// for the curve of the setting under the cursor.
func (s *session) askAll() {
	lane := s.laneName(s.lane)
	v := s.verdicts[lane]
	if v == nil {
		v = &laneVerdict{}
		s.verdicts[lane] = v
	}
	s.asked++
	alone, err := s.now.Alone(lane)
	if err != nil {
		v.of, v.err, s.curve = s.now, err, nil
		return
	}
	q := question{number: s.asked, alone: alone, lane: lane, known: v.of == s.now && v.is != nil, vary: s.variation()}
	if !q.known {
		v.of = nil
	}
	s.curve = nil
	if q.vary != nil {
		s.curve = &curveState{number: q.number, vary: q.vary, working: true}
	}
	s.judge.ask(q)
}

// variation is the setting under the cursor, in the lane alone; nil where there
// is none that can be varied.
func (s *session) variation() *variation {
	k := s.setting()
	if k == nil || k.Type != kind.NumberType && k.Type != kind.IntegerType {
		return nil
	}
	at := s.part()
	v, given := at.in(s.now).Values[k.Name]
	if !given {
		return nil
	}
	out := &variation{setting: *k, now: v.Num, figure: s.figure}
	for j := range s.now.Channels {
		if partOf(s.now, s.lane, j).same(at) {
			out.at = append(out.at, part{own, j})
		}
	}
	return out
}

// judged takes an answer of the judge.
func (s *session) judged(a *answer) {
	if a.number != s.asked {
		return
	}
	lane := s.laneName(s.lane)
	if v := s.verdicts[lane]; a.verdict != nil || a.err != nil && a.points == nil && !a.done {
		v.of, v.is, v.took, v.err = s.now, a.verdict, a.took, a.err
	}
	c := s.curve
	if c == nil || c.number != a.number {
		return
	}
	c.points = append(c.points, a.points...)
	slices.SortFunc(c.points, func(p, q point) int { return compareFloat(p.x, q.x) })
	if a.done || a.err != nil {
		c.working = false
	}
}

func compareFloat(a, b float64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}

// figures are the verdict figures that mean something for the scenario.
func (s *session) figures() []string {
	structure := s.now.Substructure != nil
	return slices.DeleteFunc(accept.Figures(), func(name string) bool {
		switch name {
		case "energy_margin", "response_error":
			return !structure
		case "spectrum_error":
			return !s.now.Accept.Has(name)
		}
		return false
	})
}

// nextFigure chooses another figure for the curve, which is judged already, but
// for where it is finest.
func (s *session) nextFigure() {
	all := s.figures()
	s.figure = all[(slices.Index(all, s.figure)+1)%len(all)]
	s.say("curve of %s", accept.Label(s.figure))
	s.askAll()
}

func completed(l *accept.Lane) bool { return l.Outcome == rtloop.Completed }

// delayOf is the delay of an ellipse in physical seconds.
func (s *session) delayOf(e gauge.Ellipse) float64 { return e.Delay * s.seen.period }

// limitOf is the acceptance limit of a figure, NaN if there is none.
func limitOf(s *scenarios.Scenario, figure string) float64 {
	if s.Accept.Has(figure) {
		return s.Accept.Num(figure)
	}
	return math.NaN()
}
