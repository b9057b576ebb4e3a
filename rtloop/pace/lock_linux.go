package pace

import (
	"errors"

	"golang.org/x/sys/unix"
)

// Real-time priorities go from 1 to 99. That of the tick's thread is above the
// interrupt threads of a real-time kernel (50) and below its watchdogs (99);
// that of Go's other threads, below all that is anybody's.
const (
	priority       = 80
	helperPriority = 1
)

// What golang.org/x/sys does not name (linux/sched.h).
const (
	schedOther       = 0
	schedFIFO        = 1
	schedResetOnFork = 1
)

// prepareThread prepares the calling thread. Its undo is told whether the
// program's other threads are raised now, and reports whether the thread is
// again like those.
func prepareThread(g *grants) (undo func(raised bool) bool) {
	exact := exactTimer(g)
	priority := raisePriority(g)
	return func(raised bool) bool {
		good := priority(raised)
		return exact() && good
	}
}

func exactTimer(g *grants) (undo func() bool) {
	slack, err := unix.PrctlRetInt(unix.PR_GET_TIMERSLACK, 0, 0, 0, 0)
	if err == nil {
		err = unix.Prctl(unix.PR_SET_TIMERSLACK, 1, 0, 0, 0)
	}
	if err != nil {
		g.say("timer rounded: %v", err)
		return func() bool { return true }
	}
	g.say("timer not rounded")
	return func() bool { return unix.Prctl(unix.PR_SET_TIMERSLACK, uintptr(slack), 0, 0, 0) == nil }
}

func raisePriority(g *grants) (undo func(raised bool) bool) {
	was, err := unix.SchedGetAttr(0, 0)
	if err == nil {
		// Whatever the thread starts is not to inherit its priority.
		err = unix.SchedSetAttr(0, &unix.SchedAttr{Size: unix.SizeofSchedAttr,
			Policy: schedFIFO, Priority: priority, Flags: schedResetOnFork}, 0)
	}
	if err != nil {
		g.say("no real-time priority: %v", err)
		return func(bool) bool { return true }
	}
	g.realTime = true
	g.say("real-time priority %d (SCHED_FIFO)", priority)
	return func(raised bool) bool { return restorePriority(was, raised) == nil }
}

func restorePriority(was *unix.SchedAttr, raised bool) error {
	back := *was
	switch {
	case back.Policy == schedOther && raised, isHelper(&back) && raised:
		back = *helper()
	case back.Policy == schedOther, isHelper(&back):
		back = *ordinary(0, 0)
	}
	back.Flags |= was.Flags & schedResetOnFork
	err := unix.SchedSetAttr(0, &back, 0)
	if errors.Is(err, unix.EPERM) {
		// Without privilege the priority may be lowered, but the mark that
		// children do not inherit it stays. It means little then.
		back.Flags |= schedResetOnFork
		err = unix.SchedSetAttr(0, &back, 0)
	}
	return err
}

// lockMemory keeps what is in use in memory. Pages are locked as they are
// first touched: Go reserves far more than it uses. Mappings made later are
// left alone (no MCL_FUTURE), because beyond a limit on locked memory they
// would fail, and the program with them.
func lockMemory(g *grants) (undo func()) {
	err := unix.Mlockall(unix.MCL_CURRENT | unix.MCL_ONFAULT)
	var limit unix.Rlimit
	switch {
	case err == nil:
		g.say("memory locked")
		return func() { _ = unix.Munlockall() } // it has no error but "not implemented"
	case errors.Is(err, unix.ENOMEM) && unix.Getrlimit(unix.RLIMIT_MEMLOCK, &limit) == nil:
		g.say("memory not locked: more than the limit of %d KiB (RLIMIT_MEMLOCK)", limit.Cur>>10)
	default:
		g.say("memory not locked: %v", err)
	}
	return func() {}
}
