package runlog

import "math"

// grid puts rows on evenly spaced samples. Its step comes from the first rows (see
// findSampling); where every row lies on an instant of the grid, rows are taken as
// they are, bit for bit. Else:
//
//   - an instant between two rows gets the straight line between them;
//   - rows that are missing are bridged by a straight line, up to a second;
//   - rows between two instants are read past;
//   - a row that has the time of the row before is left out;
//   - rows before the first that has all numbers are left out.
//
// Time that goes back is an error, and so is a hole of more than a second: two
// tests in one file are not one.
//
// A row lies on an instant if it is within the tolerance of it. While rows do, the
// grid follows their stamps slowly, so that a step that is known to six digits
// does for a day.
type grid struct {
	step      float64
	tolerance float64 // s
	most      int     // instants that are bridged
	gapped    float64 // steps between two rows from which on there is one missing
	counted   bool    // rows are counted, there are no stamps

	start float64 // time of the first sample
	due   float64 // of the next
	at    float64 // time of the last row
	last  []float64
	rows  int64 // taken

	skipped                      int64 // before the first whole row
	between, bridged             int64 // samples on a line between two rows; of these, in gaps
	passed                       int64 // rows that lie between instants
	repeated, unstamped          int64
	firstRepeated, firstGap      int // lines
	firstBetween, firstUnstamped int
	longestGap                   float64 // s
	gapLine                      int
	offMost                      float64 // largest distance of a row from its instant, s

	stride, strides, strideLine int // rows that keep coming so many instants apart
	changed, changedLine        int
}

const follow = 1.0 / 256 // how much of a row's distance the grid follows

// place puts the row just read on the grid.
func (r *Reader) place() error {
	g := &r.grid
	if g.rows == 0 && !r.begin() {
		return nil
	}
	t := g.due
	if !g.counted {
		t = r.row[r.chosen.time]
	}
	off := t - g.due
	switch {
	case math.Abs(off) <= g.tolerance:
		g.due += g.step + follow*off
		g.strides = 0
		return r.put(r.row, t)
	case nan(t):
		if g.unstamped++; g.unstamped == 1 {
			g.firstUnstamped = r.rowLine
		}
		t = g.due
		g.due += g.step
		return r.put(r.row, t)
	case t < g.at-g.tolerance:
		return r.errorf(r.rowLine, "time goes back from %.9g s to %.9g s; two records in one file are not one", g.at, t)
	case t <= g.at:
		if g.repeated++; g.repeated == 1 {
			g.firstRepeated = r.rowLine
		}
		return nil
	}
	return r.fillUpTo(t)
}

// begin starts the grid at the first row that has every number.
func (r *Reader) begin() bool {
	for i, v := range r.row {
		if nan(v) && !r.chosen.columns[i].loose {
			r.grid.skipped++
			return false
		}
	}
	if g := &r.grid; !g.counted {
		g.start, g.due, g.at = r.row[r.chosen.time], r.row[r.chosen.time], r.row[r.chosen.time]
	} else {
		g.start = float64(g.skipped) * g.step
		g.due, g.at = g.start, g.start
	}
	return true
}

// put takes a row as the next sample.
func (r *Reader) put(values []float64, t float64) error {
	r.grid.rows++
	r.grid.at = t
	copy(r.grid.last, r.row)
	return r.add(values)
}

// fillUpTo gives the instants up to t, the time of the row, what the straight line
// from the row before has there.
func (r *Reader) fillUpTo(t float64) error {
	g := &r.grid
	n := math.Floor((t-g.due+g.tolerance)/g.step) + 1 // instants passed
	if n > float64(g.most)+1 {
		return r.errorf(r.rowLine, "time leaps from %.9g s to %.9g s, by more than %d rows of %.6g s; cut the file there", g.at, t, g.most, g.step)
	}
	if n < 1 {
		g.passed++
	}
	g.offMost = max(g.offMost, math.Abs(math.Remainder(t-g.due, g.step)))
	if t-g.at > g.gapped*g.step+g.tolerance {
		g.gap(t, int(n), r.rowLine)
	} else {
		g.strides = 0
	}
	began := g.at
	for range int(n) {
		if math.Abs(t-g.due) <= g.tolerance {
			g.due += g.step
			return r.put(r.row, t)
		}
		w := (g.due - began) / (t - began)
		for i, v := range r.row {
			r.holes.between[i] = g.last[i] + w*(v-g.last[i])
		}
		if g.between++; g.between == 1 {
			g.firstBetween = r.rowLine
		}
		g.due += g.step
		if err := r.add(r.holes.between); err != nil {
			return err
		}
	}
	g.at = t
	g.rows++
	copy(g.last, r.row)
	return nil
}

// gap notes that rows are missing, or that they come at another rate from here.
func (g *grid) gap(t float64, n, line int) {
	g.bridged += int64(n - 1)
	if g.firstGap == 0 {
		g.firstGap = line
	}
	if t-g.at > g.longestGap {
		g.longestGap, g.gapLine = t-g.at, line
	}
	const enough = 8 // in a row are no accident
	if n == g.stride && g.strides > 0 {
		if g.strides++; g.strides == enough && g.changed == 0 {
			g.changed, g.changedLine = n, g.strideLine
		}
		return
	}
	g.stride, g.strides, g.strideLine = n, 1, line
}
