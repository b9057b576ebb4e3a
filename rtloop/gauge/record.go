package gauge

import (
	"maps"
	"math"
	"sync"
)

// segment is how many ticks are kept before they are folded into sums.
const segment = 1 << 20

// Alignment is how measured lies to target over a whole run.
type Alignment struct {
	// Delay is where target and measured correlate best, s, negative when
	// early: the peak, with a parabola through it, of the correlation
	// coefficient of their overlapping parts. It is searched up to half a second
	// or a quarter of the record, whichever is less. NaN when either never moved
	// and when no peak lies within the lags searched.
	Delay float64
	FEI   FEI
	Bands []Band // with Record.Response, the frequency response; else nil
}

// Record keeps target and measured of every tick for what needs the whole
// history. Up to 2²⁰ ticks are held as they are. Of longer runs each full
// segment of 2²⁰ ticks is folded, in the background, into the sums from which
// Finish works (its correlation at every lag, its spectral sums), so that memory
// is bounded by two segments and their transforms. Adding segments weights each
// by its power. Of the last, unfinished segment of a long run nothing is used if
// it is shorter than four times the largest lag (two seconds).
//
// The sample of Start is not part of the record: n ticks are then n samples, and
// n ticks of a signal whose period divides them are whole periods.
type Record struct {
	Response bool // whether Finish also works out the frequency response

	buf     []point
	n       int
	room    int // len(buf)
	spare   []point
	sums    *alignment // of the folded segments, nil while there is none
	folding sync.WaitGroup
	tick    float64
	segment int
}

// NewRecord returns a record of ticks of the given length, physical seconds.
// The expected number of ticks sizes it: up to that many, Add allocates nothing
// (beyond 2²⁰, nothing but the start of the fold once a segment). 0 is unknown.
func NewRecord(tick float64, ticks int) *Record {
	return newRecord(tick, ticks, segment)
}

func newRecord(tick float64, ticks, segment int) *Record {
	r := &Record{tick: tick, segment: segment}
	if ticks <= 0 || ticks > segment {
		r.buf = make([]point, segment)
	} else {
		r.buf = make([]point, ticks)
	}
	r.room = len(r.buf)
	if ticks > segment {
		r.spare = make([]point, segment)
	}
	return r
}

// Start forgets everything. The record begins with the first tick after it.
func (r *Record) Start(x, y float64) {
	r.folding.Wait()
	r.n, r.sums = 0, nil
}

// Add takes the sample of one tick.
func (r *Record) Add(x, y float64) {
	if r.n == r.room { // a field, so that Add is small enough to be inlined
		r.full()
	}
	r.buf[r.n] = point{x, y}
	r.n++
}

// full makes room: the rest of the segment when more ticks come than were
// expected, or else the spare buffer while this one is folded. Only if the last
// fold is still busy, 2²⁰ ticks later, does it wait.
func (r *Record) full() {
	if len(r.buf) < r.segment {
		grown := make([]point, r.segment)
		copy(grown, r.buf)
		r.buf, r.room = grown, len(grown)
		return
	}
	r.folding.Wait()
	if r.sums == nil {
		r.sums = newAlignment(r.tick, r.segment)
		r.sums.response = r.Response
	}
	if r.spare == nil {
		r.spare = make([]point, r.segment)
	}
	r.buf, r.spare = r.spare, r.buf
	r.n = 0
	r.folding.Add(1)
	go func(sums *alignment, samples []point) {
		defer r.folding.Done()
		w := takeWorkspace()
		defer w.release()
		sums.fold(samples, w)
	}(r.sums, r.spare)
}

// Finish works out the alignment of everything added since Start. It changes
// nothing: ticks may be added and Finish called again. Not both at once.
func (r *Record) Finish() Alignment {
	r.folding.Wait()
	w := takeWorkspace()
	defer w.release()
	rest := r.buf[:r.n]
	if r.sums == nil {
		return alignOnce(rest, r.tick, r.Response, w)
	}
	sums := r.sums
	if len(rest) >= max(1, 4*sums.lags.max) {
		sums = sums.clone()
		sums.fold(rest, w)
	}
	return sums.result()
}

// alignment is the sums over folded segments.
type alignment struct {
	tick     float64
	response bool
	fei      feiSums
	bands    bandSums
	lags     lagSums
}

func newAlignment(tick float64, ticks int) *alignment {
	return &alignment{tick: tick, bands: bandSums{}, lags: newLagSums(maxLag(tick, ticks))}
}

func (a *alignment) clone() *alignment {
	return &alignment{tick: a.tick, response: a.response, fei: a.fei, bands: maps.Clone(a.bands), lags: a.lags.clone()}
}

// fold adds one segment.
func (a *alignment) fold(samples []point, w *workspace) {
	w.load(samples)
	n := a.fei.add(w)
	if a.response {
		a.bands.add(w, n)
	}
	a.lags.add(w)
}

func (a *alignment) result() Alignment {
	best := pickPeak(a.lags.xy, 1)
	delay := climb(best, a.lags.max, a.lags.coefficient)
	out := Alignment{Delay: delay * a.tick, FEI: a.fei.result(a.tick)}
	if a.response {
		out.Bands = a.bands.result(a.tick)
	}
	return out
}

// alignOnce is the alignment of a run that was kept whole. A target that moves
// slowly against the tick, as structures do, needs no correlation at every lag:
// every stride-th sample finds the peak, and only the few lags around it are
// worked out in full.
func alignOnce(samples []point, tick float64, response bool, w *workspace) Alignment {
	w.load(samples)
	var fei feiSums
	n := fei.add(w)
	a := Alignment{Delay: math.NaN(), FEI: fei.result(tick)}
	if response {
		bands := bandSums{}
		bands.add(w, n)
		a.Bands = bands.result(tick)
	}
	most := maxLag(tick, len(samples))
	if most < 1 || !w.movesX || !w.movesY {
		return a
	}
	stride := min(w.stride(), max(1, most/8))
	coarse := w.correlate(stride, most/stride+2) // so that a peak near the end is seen
	best := pickPeak(coarse, stride)
	full := overlap{x: w.x, y: w.y}
	full.total()
	a.Delay = climb(best, most, full.coefficient) * tick
	return a
}

// maxLag is the largest lag searched, ticks: half a second or a quarter of the
// record, whichever is less.
func maxLag(tick float64, ticks int) int {
	quarter := ticks / 4
	if half := 0.5 / tick; half < float64(quarter) {
		return int(half)
	}
	return quarter
}
