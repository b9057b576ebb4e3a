package pace

import (
	"math"
	"runtime"
	"runtime/debug"
	"slices"
	"strings"
	"testing"
)

// settings is what Lock changes for the whole process.
type settings struct {
	percent, processors int
	limit               int64
}

func current() settings {
	s := settings{debug.SetGCPercent(100), runtime.GOMAXPROCS(0), debug.SetMemoryLimit(-1)}
	debug.SetGCPercent(s.percent)
	return s
}

// keeper is a goroutine that has locked a Pacer.
type keeper struct {
	*Pacer
	words  []string
	unlock chan chan bool
}

func keep(t *testing.T) *keeper {
	t.Helper()
	return keepBy(t, (*Pacer).Lock)
}

func keepBy(t *testing.T, lock func(*Pacer) []string) *keeper {
	t.Helper()
	p, _ := onFake(t, 1e-3)
	if r := p.Report(); len(r.Granted) != 0 || r.RealTime {
		t.Errorf("granted before Lock: %q", r.Granted)
	}
	k := &keeper{Pacer: p, unlock: make(chan chan bool)}
	locked := make(chan bool)
	go func() {
		k.words = lock(p)
		if again := lock(p); !slices.Equal(k.words, again) { // changes nothing
			t.Errorf("granted %q, then %q", k.words, again)
		}
		locked <- true
		done := <-k.unlock
		p.Unlock()
		p.Unlock() // changes nothing
		done <- true
	}()
	<-locked
	return k
}

func (k *keeper) release() {
	done := make(chan bool)
	k.unlock <- done
	<-done
}

// TestLockAndUnlock: the settings of the process while locked, and that all is
// as before at the end, with two Pacers that unlock in any order.
func TestLockAndUnlock(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(2))
	defer debug.SetGCPercent(debug.SetGCPercent(77))
	before := current()
	for _, first := range []int{0, 1} {
		both := []*keeper{keep(t), keep(t)}
		for _, k := range both {
			if !slices.Equal(k.words, both[0].words) || !slices.Equal(k.words, k.Report().Granted) {
				t.Errorf("granted %q, then %q, reported %q", both[0].words, k.words, k.Report().Granted)
			}
		}
		locked := current()
		if locked.percent != -1 || locked.processors != room() {
			t.Errorf("locked: %+v", locked)
		}
		if room := locked.limit - inUse(); room < growth/2 || room > growth*3/2 {
			t.Errorf("memory may grow by %d bytes", room)
		}
		both[first].release()
		if got := current(); got != locked {
			t.Errorf("one is still locked: %+v, was %+v", got, locked)
		}
		both[1-first].release()
		if got := current(); got != before {
			t.Errorf("unlocked: %+v, was %+v", got, before)
		}
	}
}

// TestMemoryLimitStands: a memory limit that somebody has set is not raised.
func TestMemoryLimitStands(t *testing.T) {
	limit := inUse() + growth/4
	defer debug.SetMemoryLimit(debug.SetMemoryLimit(limit))
	p, _ := onFake(t, 1e-3)
	p.Lock()
	if got := debug.SetMemoryLimit(-1); got != limit {
		t.Errorf("the limit is %d, want %d", got, limit)
	}
	p.Unlock()
	if got := debug.SetMemoryLimit(-1); got != limit {
		t.Errorf("the limit is %d, want %d", got, limit)
	}
	debug.SetMemoryLimit(math.MaxInt64)
}

// TestPanicUnlocks: a tick that panics leaves everything as it was.
func TestPanicUnlocks(t *testing.T) {
	before := current()
	p, _ := onFake(t, 1e-3)
	func() {
		defer func() {
			if r := recover(); r != "broken" {
				t.Errorf("recovered %v", r)
			}
		}()
		p.LockProgram()
		defer p.Unlock()
		p.Run(t.Context(), 10, func() { panic("broken") })
	}()
	if got := current(); got != before {
		t.Errorf("%+v, was %+v", got, before)
	}
	counts(t, p, 1, 0, 0, 0)
}

// TestWords: every step says whether it was granted or why not.
func TestWords(t *testing.T) {
	p, _ := onFake(t, 1e-3)
	words := p.Lock()
	p.Unlock()
	for _, want := range []string{"a thread of its own", "real-time priority", "memory", "garbage collector held off"} {
		if !strings.Contains(strings.Join(words, "\n"), want) {
			t.Errorf("nothing is said of %q: %q", want, words)
		}
	}
}
