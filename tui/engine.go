package tui

import (
	"math"
	"runtime/debug"
	"sync/atomic"
	"time"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/rtloop/pace"
)

// sample is one tick of the selected channel of the selected lane.
type sample struct {
	view                      uint32 // of which selection and run it is, see status
	time                      float64
	target, command, measured float64
}

// status is how all lanes stand. The engine publishes it a few times a second.
type status struct {
	run           uint32 // counts the runs: a restart begins another
	view          uint32 // counts runs and selections: what is kept of samples is of one view
	tick          int64
	time          float64 // model s
	paused, ended bool
	speed         float64
	lane, channel int
	lanes         []laneStatus
	ellipse       gauge.Ellipse // of the selected channel
	resting       bool          // the ellipse says nothing
	coefficients  []compensator.Coefficient
	dropped       int64
}

// laneStatus is how one lane stands; figures are of the selected channel.
type laneStatus struct {
	name, method      string
	outcome           rtloop.Outcome
	trip              *rtloop.Trip
	nrmse, delay      float64
	margin, marginMin float64
	added, response   float64
	judged            bool // there is energy to judge
}

// engine carries a rig through its ticks at its rate, in a thread of its own.
// It never waits for anything but the next tick, or, while it is paused, for
// a command. What it says goes into rings and a triple buffer, and what does
// not fit there is dropped and counted.
type engine struct {
	pacer    *pace.Pacer
	samples  *ring[sample]
	statuses *triple[status]
	commands *ring[command]
	replies  *ring[reply]
	wake     chan struct{} // while it is idle
	done     chan struct{} // closed when the goroutine has ended
	failed   *Panic        // what ended it, to be read after done

	tick atomic.Int64 // ticks done, for whoever readies another rig
	idle atomic.Bool  // paused or ended

	// The goroutine's own.
	rig           *rtloop.Rig
	now           status // but for what is filled in when it is published
	next          *command
	stopped       bool
	period        float64 // physical seconds of a tick at speed 1
	stride        int64   // ticks from one sample to the next
	every, untilP int64   // ticks from one status to the next, and left until it
}

// Ring sizes: eight seconds of samples at 2048 Hz; more commands than can be
// typed between two ticks.
const (
	sampleSlots  = 1 << 14
	commandSlots = 1 << 8
	statusRate   = 20   // statuses a second
	sampleRate   = 4096 // at most so many samples a second
	laneRoom     = 64   // lanes that a status has room for from the start
)

// newEngine makes an engine for an opened rig; start lets it run.
func newEngine(rig *rtloop.Rig, pacer *pace.Pacer, paused bool) *engine {
	e := &engine{
		pacer: pacer, samples: newRing[sample](sampleSlots), statuses: newTriple[status](),
		commands: newRing[command](commandSlots), replies: newRing[reply](commandSlots),
		wake: make(chan struct{}, 1), done: make(chan struct{}),
	}
	for i := range e.statuses.values {
		s := &e.statuses.values[i]
		s.lanes = make([]laneStatus, 0, laneRoom)
		s.coefficients = make([]compensator.Coefficient, 0, laneRoom)
		s.time, s.speed = 0, 1
	}
	e.now.speed, e.now.paused = 1, paused
	e.adopt(rig, 0)
	e.begin()
	e.publish()
	return e
}

// adopt takes over a rig that has done so many ticks.
func (e *engine) adopt(rig *rtloop.Rig, ticks int64) {
	first := rig.Lanes[0].Loop
	e.rig, e.period = rig, first.Period()
	e.now.tick, e.now.ended = ticks, ticks >= rig.Ticks
	e.stride = max(1, int64(math.Round(1/(e.period*sampleRate))))
	e.rate()
	e.settle()
}

// begin marks the start of a run.
func (e *engine) begin() {
	e.now.run++
	e.now.view++
	e.now.lane = min(e.now.lane, len(e.rig.Lanes)-1)
	e.sample()
}

