package tui

import "sync/atomic"

// ring carries values from one goroutine to one other without locks and
// without either waiting: a full ring refuses, an empty one has nothing. What
// is refused is counted.
type ring[T any] struct {
	slots   []T // a power of two
	mask    uint64
	_       [64]byte // writer and reader do not share a cache line
	head    atomic.Uint64
	refused atomic.Int64
	_       [64]byte
	tail    atomic.Uint64
}

// newRing makes a ring of at least that many slots.
func newRing[T any](slots int) *ring[T] {
	n := 1
	for n < slots {
		n *= 2
	}
	return &ring[T]{slots: make([]T, n), mask: uint64(n - 1)}
}

// put is for the writer alone. It reports false, and counts it, when the ring
// is full.
func (r *ring[T]) put(v T) bool {
	head := r.head.Load()
	if head-r.tail.Load() > r.mask {
		r.refused.Store(r.refused.Load() + 1)
		return false
	}
	r.slots[head&r.mask] = v
	r.head.Store(head + 1)
	return true
}

// get is for the reader alone.
func (r *ring[T]) get() (v T, ok bool) {
	tail := r.tail.Load()
	if tail == r.head.Load() {
		return v, false
	}
	slot := &r.slots[tail&r.mask]
	v = *slot
	var none T
	*slot = none // what it held may be forgotten
	r.tail.Store(tail + 1)
	return v, true
}

// waiting reports, for the reader, whether there is something to get.
func (r *ring[T]) waiting() bool { return r.tail.Load() != r.head.Load() }

// triple hands the newest of a value from one goroutine to one other: the
// writer always has a value to fill, the reader always the last one that was
// published, and neither waits for the other.
type triple[T any] struct {
	values [3]T
	back   uint32        // the writer's
	front  uint32        // the reader's
	middle atomic.Uint32 // the one between, with fresh set when it is newer than the reader's
}

const fresh = 4

func newTriple[T any]() *triple[T] {
	t := &triple[T]{back: 0, front: 2}
	t.middle.Store(1)
	return t
}

// next is the value that the writer may fill. It holds something old.
func (t *triple[T]) next() *T { return &t.values[t.back] }

// publish makes the filled value the newest.
func (t *triple[T]) publish() { t.back = t.middle.Swap(t.back|fresh) &^ fresh }

// latest is the newest value, the reader's until it asks again, and whether it
// is newer than the last one.
func (t *triple[T]) latest() (*T, bool) {
	if t.middle.Load()&fresh == 0 {
		return &t.values[t.front], false
	}
	t.front = t.middle.Swap(t.front) &^ fresh
	return &t.values[t.front], true
}
