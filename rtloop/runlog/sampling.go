package runlog

import (
	"bytes"
	"math"
	"slices"
	"strconv"
)

// findSampling finds the step of the grid and how far from it rows may lie: from
// the rate that was given, or from the stamps of the first rows.
func (r *Reader) findSampling(o *Options) error {
	g := &r.grid
	g.last = make([]float64, len(r.row))
	if o.Rate > 0 {
		g.step, g.counted = 1/o.Rate, true
	} else {
		stamps, bad := r.headStamps()
		if len(stamps) < fewestRows && bad != nil {
			return bad
		}
		if len(stamps) < fewestRows {
			return r.errorf(r.layout.first, "%d row with a time; a log has at least %d", len(stamps), fewestRows)
		}
		if !r.fit(stamps) {
			return r.errorf(r.layout.first, "time does not advance from row to row so that rows could be told apart; if they are evenly spaced, give --rate instead")
		}
	}
	const least, bridge, longest = 16, 1.0, 1 << 16 // instants, s, instants
	g.most = min(max(least, int(min(bridge/g.step, longest))), longest)
	return nil
}

// headStamps returns the times of the rows in the head, s, and what was wrong with
// the first line that is no row.
func (r *Reader) headStamps() (out []float64, bad error) {
	pos, line := r.pos, r.line
	defer func() { r.pos, r.line = pos, line }()
	for len(out) < headRows {
		i := bytes.IndexByte(r.buf[r.pos:r.end], r.layout.end)
		if i < 0 && !r.over || r.pos == r.end {
			break
		}
		text, closed, err := r.nextLine()
		if err != nil || idle(text) {
			continue
		}
		if err := r.parse(text, !closed); err != nil {
			if bad == nil {
				bad = r.errorf(r.line, "%w", err)
			}
			continue
		}
		if t := r.row[r.chosen.time]; !nan(t) {
			out = append(out, t)
		}
	}
	return out, bad
}

// fit finds step and tolerance from stamps, and reports whether there are any.
//
// Rows are numbered, by the median of the steps in time, so that gaps count as the
// rows that are missing. Where stamps stand still time and again they are rounded
// to more than a step, and every row counts one. A straight line through stamps
// over numbers, by least squares, has the step for its slope. Rows whose stamps lie
// on it, but for their rounding, are evenly spaced: what is uneven is the stamps.
func (r *Reader) fit(stamps []float64) bool {
	g := &r.grid
	var steps []float64
	still := 0
	for i := 1; i < len(stamps); i++ {
		switch d := stamps[i] - stamps[i-1]; {
		case d > 0:
			steps = append(steps, d)
		case d == 0:
			still++
		}
	}
	if len(steps) == 0 {
		return false
	}
	slices.Sort(steps)
	median, least := steps[len(steps)/2], steps[0]
	g.gapped = 1.5
	even := 0
	for _, d := range steps {
		if math.Abs(d/median-math.Round(d/median)) < 0.1 {
			even++
		}
	}
	if even*5 < len(steps)*4 {
		g.gapped = 2.5 // what is uneven has long steps without a row missing
	}
	coarse := still*20 > len(stamps)
	number := make([]float64, 0, len(stamps))
	times := make([]float64, 0, len(stamps))
	for i, t := range stamps {
		n := float64(i)
		if !coarse && i > 0 {
			d := t - stamps[i-1]
			if !(d > 0) {
				continue
			}
			n = number[len(number)-1] + 1
			if d > g.gapped*median {
				n += math.Round(d/median) - 1
			}
		}
		number, times = append(number, n), append(times, t)
	}
	slope, off := straight(number, times)
	resolution := least
	if !coarse {
		resolution = decimals(times)
	}
	count := float64(len(number))
	g.step = round(slope, 10*off/(slope*count*math.Sqrt(count))+1e-12)
	rounding := 4 * math.Abs(times[len(times)-1]) * 0x1p-52
	switch {
	case off <= 1e-3*g.step+rounding:
		g.tolerance = 2e-3*g.step + rounding
	case off <= 0.75*resolution+rounding || coarse && off <= 1.01*resolution:
		g.tolerance = resolution + rounding
		r.note("time stamps are rounded to %s: rows were taken as evenly spaced, %s", ms(resolution), hz(g.step))
	case coarse:
		return false
	default:
		g.tolerance = 1e-3*g.step + rounding
	}
	return g.step > 0
}

// straight fits t = a + slope·n by least squares and returns the slope and the
// largest distance from the line.
func straight(n, t []float64) (slope, off float64) {
	var mn, mt float64
	for i := range n {
		mn += n[i] / float64(len(n))
		mt += (t[i] - t[0]) / float64(len(n))
	}
	var nn, nt float64
	for i := range n {
		nn += (n[i] - mn) * (n[i] - mn)
		nt += (n[i] - mn) * (t[i] - t[0] - mt)
	}
	slope = nt / nn
	for i := range n {
		off = max(off, math.Abs(t[i]-t[0]-mt-slope*(n[i]-mn)))
	}
	return slope, off
}

// decimals returns the unit of the last decimal that times have, s; 0 when that is
// finer than a microsecond.
func decimals(times []float64) float64 {
	unit, scale := 1.0, 1.0
	for range 7 {
		if !slices.ContainsFunc(times, func(t float64) bool {
			return math.Abs(t*scale-math.Round(t*scale)) > 1e-3
		}) {
			return unit
		}
		scale *= 10
		unit = 1 / scale
	}
	return 0
}

// round returns the roundest step within a relative distance: of few digits itself
// or in its rate, of a rate that is a power of two, or a whole one; else the step.
func round(step, within float64) float64 {
	within = min(within, 1e-2)
	rate := 1 / step
	candidates := []float64{
		figures(step, 1), 1 / figures(rate, 1), figures(step, 2), 1 / figures(rate, 2),
		1 / math.Exp2(math.Round(math.Log2(rate))),
		figures(step, 3), 1 / figures(rate, 3), 1 / math.Round(rate),
		figures(step, 4), 1 / figures(rate, 4), figures(step, 5), 1 / figures(rate, 5),
	}
	for _, v := range candidates {
		if math.Abs(v-step) <= within*step {
			return v
		}
	}
	return step
}

// figures rounds v to so many significant digits.
func figures(v float64, digits int) float64 {
	out, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits-1, 64), 64)
	if err != nil {
		return math.NaN()
	}
	return out
}
