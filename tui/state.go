package tui

import (
	"errors"
	"fmt"
	"slices"
	"time"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/rtloop/pace"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// session is the state of the dashboard: the scenario as it is now, what was
// done to it, what the engine and the judge have said, and what the keys are
// about. It belongs to one goroutine. A scenario is never changed; an edit
// makes another.
type session struct {
	began *scenarios.Scenario // as the run began
	now   *scenarios.Scenario // as it is
	edits [][]rtloop.Edit     // by lane: what turned the one into the other, since the run began

	engine  *engine
	judge   *judge
	copies  chan readied // rigs with another lane, readied in the background
	asked   int          // number of the newest question
	waiting int          // edits that the engine has not answered yet
	copying *copying

	lane, channel int
	cursor        int // of the editor; −1 is the kind
	editing       bool
	typing        string
	problem       string
	prompt        *Prompt
	answer        func(text string) // what the prompt's text is for
	message       string
	undo          []undoStep
	kinds         map[remembered]kind.Values
	figure        string

	paused   bool
	speed    float64
	verdicts map[string]*laneVerdict
	curve    *curveState
	events   []Event
	seen     seen
}

// undoStep is a part as it was before an edit.
type undoStep struct {
	at     part
	kind   *kind.Kind
	values kind.Values
	what   string
}

// remembered names the settings that a part had when it was of another kind.
type remembered struct {
	at   part
	kind string
}

// laneVerdict is what the whole scenario came to for a lane, now and before
// the last edit of it.
type laneVerdict struct {
	of      *scenarios.Scenario // for which is holds
	is, was *accept.Lane
	took    time.Duration
	err     error
}

// curveState is the curve as far as it is known.
type curveState struct {
	number  int
	vary    *variation
	points  []point
	working bool
}

// Speeds are kept between these.
const (
	slowest, fastest = 1.0 / 64, 8.0
	eventsKept       = 200
	undoKept         = 1000
)

// newSession makes a session that stands paused at t = 0.
func newSession(s *scenarios.Scenario, clock pace.Clock) (*session, error) {
	rig, err := openRig(s)
	if err != nil {
		return nil, err
	}
	period := rig.Lanes[0].Loop.Period()
	pacer, err := newPacer(period, clock)
	if err != nil {
		return nil, err
	}
	out := &session{
		began: s, now: s, edits: make([][]rtloop.Edit, len(s.Lanes)+1),
		engine: newEngine(rig, pacer, true), judge: newJudge(), copies: make(chan readied, 1),
		kinds: map[remembered]kind.Values{}, verdicts: map[string]*laneVerdict{},
		paused: true, speed: 1,
		seen: newSeen(period, rig),
	}
	out.figure = out.figures()[0]
	// The cursor begins where a curve says most: on the first physical value.
	out.cursor = slices.IndexFunc(out.part().in(s).Kind.Settings, func(k kind.Setting) bool {
		return k.Type == kind.NumberType && k.Dim != quantity.None
	})
	return out, nil
}

func newPacer(period float64, clock pace.Clock) (*pace.Pacer, error) {
	if clock != nil {
		return pace.NewOn(period, clock)
	}
	return pace.New(period)
}

func (s *session) close() {
	if s.copying != nil && s.copying.cancel != nil {
		s.copying.cancel()
	}
	s.judge.close()
	s.engine.stop()
}

// laneName is the name of a lane of the rig.
func (s *session) laneName(lane int) string {
	if lane == 0 {
		return scenarios.Configured
	}
	return s.now.Lanes[lane-1].Name
}

// part is the compensator that the keys are about.
func (s *session) part() part { return partOf(s.now, s.lane, s.channel) }

// setting is the setting under the cursor, nil on the kind.
func (s *session) setting() *kind.Setting {
	k := s.part().in(s.now).Kind
	if s.cursor < 0 || s.cursor >= len(k.Settings) {
		return nil
	}
	return &k.Settings[s.cursor]
}

// say puts a message on the bottom line.
func (s *session) say(format string, args ...any) { s.message = fmt.Sprintf(format, args...) }

// log notes an event.
func (s *session) log(bad bool, format string, args ...any) {
	s.events = append(s.events, Event{s.seen.status.time, fmt.Sprintf(format, args...), bad})
	if len(s.events) > eventsKept {
		s.events = slices.Delete(s.events, 0, len(s.events)-eventsKept)
	}
}

// change makes another scenario of the present one and tells the engine. The
// present one stays if anything is wrong with the other.
func (s *session) change(at part, what string, changes ...scenarios.Change) error {
	was := at.in(s.now)
	next, err := s.try(at, changes...)
	if err != nil {
		return err
	}
	s.undo = append(s.undo, undoStep{at, was.Kind, was.Values, what})
	if len(s.undo) > undoKept {
		s.undo = slices.Delete(s.undo, 0, len(s.undo)-undoKept)
	}
	s.adopt(next, at)
	s.say("%s", what)
	s.log(false, "%s", what)
	return nil
}

// try makes the changed scenario and checks that the compensator can be built.
func (s *session) try(at part, changes ...scenarios.Change) (*scenarios.Scenario, error) {
	if s.copying != nil {
		// Its history ends with what has been applied so far.
		return nil, errCopying
	}
	next, err := s.now.With(changes...)
	if err != nil {
		return nil, plainly(err)
	}
	in := at.in(next)
	entry, err := compensator.Kinds.Find(in.Kind.Name)
	if err != nil {
		return nil, err
	}
	_, err = entry.New(1/next.Loop.Num("rate"), in.Values)
	return next, err
}

// plainly takes off an error of a scenario the place, which the cursor shows.
func plainly(err error) error {
	var placed *scenarios.Error
	if errors.As(err, &placed) && placed.Err != nil {
		return placed.Err
	}
	return err
}

// adopt makes a scenario the present one, of which only one part is new.
func (s *session) adopt(next *scenarios.Scenario, at part) {
	edits := at.edits(next)
	touched := map[string]bool{}
	for _, e := range edits {
		touched[s.laneName(e.lane)] = true
	}
	for lane, v := range s.verdicts {
		switch {
		case v.of != s.now || v.is == nil:
		case touched[lane]:
			v.was = v.is
		default:
			v.of = next // another lane's edit changes nothing for this one
		}
	}
	s.now = next
	s.waiting++
	s.send(command{do: applyEdit, edits: edits})
	s.clampCursor()
	s.askAll()
}

// send posts a command.
func (s *session) send(c command) {
	if !s.engine.post(c) {
		s.say("the loop has too many commands waiting; this one was dropped")
	}
}

func (s *session) clampCursor() {
	s.cursor = min(max(s.cursor, -1), len(s.part().in(s.now).Kind.Settings)-1)
}

// undoLast takes the last edit back.
func (s *session) undoLast() {
	if len(s.undo) == 0 {
		s.say("there is no edit to undo")
		return
	}
	step := s.undo[len(s.undo)-1]
	next, err := s.try(step.at, step.at.replace(step.kind, step.values, step.at.in(s.now).Kind.Name)...)
	if err != nil {
		s.say("cannot be undone: %v", err)
		return
	}
	s.undo = s.undo[:len(s.undo)-1]
	s.adopt(next, step.at)
	s.say("undone: %s", step.what)
	s.log(false, "undone: %s", step.what)
}

// editSetting sets the setting under the cursor.
func (s *session) editSetting(v kind.Value) error {
	k, at := s.setting(), s.part()
	was := "–"
	if old, ok := at.in(s.now).Values[k.Name]; ok {
		was = k.FormatValue(old)
	}
	what := fmt.Sprintf("%s: %s %s → %s", s.where(at), k.Name, was, k.FormatValue(v))
	return s.change(at, what, at.change(k, v))
}

// where names a part as people do.
func (s *session) where(at part) string {
	lane := scenarios.Configured
	if at.lane != own {
		lane = s.now.Lanes[at.lane].Name
	}
	if len(s.now.Channels) > 1 {
		return lane + " " + s.now.Channels[s.channel].Name
	}
	return lane
}

// setKind makes the compensator another kind. What both kinds can be set to is
// taken over; what the other has besides is as it was when it was last of that
// kind, or its default.
func (s *session) setKind(name string) error {
	entry, err := compensator.Kinds.Find(name)
	if err != nil {
		return err
	}
	at := s.part()
	in := at.in(s.now)
	if in.Kind.Name == name {
		return nil
	}
	s.kinds[remembered{at, in.Kind.Name}] = in.Values
	values := kind.Values{}
	for n, v := range s.kinds[remembered{at, name}] {
		values[n] = v
	}
	own := len(values)
	for i := range in.Kind.Settings {
		old := &in.Kind.Settings[i]
		v, given := in.Values[old.Name]
		if k, err := entry.Setting(old.Name); given && err == nil && k.Type == old.Type && k.Dim == old.Dim && k.Check(v) == nil {
			values[old.Name] = v
		}
	}
	what := fmt.Sprintf("%s: %s → %s", s.where(at), in.Kind.Name, name)
	err = s.change(at, what, at.replace(&entry.Kind, values, in.Kind.Name)...)
	if err != nil && (own > 0 || len(values) > 0) {
		// What was taken over does not suit it: its defaults do.
		err = s.change(at, what, at.replace(&entry.Kind, nil, in.Kind.Name)...)
	}
	return err
}

// show selects another lane or channel.
func (s *session) show(lane, channel int) {
	lanes, channels := len(s.now.Lanes)+1, len(s.now.Channels)
	s.lane, s.channel = (lane+lanes)%lanes, (channel+channels)%channels
	s.clampCursor()
	s.send(command{do: selectView, lane: s.lane, channel: s.channel})
	s.askAll()
}

func (s *session) setPaused(on bool) {
	s.paused = on
	s.send(command{do: setPaused, on: on})
}

// setSpeed changes the speed by a factor, or to the real one with 0.
func (s *session) setSpeed(factor float64) {
	speed := s.speed * factor
	if factor == 0 {
		speed = 1
	}
	period := s.seen.period / speed
	if speed < slowest || speed > fastest || period < pace.ShortestPeriod || period > pace.LongestPeriod {
		s.say("no %s than this", map[bool]string{true: "faster", false: "slower"}[factor > 1])
		return
	}
	s.speed = speed
	s.send(command{do: setSpeed, speed: speed})
	s.say("%s", speedWords(speed))
}

func speedWords(v float64) string {
	switch {
	case v > 1:
		return fmt.Sprintf("%g times as fast as real", v)
	case v < 1:
		return fmt.Sprintf("slowed %g times", 1/v)
	}
	return "real speed"
}

// restart begins another run with the present settings.
func (s *session) restart() {
	if s.copying != nil {
		s.say("%v", errCopying)
		return
	}
	rig, err := openRig(s.now)
	if err != nil {
		s.say("cannot restart: %v", err)
		return
	}
	s.began = s.now
	s.edits = make([][]rtloop.Edit, len(s.now.Lanes)+1)
	s.send(command{do: startRun, rig: rig})
	s.say("restarted")
}
