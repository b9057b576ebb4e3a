package canvas

import "math"

// rise and run are a cell filled by eighths from below and from the left.
var (
	rise = [9]rune{' ', '▁', '▂', '▃', '▄', '▅', '▆', '▇', '█'}
	run  = [9]rune{' ', '▏', '▎', '▍', '▌', '▋', '▊', '▉', '█'}
)

// Sparkline draws values in row 0, a column each, the last at the right edge. The
// full height is from lo to hi; when these are not a range, the extent of the
// values. When there are more values than columns each column shows the value
// of its share that is farthest from the mean of all, so that neither peaks nor
// dips are lost. A value at lo or below is the lowest block, at hi or above the
// highest; NaN is a blank.
func (r Region) Sparkline(ink Ink, values []float64, lo, hi float64) {
	if r.w == 0 || r.h == 0 {
		return
	}
	if !(lo < hi) || math.IsInf(hi-lo, 0) {
		lo, hi = Extent(values)
	}
	lo, hi = properRange(lo, hi)
	mean, shrunk := 0.0, len(values) > r.w
	if shrunk {
		mean = meanOf(values)
	}
	n := min(len(values), r.w)
	r.Sub(0, 0, r.w-n, 1).Fill(Cell{})
	for i := range n {
		from, to := i*len(values)/n, (i+1)*len(values)/n
		v := values[from]
		if shrunk {
			v = farthest(values[from:to], mean)
		}
		r.Set(r.w-n+i, 0, Cell{block(v, lo, hi), ink})
	}
}

// block is the block for a value: one of eight, as all values have one.
func block(v, lo, hi float64) rune {
	if v != v {
		return ' '
	}
	return rise[1+int(math.Max(0, math.Min(8*(v-lo)/(hi-lo), 7)))]
}

// meanOf is the mean of the finite values, 0 when there is none.
func meanOf(values []float64) float64 {
	sum, n := 0.0, 0
	for _, v := range values {
		if v-v == 0 {
			sum += v / float64(len(values))
			n++
		}
	}
	if n == 0 || sum-sum != 0 {
		return 0
	}
	return sum * float64(len(values)) / float64(n)
}

func farthest(values []float64, mean float64) float64 {
	best := math.NaN()
	for _, v := range values {
		if best != best || math.Abs(v-mean) > math.Abs(best-mean) {
			best = v
		}
	}
	return best
}

// Bar draws a value in row 0 as a bar over the range lo to hi, filled from zero,
// or from the end nearest to it. Marks, the limits, are upright lines that the
// bar does not cover. A value outside the range ends in an arrow; NaN leaves the
// track empty.
func (r Region) Bar(ink Ink, value, lo, hi float64, marks ...float64) {
	if r.w == 0 || r.h == 0 {
		return
	}
	lo, hi = properRange(lo, hi)
	if lo > hi {
		lo, hi = hi, lo
	}
	r.Sub(0, 0, r.w, 1).Fill(Cell{'·', Dim})
	at := func(v float64) float64 { // eighths of a cell from the left
		return math.Max(0, math.Min((v-lo)/(hi-lo), 1)) * float64(8*r.w)
	}
	if value == value {
		zero := math.Max(lo, math.Min(0, hi))
		r.fillBar(ink, int(at(zero)+0.5), int(at(value)+0.5))
		switch {
		case value > hi:
			r.Set(r.w-1, 0, Cell{'▶', ink})
		case value < lo:
			r.Set(0, 0, Cell{'◀', ink})
		}
	}
	for _, m := range marks {
		if m >= lo && m <= hi {
			r.Set(min(int(at(m))/8, r.w-1), 0, Cell{'│', Limit})
		}
	}
}

// fillBar fills from zero to end, in eighths. Blocks for parts of a cell exist in
// eighths from the left, but from the right only whole and half; the cell of zero
// is filled whole.
func (r Region) fillBar(ink Ink, zero, end int) {
	if end >= zero {
		for x := zero / 8; x < r.w && 8*x < end; x++ {
			r.Set(x, 0, Cell{run[min(8, end-8*x)], ink})
		}
		return
	}
	for x := (zero - 1) / 8; x >= 0 && 8*x+8 > end; x-- {
		switch covered := 8*x + 8 - end; {
		case covered >= 6:
			r.Set(x, 0, Cell{'█', ink})
		case covered >= 2:
			r.Set(x, 0, Cell{'▐', ink})
		}
	}
}
