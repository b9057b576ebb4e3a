package runlog

// holes keeps samples until they are whole. A number that is missing in one column
// gets the straight line between its neighbours, up to a second of them; the last
// samples of a log, behind which a column has no number any more, are left out.
type holes struct {
	first   int64 // index of the first sample taken
	out     int   // samples taken
	n       int   // samples held
	columns [][]float64
	taken   [][]float64 // by column, the block given out
	between []float64   // room for one sample
	loose   []bool
	open    []int     // by column, where a hole begins; −1: there is none
	before  []float64 // by column, the sample before the first held
	lost    int       // column whose hole is too long, −1: none
	line    int       // where that hole begins

	missing      []int64 // numbers bridged, by column
	firstMissing []int   // line
	cut          int64   // samples left out at the end
	cutColumn    int
}

func (h *holes) prepare(c *chosen) {
	n := len(c.columns)
	h.columns, h.taken = make([][]float64, n), make([][]float64, n)
	h.between, h.before = make([]float64, n), make([]float64, n)
	h.loose, h.open = make([]bool, n), make([]int, n)
	h.missing, h.firstMissing = make([]int64, n), make([]int, n)
	h.lost = -1
	for i := range n {
		h.columns[i] = make([]float64, 256) // grows as there is need
		h.loose[i] = c.columns[i].loose || i == c.time
		h.open[i] = -1
	}
}

// add takes one sample.
func (r *Reader) add(values []float64) error {
	h := &r.holes
	if h.lost >= 0 {
		return r.lose(values)
	}
	if h.n == len(h.columns[0]) {
		for i, c := range h.columns {
			h.columns[i] = append(c, make([]float64, len(c))...)
		}
	}
	for i, v := range values {
		c := h.columns[i]
		c[h.n] = v
		if v == v && h.open[i] < 0 || h.loose[i] {
			continue
		}
		if v != v {
			r.hole(i)
			continue
		}
		h.bridge(i, v)
	}
	h.n++
	return nil
}

// hole notes a missing number in column i.
func (r *Reader) hole(i int) {
	h := &r.holes
	if h.open[i] < 0 {
		h.open[i] = h.n
	}
	if h.missing[i]++; h.missing[i] == 1 {
		h.firstMissing[i] = r.rowLine
	}
	if h.n-h.open[i] > r.grid.most {
		h.lost, h.line = i, r.rowLine-(h.n-h.open[i])
	}
}

// bridge closes the hole of column i in front of its number v.
func (h *holes) bridge(i int, v float64) {
	c, from := h.columns[i], h.open[i]
	was := h.before[i]
	if from > 0 {
		was = c[from-1]
	}
	steps := float64(h.n - from + 1)
	for k := from; k < h.n; k++ {
		c[k] = was + (v-was)*float64(k-from+1)/steps
	}
	h.open[i] = -1
}

// lose takes a sample behind a hole that is too long to be bridged: either no
// number comes any more, and the log ended before the hole, or it is an error.
func (r *Reader) lose(values []float64) error {
	h := &r.holes
	if values[h.lost] == values[h.lost] {
		return r.errorf(h.line, "%s has no number in about %d rows from here on; holes of up to %d are bridged", r.chosen.columns[h.lost].what, h.missing[h.lost], r.grid.most)
	}
	h.missing[h.lost]++
	h.cut++
	return nil
}

// ready is how many samples are whole.
func (h *holes) ready() int {
	n := h.n
	for _, at := range h.open {
		if at >= 0 {
			n = min(n, at)
		}
	}
	return n
}

// close ends the log: what is not whole now is left out.
func (h *holes) close() {
	n := h.ready()
	for i, at := range h.open {
		if at == n && at >= 0 {
			h.cutColumn = i
		}
		if at >= 0 {
			h.missing[i] -= int64(h.n - at)
			h.open[i] = -1
		}
	}
	if h.lost >= 0 {
		h.missing[h.lost] -= h.cut
	}
	h.cut += int64(h.n - n)
	h.n = n
}

// take moves the first n samples into taken.
func (h *holes) take(n int) {
	h.first += int64(h.out)
	h.out = n
	for i, c := range h.columns {
		if cap(h.taken[i]) < n {
			h.taken[i] = make([]float64, n)
		}
		h.taken[i] = h.taken[i][:n]
		copy(h.taken[i], c[:n])
		h.before[i] = c[n-1]
		copy(c, c[n:h.n])
		if h.open[i] >= 0 {
			h.open[i] -= n
		}
	}
	h.n -= n
}
