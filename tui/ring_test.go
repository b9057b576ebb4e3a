package tui

import (
	"runtime"
	"testing"
)

// Whatever the two sides do, values arrive in order, and each that was
// accepted arrives once.
func TestRingKeepsOrder(t *testing.T) {
	r := newRing[int](5)
	if len(r.slots) != 8 {
		t.Fatalf("5 slots became %d, want the next power of two, 8", len(r.slots))
	}
	const n = 100_000
	accepted := make(chan int)
	go func() {
		sent := 0
		for i := range n {
			if r.put(i) {
				sent++
			} else {
				runtime.Gosched()
			}
		}
		accepted <- sent
	}()
	got, last, sent := 0, -1, -1
	for sent < 0 || got < sent {
		select {
		case sent = <-accepted:
		default:
		}
		v, ok := r.get()
		if !ok {
			runtime.Gosched()
			continue
		}
		if v <= last {
			t.Fatalf("%d came after %d", v, last)
		}
		got, last = got+1, v
	}
	if got != sent || int64(n-sent) != r.refused.Load() {
		t.Errorf("%d sent, %d arrived, %d refused, of %d", sent, got, r.refused.Load(), n)
	}
}

func TestFullRingRefusesAndCounts(t *testing.T) {
	r := newRing[int](4)
	for i := range 6 {
		if ok := r.put(i); ok != (i < 4) {
			t.Errorf("put %d: %v", i, ok)
		}
	}
	if r.refused.Load() != 2 {
		t.Errorf("refused %d, want 2", r.refused.Load())
	}
	if v, ok := r.get(); v != 0 || !ok {
		t.Errorf("got %d, %v; a full ring keeps the oldest", v, ok)
	}
	if !r.put(9) {
		t.Error("a slot was free")
	}
	for _, want := range []int{1, 2, 3, 9} {
		if v, ok := r.get(); v != want || !ok {
			t.Errorf("got %d, %v, want %d", v, ok, want)
		}
	}
	if _, ok := r.get(); ok || r.waiting() {
		t.Error("an empty ring gave something")
	}
}

// The reader never sees a value half written, nor an older one after a newer.
func TestTripleGivesTheNewestWhole(t *testing.T) {
	type pair struct{ a, b int }
	x := newTriple[pair]()
	const n = 100_000
	done := make(chan struct{})
	go func() {
		defer close(done)
		for i := 1; i <= n; i++ {
			*x.next() = pair{i, -i}
			x.publish()
		}
	}()
	last := 0
	for last < n {
		v, newer := x.latest()
		if v.a != -v.b || v.a < last || newer && v.a == last {
			t.Fatalf("got %+v after %d, newer %v", *v, last, newer)
		}
		last = v.a
		runtime.Gosched()
	}
	<-done
	if _, newer := x.latest(); newer {
		t.Error("nothing newer was published")
	}
}

func TestRingAndTripleDoNotAllocate(t *testing.T) {
	r, x := newRing[sample](16), newTriple[int]()
	if n := testing.AllocsPerRun(100, func() {
		r.put(sample{})
		r.get()
		*x.next()++
		x.publish()
		x.latest()
	}); n != 0 {
		t.Errorf("%g allocations", n)
	}
}
