package rtloop

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sync"

	"antelag/rtloop/excitation"
	"antelag/rtloop/gauge"
)

// Lane is one whole loop of a Rig with what is judged against the reference
// response.
type Lane struct {
	Name string
	Loop *Loop
	// Observe, when set, is called at the start and after every tick, after
	// the loop has been judged. An error stops this lane as interrupted and is
	// returned by Run.
	Observe func(*Loop) error
	// Edits are changes of the lane's compensators, in the order of their ticks.
	Edits []Edit

	squaredError, squaredReference gauge.Sum
	nextEdit                       int
	err                            error
}

// Rig runs several lanes side by side on the same motion, with the reference
// response: the same structure with a perfect actuator at real speed. Each
// lane computes exactly what it would compute alone.
type Rig struct {
	Motion    excitation.Source
	Reference *Loop // nil when the target is driven
	Lanes     []*Lane
	Ticks     int64   // length of the run
	Step      float64 // model seconds a tick

	drive driver
	ran   bool
	one   *block // of Advance
	done  int64  // ticks that Advance has done
}

// blockTicks is how many ticks go through the pipeline at once: long enough
// that handing over costs nothing, short enough to stay in cache.
const blockTicks = 1024

// block is a stretch of excitation and reference response.
type block struct {
	drive     []Drive
	reference []float64 // displacements of all levels, tick after tick
	ok        []bool    // whether the reference was sound at that tick
}

// Run carries all lanes to the end of the motion, or until none runs any
// more, or ctx ends; then the lanes that still ran are interrupted. progress,
// which may be nil, is told the ticks done. The error is a lane's Observe
// error, if any. A motion plays once, so a Rig runs once.
func (r *Rig) Run(ctx context.Context, progress func(done int64)) error {
	if r.ran {
		return errors.New("this rig has run; build it anew to run again")
	}
	r.ran = true
	r.start()
	full, free := make(chan *block, 2), make(chan *block, 3)
	for range cap(free) {
		free <- r.newBlock()
	}
	stop := make(chan struct{})
	var producer sync.WaitGroup
	producer.Go(func() { r.produce(full, free, stop) })
	done := int64(0)
	for b := range full {
		if ctx.Err() != nil || !r.runBlock(b) {
			break
		}
		done += int64(len(b.drive))
		free <- b
		if progress != nil {
			progress(done)
		}
	}
	close(stop)
	producer.Wait()
	return r.settle()
}

// Open puts everything at t = 0, to be carried on by Advance. A motion plays once,
// so a Rig is opened once.
func (r *Rig) Open() error {
	if r.ran {
		return errors.New("this rig has run; build it anew to run again")
	}
	r.ran = true
	r.start()
	r.one = r.newBlock()
	return nil
}

// Advance carries the reference and all lanes through one tick, in this goroutine,
// and reports whether there is another: the motion goes on and a lane runs. It
// comes to the same bits as Run, allocates nothing and takes no lock.
func (r *Rig) Advance() bool {
	if r.done >= r.Ticks {
		return false
	}
	return r.advance(1)
}

// AdvanceBlock is Advance for the next 1024 ticks, or as many as are left, at
// once: one lane after the other goes through all of them, which is quicker.
func (r *Rig) AdvanceBlock() bool {
	if r.done >= r.Ticks {
		return false
	}
	return r.advance(min(r.Ticks-r.done, blockTicks))
}

func (r *Rig) advance(ticks int64) bool {
	r.done += ticks
	r.one.drive = r.one.drive[:ticks]
	r.drive.fill(r.one.drive)
	if r.Reference != nil {
		r.runReference(r.one)
	}
	running := false
	for _, l := range r.Lanes {
		running = l.run(r.one) || running
	}
	return running && r.done < r.Ticks
}

// Close decides the outcomes after the last Advance and returns a lane's error, if
// any.
func (r *Rig) Close() error { return r.settle() }

// start puts everything at t = 0.
func (r *Rig) start() {
	r.drive = driver{source: r.Motion, step: r.Step}
	first := r.drive.first(r.target())
	if r.Reference != nil {
		r.Reference.Start(first)
	}
	for _, l := range r.Lanes {
		l.squaredError, l.squaredReference, l.nextEdit, l.err = gauge.Sum{}, gauge.Sum{}, 0, nil
		l.Loop.Start(first)
		l.observe()
	}
}

func (r *Rig) target() bool { return r.Lanes[0].Loop.integrator == nil }

