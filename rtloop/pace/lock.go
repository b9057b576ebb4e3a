package pace

import (
	"fmt"
	"runtime"
	"runtime/debug"
	"runtime/metrics"
	"slices"
	"sync"
)

// Lock prepares the goroutine that runs the ticks, as far as the machine
// allows, and says in words what was granted, and what was not and why:
//
//   - the goroutine has its thread for itself;
//   - the thread has real-time priority (Linux: SCHED_FIFO), so that nothing
//     of ordinary priority delays a tick;
//   - the kernel does not round when it wakes the thread (Linux);
//   - all threads of the program run sooner once they are ready, by short time
//     slices (Linux, since 6.12);
//   - memory in use is not swapped out (Linux: mlockall);
//   - Go may run more goroutines at once than there are processors, so that
//     the tick need not wait until another goroutine makes room. That holds
//     as long as no more goroutines compute than there are processors
//     (runtime.NumCPU): leave background work at less than that;
//   - the garbage collector is held off: it runs once now, and then only when
//     memory has grown by 256 MiB, or to GOMEMLIMIT if that comes first,
//     instead of whenever the heap has doubled. Ticks that allocate nothing
//     do not bring it on.
//
// See LockProgram for more. All but the first three are the whole program's.
// Unlock undoes everything;
// defer it on the same goroutine, which locks one Pacer at a time. A tick that takes longer than its period
// keeps a processor with real-time priority to itself, but for what the
// kernel sets aside for others (Linux: 5 %).
func (p *Pacer) Lock() (granted []string) {
	if p.undo != nil {
		return p.Report().Granted
	}
	var g grants
	runtime.LockOSThread()
	g.say("a thread of its own")
	restore := process.prepare(&g)
	p.undo = append(p.undo, func() {
		// A thread that cannot be put back as it was stays locked; Go ends
		// it together with the goroutine.
		if restore() {
			runtime.UnlockOSThread()
		}
	})
	process.hold(&g)
	p.undo = append(p.undo, process.release)
	p.shown.Lock()
	p.granted = g
	p.shown.Unlock()
	return slices.Clone(g.words)
}

// LockProgram is Lock for a program that is there for its ticks. It also gives
// all other threads of the program real-time priority, below that of the tick
// (Linux; where Lock got none, it does no more than Lock). Go takes every
// goroutine off its thread now and then, the tick's too, and needs another
// thread to put it on again; with ordinary priority that one may have to wait
// for other programs, for many milliseconds on a busy machine.
//
// Whatever computes for longer than a moment must then say so by Background,
// or it starves the machine, and the tick's helpers with it.
func (p *Pacer) LockProgram() (granted []string) {
	if p.undo != nil {
		return p.Report().Granted
	}
	p.Lock()
	p.shown.Lock()
	defer p.shown.Unlock()
	if p.granted.realTime {
		process.raise(&p.granted)
		p.undo = append(p.undo, process.lower)
	}
	return slices.Clone(p.granted.words)
}

// Background gives the calling goroutine a thread of its own that has ordinary
// priority, whatever a Pacer has locked or locks, until done is called on it.
func Background() (done func()) {
	runtime.LockOSThread()
	thread := process.background()
	return func() {
		process.foreground(thread)
		runtime.UnlockOSThread()
	}
}

// Unlock undoes what Lock did. Without Lock it does nothing.
func (p *Pacer) Unlock() {
	for _, undo := range slices.Backward(p.undo) {
		undo()
	}
	p.undo = nil
}

// grants is what Lock was granted.
type grants struct {
	words    []string
	realTime bool
}

func (g *grants) say(format string, values ...any) {
	g.words = append(g.words, fmt.Sprintf(format, values...))
}

// growth is how much memory may grow before the garbage collector runs, bytes.
const growth = 256 << 20

// room is how many goroutines Go may run at once: those that compute, one for
// each processor; the tick, a screen and what else wakes up for a moment; and
// the garbage collector, which takes a quarter of all.
func room() int { return 2*runtime.NumCPU() + 2 }

// process is what Lock changes for the whole process.
var process shared

type shared struct {
	lock    sync.Mutex
	holders int // the first changes it, the last changes it back
	words   []string
	undo    []func()

	raisers     int          // Pacers that hold LockProgram
	backgrounds map[int]bool // threads of Background
}

// prepare prepares the thread while nobody else goes through the threads.
func (s *shared) prepare(g *grants) (undo func() bool) {
	s.lock.Lock()
	defer s.lock.Unlock()
	restore := prepareThread(g)
	return func() bool {
		s.lock.Lock()
		defer s.lock.Unlock()
		return restore(s.raisers > 0)
	}
}

func (s *shared) raise(g *grants) {
	s.lock.Lock()
	defer s.lock.Unlock()
	s.raisers++
	raiseThreads(g, s.backgrounds)
}

func (s *shared) lower() {
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.raisers--; s.raisers == 0 {
		lowerThreads()
	}
}

func (s *shared) background() (thread int) {
	s.lock.Lock()
	defer s.lock.Unlock()
	thread = thisThread()
	if s.backgrounds == nil {
		s.backgrounds = map[int]bool{}
	}
	s.backgrounds[thread] = true
	lowerThread(thread, slice)
	return thread
}

func (s *shared) foreground(thread int) {
	s.lock.Lock()
	defer s.lock.Unlock()
	delete(s.backgrounds, thread)
	if s.raisers > 0 {
		raiseThread(thread)
	}
}

func (s *shared) hold(g *grants) {
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.holders++; s.holders == 1 {
		var own grants
		s.undo = append(s.undo, shortenSlices(&own), lockMemory(&own), makeRoom(), holdCollector(&own))
		s.words = own.words
	}
	g.words = append(g.words, s.words...)
}

func (s *shared) release() {
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.holders--; s.holders > 0 {
		return
	}
	for _, undo := range slices.Backward(s.undo) {
		undo()
	}
	s.undo = nil
}

func makeRoom() (undo func()) {
	was := runtime.GOMAXPROCS(0)
	if was >= room() {
		return func() {}
	}
	runtime.GOMAXPROCS(room())
	return func() { runtime.GOMAXPROCS(was) }
}

func holdCollector(g *grants) (undo func()) {
	runtime.GC()
	percent, limit := debug.SetGCPercent(-1), debug.SetMemoryLimit(-1)
	debug.SetMemoryLimit(min(limit, inUse()+growth))
	g.say("garbage collector held off until memory has grown by %d MiB", growth>>20)
	return func() {
		debug.SetMemoryLimit(limit)
		debug.SetGCPercent(percent)
	}
}

// inUse is the memory that counts towards the memory limit, bytes.
func inUse() int64 {
	total := []metrics.Sample{{Name: "/memory/classes/total:bytes"}, {Name: "/memory/classes/heap/released:bytes"}}
	metrics.Read(total)
	return int64(total[0].Value.Uint64() - total[1].Value.Uint64())
}
