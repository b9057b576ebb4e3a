package compensator

// row is one line of the least-squares problem: the command, m, that belongs
// to a measured displacement, m, velocity, m/s, and acceleration, m/s².
type row struct{ y, v, a, u float64 }

// sums are the normal equations of some rows: the sums of products.
type sums struct {
	yy, yv, ya, vv, va, aa float64
	uy, uv, ua             float64
	y                      float64
}

func (s *sums) add(r *row) {
	s.yy += r.y * r.y
	s.yv += r.y * r.v
	s.ya += r.y * r.a
	s.vv += r.v * r.v
	s.va += r.v * r.a
	s.aa += r.a * r.a
	s.uy += r.u * r.y
	s.uv += r.u * r.v
	s.ua += r.u * r.a
	s.y += r.y
}

func (s *sums) remove(r *row) {
	s.yy -= r.y * r.y
	s.yv -= r.y * r.v
	s.ya -= r.y * r.a
	s.vv -= r.v * r.v
	s.va -= r.v * r.a
	s.aa -= r.a * r.a
	s.uy -= r.u * r.y
	s.uv -= r.u * r.v
	s.ua -= r.u * r.a
	s.y -= r.y
}

// window keeps the normal equations of the newest rows: the newest is added
// and the oldest removed, so a tick costs the same for any length.
//
// What rounding leaves behind when a row is removed would pile up over a day.
// Therefore a second set of sums starts from nothing, only adds, and after as
// many rows as the window holds is the sum of just those rows: then it takes
// the place of the running sums. No error lives longer than two windows.
type window struct {
	ring  []row
	mask  int
	head  int // where the next row goes
	size  int // rows of a full window
	count int // rows there are

	run   sums // of the rows in the window
	fresh sums // of the rows since the last change-over
	since int
}

func (w *window) push(r row) {
	if w.count == w.size {
		w.run.remove(&w.ring[(w.head-w.size)&w.mask])
	} else {
		w.count++
	}
	w.ring[w.head&w.mask] = r
	w.head = (w.head + 1) & w.mask
	w.run.add(&r)
	w.fresh.add(&r)
	w.since++
	if w.since >= w.size {
		w.run, w.fresh, w.since = w.fresh, sums{}, 0
	}
}

// clear forgets all rows.
func (w *window) clear() {
	w.head, w.count, w.since = 0, 0, 0
	w.run, w.fresh = sums{}, sums{}
}

// resize changes the length and keeps the newest rows that fit.
func (w *window) resize(size int) {
	kept := make([]row, min(w.count, size))
	for i := range kept {
		kept[i] = w.ring[(w.head-len(kept)+i)&w.mask]
	}
	if n := ringSize(size); n != len(w.ring) {
		w.ring = make([]row, n)
		w.mask = n - 1
	}
	w.size = size
	w.clear()
	for _, r := range kept {
		w.push(r)
	}
}