func (r *Rig) newBlock() *block {
	b := &block{drive: make([]Drive, blockTicks)}
	if r.Reference != nil {
		b.reference = make([]float64, blockTicks*r.Reference.cfg.Structure.N())
		b.ok = make([]bool, blockTicks)
	}
	return b
}

// produce fills blocks ahead of the lanes until the motion ends.
func (r *Rig) produce(full chan<- *block, free <-chan *block, stop <-chan struct{}) {
	defer close(full)
	for left := r.Ticks; left > 0; {
		var b *block
		select {
		case <-stop:
			return
		case b = <-free:
		}
		b.drive = b.drive[:min(left, blockTicks)]
		r.drive.fill(b.drive)
		if r.Reference != nil {
			r.runReference(b)
		}
		left -= int64(len(b.drive))
		select {
		case <-stop:
			return
		case full <- b:
		}
	}
}

// runReference carries the reference response through a block. Once it has
// failed it stays failed.
func (r *Rig) runReference(b *block) {
	n := r.Reference.cfg.Structure.N()
	for i, d := range b.drive {
		b.ok[i] = r.Reference.Tick(d)
		copy(b.reference[i*n:(i+1)*n], r.Reference.integrator.X())
	}
}

// runBlock carries every lane through a block, in parallel, and reports
// whether any still runs.
func (r *Rig) runBlock(b *block) bool {
	if len(r.Lanes) == 1 {
		return r.Lanes[0].run(b)
	}
	running := make([]bool, len(r.Lanes))
	var wg sync.WaitGroup
	for i, l := range r.Lanes {
		wg.Go(func() { running[i] = l.run(b) })
	}
	wg.Wait()
	for _, on := range running {
		if on {
			return true
		}
	}
	return false
}

func (l *Lane) run(b *block) bool {
	for i, d := range b.drive {
		if l.nextEdit < len(l.Edits) {
			l.applyDue()
		}
		if l.Loop.outcome != Running {
			return false
		}
		l.Loop.Tick(d)
		l.compare(b, i)
		l.observe()
	}
	return l.Loop.outcome == Running
}

// compare adds this tick to the response error, unless it diverged. A reference
// that failed makes it undefined.
func (l *Lane) compare(b *block, i int) {
	if b.reference == nil || l.Loop.outcome == Diverged {
		return
	}
	if !b.ok[i] {
		l.squaredReference.Add(math.NaN())
		return
	}
	x := l.Loop.integrator.X()
	ref := b.reference[i*len(x):]
	var e, s float64
	for k := range x {
		d := x[k] - ref[k]
		e += d * d
		s += ref[k] * ref[k]
	}
	l.squaredError.Add(e)
	l.squaredReference.Add(s)
}

func (l *Lane) observe() {
	if l.Observe == nil || l.err != nil {
		return
	}
	if l.err = l.Observe(l.Loop); l.err != nil {
		l.Loop.outcome = Interrupted
	}
}

// settle decides the outcomes at the end of a run and returns the first
// observer's error.
func (r *Rig) settle() error {
	var failed error
	for _, l := range r.Lanes {
		switch {
		case l.err != nil && failed == nil:
			failed = fmt.Errorf("lane %s: %w", l.Name, l.err)
		case l.Loop.outcome != Running:
		case l.Loop.ticks == r.Ticks:
			l.Loop.outcome = Completed
		default:
			l.Loop.outcome = Interrupted
		}
	}
	return failed
}

// Results gathers the figures of all lanes at the end of a run.
func (r *Rig) Results() []LaneResult {
	out := make([]LaneResult, len(r.Lanes))
	var wg sync.WaitGroup
	for i, l := range r.Lanes {
		wg.Go(func() {
			out[i] = l.Loop.Result()
			out[i].Name = l.Name
			out[i].ResponseError = Figure(l.ResponseError())
			if r.Reference != nil && r.Reference.outcome == Diverged {
				out[i].ResponseError = Figure(math.NaN()) // also where both failed in the same tick
			}
		})
	}
	wg.Wait()
	return out
}

// ResponseError returns rms(x − x_ref)/rms(x_ref) over all levels and ticks so
// far; NaN where there is no sound reference.
func (l *Lane) ResponseError() float64 {
	ref := l.squaredReference.Value()
	if !(ref > 0) {
		return math.NaN()
	}
	return math.Sqrt(l.squaredError.Value() / ref)
}
