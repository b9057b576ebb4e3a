package pace

import (
	"os"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"testing"

	"golang.org/x/sys/unix"
)

// thread is what Lock changes for the thread.
type thread struct {
	policy, priority uint32
	nice             int32
	slice            uint64
	slack            int
}

func asIs(t *testing.T) thread {
	t.Helper()
	a, err := unix.SchedGetAttr(0, 0)
	if err != nil {
		t.Fatal(err)
	}
	slack, err := unix.PrctlRetInt(unix.PR_GET_TIMERSLACK, 0, 0, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	return thread{a.Policy, a.Priority, a.Nice, a.Runtime, slack}
}

// locked is how much memory is locked, as the kernel says.
func locked(t *testing.T) string {
	t.Helper()
	status, err := os.ReadFile("/proc/self/status")
	if err != nil {
		t.Fatal(err)
	}
	return regexp.MustCompile(`VmLck:\s*(\d+) kB`).FindStringSubmatch(string(status))[1]
}

// onOwnThread runs f on a thread that ends with it.
func onOwnThread(f func()) {
	done := make(chan struct{})
	go func() {
		defer close(done)
		runtime.LockOSThread()
		f()
	}()
	<-done
}

// TestThreadRestored: while locked the thread is as the words say, whatever
// this machine grants; afterwards it is as before.
func TestThreadRestored(t *testing.T) {
	onOwnThread(func() {
		before := asIs(t)
		p, _ := onFake(t, 1e-3)
		words := p.Lock()
		now := asIs(t)
		if p.Report().RealTime {
			if now.policy != schedFIFO || now.priority != priority || !slices.Contains(words, "real-time priority 80 (SCHED_FIFO)") {
				t.Errorf("%+v, granted %q", now, words)
			}
		} else if now.policy != before.policy || !strings.Contains(strings.Join(words, "\n"), "no real-time priority: ") {
			t.Errorf("%+v, granted %q", now, words)
		}
		if is, said := locked(t) != "0", slices.Contains(words, "memory locked"); is != said {
			t.Errorf("%s kB are locked, granted %q", locked(t), words)
		}
		p.Unlock()
		if got := asIs(t); got != before {
			t.Errorf("%+v, was %+v", got, before)
		}
		if got := locked(t); got != "0" {
			t.Errorf("%s kB are still locked", got)
		}
	})
}

// TestSlices: a thread of ordinary priority has the short slice while a Pacer
// of another thread is locked, where the kernel knows slices, and its own
// again afterwards.
func TestSlices(t *testing.T) {
	onOwnThread(func() {
		before := asIs(t)
		if before.policy != schedOther {
			t.Fatalf("the tests run with the policy %d", before.policy)
		}
		other := keep(t)
		words := other.words
		is := asIs(t)
		switch {
		case slices.Contains(words, "short time slices"):
			if is.slice != slice {
				t.Errorf("%+v, granted %q", is, words)
			}
		case slices.Contains(words, "no short time slices: Linux has them since 6.12"):
			if is != before {
				t.Errorf("%+v, was %+v", is, before)
			}
		default:
			t.Errorf("granted %q", words)
		}
		other.release()
		if got := asIs(t); got != before {
			t.Errorf("%+v, was %+v", got, before)
		}
	})
}

// TestProgram: while a Pacer holds LockProgram, threads have the priority of
// helpers, those of Background ordinary priority, whichever came first, and
// all is as before at the end, for threads that were started meanwhile too.
func TestProgram(t *testing.T) {
	onOwnThread(func() {
		before := asIs(t)
		helped, plain := before, before
		first := keepBy(t, (*Pacer).LockProgram)
		if first.Report().RealTime {
			if !slices.Contains(first.words, "real-time priority 1 for the program's other threads") {
				t.Errorf("granted %q", first.words)
			}
			helped.policy, helped.priority = schedFIFO, helperPriority
		}
		same := func(what string, want thread) {
			t.Helper()
			if got := asIs(t); got.policy != want.policy || got.priority != want.priority || got.nice != want.nice {
				t.Errorf("%s: %+v, want %+v", what, got, want)
			}
		}
		same("raised", helped)
		done := Background()
		same("in the background", plain)
		second := keepBy(t, (*Pacer).LockProgram)
		same("in the background, raised again", plain)
		done()
		same("done", helped)
		first.release()
		same("one is left", helped)

		ask, other := make(chan bool), make(chan thread)
		go func() { // with a thread that is new, as far as Go starts one
			runtime.LockOSThread()
			for range ask {
				other <- asIs(t)
			}
		}()
		ask <- true
		if got := <-other; got.policy != helped.policy || got.priority != helped.priority {
			t.Errorf("another thread: %+v, want %+v", got, helped)
		}
		done = Background()
		second.release()
		same("in the background, lowered", plain)
		done()
		ask <- true
		got := <-other
		got.slack = before.slack // what starts with real-time priority has an exact timer for good
		if got != before {
			t.Errorf("another thread, lowered: %+v, was %+v", got, before)
		}
		close(ask)
		if got := asIs(t); got != before {
			t.Errorf("%+v, was %+v", got, before)
		}
		done = Background() // with nothing locked
		same("in the background of nothing", before)
		third := keepBy(t, (*Pacer).LockProgram)
		same("in the background from before", plain)
		done()
		same("in front", helped)
		third.release()
		if got := asIs(t); got != before {
			t.Errorf("at the end %+v, was %+v", got, before)
		}
	})
	everyThread(func(id int, is *unix.SchedAttr) *unix.SchedAttr {
		if is.Policy != schedOther || is.Runtime == slice {
			t.Errorf("thread %d is left with %+v", id, is)
		}
		return nil
	})
}

// TestWithoutPrivilege: on a thread without capabilities nothing is granted
// but what everybody may have, and the words say why; where a limit allows
// real-time priority without capabilities, it is granted and given back.
func TestWithoutPrivilege(t *testing.T) {
	for _, c := range []struct {
		allowed uint64 // RLIMIT_RTPRIO
		want    string
	}{
		{0, "no real-time priority: operation not permitted"},
		{99, "real-time priority 80 (SCHED_FIFO)"},
	} {
		var was unix.Rlimit
		if err := unix.Getrlimit(unix.RLIMIT_RTPRIO, &was); err != nil {
			t.Fatal(err)
		}
		if err := unix.Setrlimit(unix.RLIMIT_RTPRIO, &unix.Rlimit{Cur: c.allowed, Max: max(c.allowed, was.Max)}); err != nil {
			if c.allowed > was.Max {
				continue // only with privilege can the limit be raised to try it
			}
			t.Fatal(err)
		}
		onOwnThread(func() {
			var none [2]unix.CapUserData
			header := unix.CapUserHeader{Version: unix.LINUX_CAPABILITY_VERSION_3}
			if err := unix.Capset(&header, &none[0]); err != nil { // of this thread alone
				t.Fatal(err)
			}
			before := asIs(t)
			p, _ := onFake(t, 1e-3)
			words := p.Lock()
			if !slices.Contains(words, c.want) || p.Report().RealTime != (c.allowed > 0) {
				t.Errorf("limit %d: granted %q", c.allowed, words)
			}
			if !slices.Contains(words, "timer not rounded") || c.allowed == 0 && asIs(t).slack != 1 {
				t.Errorf("limit %d: %+v, granted %q", c.allowed, asIs(t), words)
			}
			p.Unlock()
			if got := asIs(t); got != before {
				t.Errorf("limit %d: %+v, was %+v", c.allowed, got, before)
			}
		})
		if err := unix.Setrlimit(unix.RLIMIT_RTPRIO, &was); err != nil {
			t.Fatal(err)
		}
	}
}
