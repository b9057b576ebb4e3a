package tui

import (
	"fmt"
	"strings"

	"antelag/tui/canvas"
)

// shortLabels stand in where the full names of the limits have no room.
var shortLabels = map[string]string{
	"tracking error, rms":  "rms error",
	"tracking error, peak": "peak error",
	"energy margin, least": "least margin",
	"response error, rms":  "response",
	"spectrum error, rms":  "spectrum",
}

// drawVerdict holds the whole scenario against every acceptance limit: what it
// was before the last edit, what it is now, what is allowed, and the word.
func (d *Dashboard) drawVerdict(s *Snapshot, b box) {
	v := &s.Verdict
	note, ink := verdictNote(s)
	in := b.frame(panelVerdict, note, ink)
	y := 0
	if v.Ending != "" {
		ink := canvas.Bad
		for _, line := range wrap(v.Ending, in.at.w-1, max(1, min(2, in.at.h-len(v.Rows)))) {
			in.Text(1, y, ink, line)
			y++
		}
	}
	if len(v.Rows) == 0 && v.Ending == "" {
		text := "no acceptance limits given"
		if v.Working {
			text = "computing the whole scenario…"
		}
		in.Text(1, y, canvas.Dim, text)
		return
	}
	widths := verdictWidths(v.Rows)
	short := !fullLabels(in.at.w, v.Rows, widths)
	for i := range v.Rows {
		if y >= in.at.h {
			break
		}
		drawLimit(in, y, &v.Rows[i], widths, short)
		y++
	}
}

func verdictNote(s *Snapshot) (string, canvas.Ink) {
	v := &s.Verdict
	word, ink := "FAIL", canvas.Bad
	if v.Pass {
		word, ink = "PASS", canvas.Good
	}
	whose := ""
	if l := s.lane(); v.Lane != "" && (l == nil || l.Name != v.Lane) {
		whose = v.Lane + ": "
	}
	switch {
	case v.Working && len(v.Rows) == 0:
		return "computing…", canvas.Warn
	case v.Working:
		return whose + "was " + word + ", computing…", canvas.Warn
	case len(v.Rows) == 0 && v.Ending == "":
		return "", canvas.Plain
	case v.Took > 0:
		return fmt.Sprintf("%s%s, took %d ms", whose, word, v.Took.Milliseconds()), ink
	}
	return whose + word, ink
}

// verdictWidths are the widths of was, is, allowed.
func verdictWidths(rows []VerdictRow) (w [3]int) {
	for i := range rows {
		w[0] = max(w[0], canvas.Width(rows[i].Was))
		w[1] = max(w[1], canvas.Width(rows[i].Is))
		w[2] = max(w[2], canvas.Width(rows[i].Allowed))
	}
	return w
}

// drawLimit writes one limit. From the right: the word, what is allowed, what
// is, an arrow and what was, as far as its label leaves room. In a wide panel
// what was has a column of its own.
func drawLimit(in box, y int, r *VerdictRow, w [3]int, brief bool) {
	word, ink := "FAIL", canvas.Bad
	if r.Pass {
		word, ink = "PASS", canvas.Good
	}
	x := in.at.w
	in.TextRight(x, y, ink, word)
	x -= 6
	in.TextRight(x, y, canvas.Limit, r.Allowed)
	x -= w[2] + 2
	in.TextRight(x, y, canvas.Bold, r.Is)
	label := r.label(brief)
	if r.Was != "" && r.Was != r.Is {
		was := r.Was
		if column := x - w[1]; column-3-w[0] >= 23 {
			x = column
		} else {
			x -= canvas.Width(r.Is)
			was = sameWord(was, r.Is)
		}
		if n := canvas.Width(was); x-3-n > canvas.Width(label)+1 {
			in.TextRight(x, y, canvas.Dim, " → ")
			in.TextRight(x-3, y, canvas.Dim, was)
			x -= n + 3
		}
	} else {
		x -= canvas.Width(r.Is)
	}
	in.sub(0, y, max(x-1, 0), 1).Text(1, 0, canvas.Plain, label)
}

// label is what the limit judges, in fewer words where they have little room.
func (r *VerdictRow) label(brief bool) string {
	if short := shortLabels[r.Label]; brief && short != "" {
		return short
	}
	return r.Label
}

// fullLabels reports whether every row has room for its label in full beside
// its figures.
func fullLabels(width int, rows []VerdictRow, w [3]int) bool {
	for i := range rows {
		r := &rows[i]
		need := 1 + canvas.Width(r.Label) + 1 + canvas.Width(r.Is) + 2 + w[2] + 2 + len("PASS")
		if r.Was != "" && r.Was != r.Is {
			need += canvas.Width(sameWord(r.Was, r.Is)) + 3
		}
		if need > width {
			return false
		}
	}
	return true
}

// sameWord drops the direction of was when is has the same: "14 ms late" before
// "2 ms late" is "14 ms".
func sameWord(was, is string) string {
	for _, word := range []string{" late", " early"} {
		if strings.HasSuffix(was, word) && strings.HasSuffix(is, word) {
			return strings.TrimSuffix(was, word)
		}
	}
	return was
}