// rate brings what follows from period and speed up to date.
func (e *engine) rate() {
	perSecond := e.now.speed / e.period
	e.every = max(1, int64(perSecond/statusRate))
	e.untilP = e.every
	// Speeds are kept such that the period can be paced.
	_ = e.pacer.SetPeriod(1 / perSecond)
}

// settle tells the others where the engine stands.
func (e *engine) settle() {
	e.tick.Store(e.now.tick)
	e.idle.Store(e.now.paused || e.now.ended)
}

// run is the goroutine.
func (e *engine) run() {
	defer close(e.done)
	defer func() {
		if r := recover(); r != nil {
			e.failed = &Panic{Where: "the loop", Value: r, Stack: debug.Stack()}
		}
	}()
	e.pacer.LockProgram()
	defer e.pacer.Unlock()
	for {
		if e.obey(); e.stopped {
			return
		}
		if e.now.paused || e.now.ended {
			e.pacer.Pause()
			e.publish()
			<-e.wake
			continue
		}
		e.pacer.Wait()
		e.advance()
	}
}

// advance does one tick.
func (e *engine) advance() {
	more := e.rig.Advance()
	e.now.tick++
	e.tick.Store(e.now.tick)
	if e.now.tick%e.stride == 0 {
		e.sample()
	}
	if !more {
		e.finish()
	}
	if e.untilP--; e.untilP <= 0 || !more {
		e.untilP = e.every
		e.publish()
	}
}

// finish ends a run: the motion is over, or no lane runs any more.
func (e *engine) finish() {
	if err := e.rig.Close(); err != nil {
		e.replies.put(reply{did: failedRun, err: err})
	}
	e.now.ended = true
	e.settle()
}

// sample says what the selected channel does.
func (e *engine) sample() {
	loop := e.rig.Lanes[e.now.lane].Loop
	r := loop.Row(e.now.channel)
	e.samples.put(sample{e.now.view, float64(e.now.tick) * e.rig.Step, r.Target, r.Command, r.Measured})
}

// publish says how all lanes stand.
func (e *engine) publish() {
	s := e.statuses.next()
	lanes, coefficients := s.lanes[:0], s.coefficients[:0]
	*s = e.now
	s.time = float64(e.now.tick) * e.rig.Step
	for _, l := range e.rig.Lanes {
		lanes = append(lanes, laneNow(l, e.now.channel))
	}
	loop := e.rig.Lanes[e.now.lane].Loop
	s.lanes = lanes
	s.coefficients = loop.Coefficients(e.now.channel, coefficients)
	s.ellipse, s.resting = loop.Subspace(e.now.channel), loop.AtRest(e.now.channel)
	s.dropped = e.samples.refused.Load()
	e.statuses.publish()
}

func laneNow(l *rtloop.Lane, channel int) laneStatus {
	loop := l.Loop
	delay := loop.Delay(channel)
	if loop.AtRest(channel) {
		delay = math.NaN()
	}
	return laneStatus{
		name: l.Name, method: loop.Method(channel), outcome: loop.Outcome(), trip: loop.Trip(),
		nrmse: loop.NRMSE(channel), delay: delay,
		margin: loop.Margin(), marginMin: loop.MarginMin(), added: loop.AddedDamping(),
		response: l.ResponseError(), judged: loop.Judged(),
	}
}

// start lets the engine run.
func (e *engine) start() { go e.run() }

// post hands a command to the engine, from one goroutine only. It reports
// false when the engine has no room for it.
func (e *engine) post(c command) bool {
	ok := e.commands.put(c)
	select {
	case e.wake <- struct{}{}:
	default:
	}
	return ok
}

// stop ends the engine and waits for it, but not for ever: it may hang.
func (e *engine) stop() {
	e.post(command{do: stopEngine})
	select {
	case <-e.done:
	case <-time.After(2 * time.Second):
	}
}
