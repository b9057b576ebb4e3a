package pace

import (
	"os"
	"strconv"

	"golang.org/x/sys/unix"
)

// slice is the shortest time slice that Linux gives, ns.
const slice = 100_000

// shortenSlices asks for the shortest time slice for every thread of ordinary
// priority. The shorter its slice, the sooner a thread runs that has just
// become ready, while its share of the processor stays what it was. That
// helps the tick where it has no real-time priority; and where it has, it
// helps the threads that Go needs every some milliseconds to put a goroutine
// off its thread and on again, which otherwise wait for the slices of other
// programs to end.
func shortenSlices(g *grants) (undo func()) {
	if shorten() == 0 {
		g.say("no short time slices: Linux has them since 6.12")
		return func() {}
	}
	g.say("short time slices")
	return func() {
		everyThread(func(id int, is *unix.SchedAttr) *unix.SchedAttr {
			if is.Policy != schedOther || is.Runtime != slice {
				return nil
			}
			return ordinary(id, 0)
		})
	}
}

// shorten says of how many threads the slice then is short.
func shorten() (short int) {
	everyThread(func(id int, is *unix.SchedAttr) *unix.SchedAttr {
		switch {
		case is.Policy != schedOther:
		case is.Runtime == slice:
			short++
		default:
			return ordinary(id, slice)
		}
		return nil
	})
	return short
}

// raiseThreads gives all threads of ordinary priority but those of Background
// the priority of helpers. What they start inherits it.
func raiseThreads(g *grants, backgrounds map[int]bool) {
	everyThread(func(id int, is *unix.SchedAttr) *unix.SchedAttr {
		if is.Policy != schedOther || backgrounds[id] {
			return nil
		}
		return helper()
	})
	g.say("real-time priority %d for the program's other threads", helperPriority)
}

// lowerThreads undoes raiseThreads. Threads that were started meanwhile are
// left with a timer that is not rounded, which the kernel gave them; it does
// no harm.
func lowerThreads() {
	everyThread(func(id int, is *unix.SchedAttr) *unix.SchedAttr {
		if !isHelper(is) {
			return nil
		}
		return ordinary(id, 0)
	})
}

// raiseThread and lowerThread do that to one. A thread that cannot be lowered
// was not raised; one that cannot be raised stays as it is.

func raiseThread(id int) { _ = unix.SchedSetAttr(id, helper(), 0) }

func lowerThread(id int, slice uint64) {
	if is, err := unix.SchedGetAttr(id, 0); err == nil && isHelper(is) {
		_ = unix.SchedSetAttr(id, ordinary(id, slice), 0)
	}
}

func thisThread() int { return unix.Gettid() }

func helper() *unix.SchedAttr {
	return &unix.SchedAttr{Size: unix.SizeofSchedAttr, Policy: schedFIFO, Priority: helperPriority}
}

func isHelper(a *unix.SchedAttr) bool {
	return a.Policy == schedFIFO && a.Priority == helperPriority
}

// ordinary is ordinary priority for a thread, with the niceness it has or had,
// and a slice, 0 for what the kernel gives by itself.
func ordinary(id int, slice uint64) *unix.SchedAttr {
	a := &unix.SchedAttr{Size: unix.SizeofSchedAttr, Policy: schedOther, Runtime: slice}
	if n, err := unix.Getpriority(unix.PRIO_PROCESS, id); err == nil {
		a.Nice = int32(20 - n) // as the kernel counts
	}
	return a
}

// everyThread changes each thread of the program to what change returns for
// it, unless that is nil. It goes through them until there is nothing to
// change: what a thread starts meanwhile inherits what that thread was.
func everyThread(change func(id int, is *unix.SchedAttr) *unix.SchedAttr) {
	for again, round := true, 0; again && round < 4; round++ {
		again = false
		threads, _ := os.ReadDir("/proc/self/task") // without it there are none
		for _, t := range threads {
			id, err := strconv.Atoi(t.Name())
			if err != nil {
				continue
			}
			is, err := unix.SchedGetAttr(id, 0)
			if err != nil {
				continue // it has ended
			}
			if to := change(id, is); to != nil {
				to.Flags |= is.Flags & schedResetOnFork
				again = unix.SchedSetAttr(id, to, 0) == nil || again
			}
		}
	}
}
