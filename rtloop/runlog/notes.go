package runlog

import (
	"fmt"
	"slices"
	"strings"

	"antelag/scenarios/quantity"
)

// Notes says, a sentence each, what was found odd and how it was read. They are
// complete once Next has returned false.
func (r *Reader) Notes() []string { return slices.Clone(r.notes) }

func (r *Reader) note(format string, args ...any) {
	r.notes = append(r.notes, fmt.Sprintf(format, args...))
}

func ms(t float64) string    { return quantity.Short(t, quantity.Time) }
func hz(step float64) string { return quantity.Short(1/step, quantity.Frequency) }

// sayLayout tells what of the table's form people may want to know.
func (r *Reader) sayLayout() {
	r.notes = append(r.notes, r.chosen.notes...)
	if n := r.layout.skipped; n > 0 {
		r.note("%s before line %d %s no part of the table and %s skipped", lines(n), r.layout.first, isAre(n), wasWere(n))
	}
	const slow = 0.1 // s from row to row, that no test is logged at
	if !r.grid.counted && r.grid.step >= slow {
		r.note("rows come every %s; if the time column counts rows, or is in another unit, say it by --rate or --units time=ms", ms(r.grid.step))
	}
	if r.grid.counted {
		for i, h := range r.layout.names {
			if name, _, _ := namedUnit(h, quantity.Time); strings.EqualFold(name, "time") {
				r.note("the rows were counted at the rate given; the time stamps of column %d were not read", i+1)
			}
		}
	}
}

// sayMended tells what was mended.
func (r *Reader) sayMended() {
	g, h := &r.grid, &r.holes
	if g.skipped > 0 {
		r.note("%s at the beginning without a number in every column (%s) %s left out", rows(g.skipped), r.chosen.list(), wasWere(int(g.skipped)))
	}
	if g.changed > 0 {
		r.note("from line %d on rows come every %s instead of every %s", g.changedLine, ms(float64(g.changed)*g.step), ms(g.step))
	}
	if g.bridged > 0 {
		r.note("%s missing, in gaps of up to %s (line %d; the first at line %d): bridged by straight lines", rows(g.bridged), ms(g.longestGap), g.gapLine, g.firstGap)
	}
	if uneven := g.between - g.bridged; uneven > 0 {
		r.note("time stamps are uneven, by up to %.2g %% of a step (first at line %d): resampled to %s by straight lines between rows", 100*g.offMost/g.step, g.firstBetween, hz(g.step))
	}
	if g.passed > 0 && g.passed > g.between {
		r.note("%s closer together than %s: they were resampled to %s", rows(g.passed), ms(g.step), hz(g.step))
	}
	if g.repeated > 0 {
		r.note("%s the time of the row before (first at line %d) and %s left out", have(g.repeated), g.firstRepeated, wasWere(int(g.repeated)))
	}
	if g.unstamped > 0 {
		r.note("%s no time (first at line %d) and %s taken as the next", have(g.unstamped), g.firstUnstamped, wasWere(int(g.unstamped)))
	}
	for i, n := range h.missing {
		if n > 0 {
			r.note("%s in %s (first at line %d): bridged by straight lines", absent(n), r.chosen.columns[i].what, h.firstMissing[i])
		}
	}
	if h.cut > 0 {
		r.note("the last %d samples were left out: %s has no number there", h.cut, r.chosen.columns[h.cutColumn].what)
	}
	r.sayTail()
}

func (r *Reader) sayTail() {
	t := &r.tail
	switch {
	case t.err == nil:
	case t.lines == 1 && t.cut:
		r.note("the last line, %d, is cut off and was left out", t.first)
	case t.lines == 1:
		r.note("the last line, %d, is no row and was left out", t.first)
	default:
		r.note("the last %d lines, from line %d on, are no rows and were left out", t.lines, t.first)
	}
}

// list names the columns that are read.
func (c *chosen) list() string {
	var out []string
	for _, col := range c.columns {
		if !col.loose {
			out = append(out, col.what)
		}
	}
	return strings.Join(out, ", ")
}

func lines(n int) string  { return plural(int64(n), "line", "lines") }
func rows(n int64) string { return plural(n, "row", "rows") }
func absent(n int64) string {
	return plural(n, "number is missing", "numbers are missing")
}
func have(n int64) string { return plural(n, "row has", "rows have") }

func plural(n int64, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

func isAre(n int) string {
	if n == 1 {
		return "is"
	}
	return "are"
}

func wasWere(n int) string {
	if n == 1 {
		return "was"
	}
	return "were"
}
