package tui

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

// How figures are written on the screen: as in the verdict of a run, every
// number with its unit, in as many digits as the figure is worth.

const undefined = "–"

func defined(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

func share(f float64) string     { return accept.Share(rtloop.Figure(f)) }
func amplitude(f float64) string { return accept.Amplitude(rtloop.Figure(f)) }
func margin(f float64) string    { return accept.Margin(rtloop.Figure(f)) }

// milliseconds writes the size of a delay to the microsecond; way is its
// direction in a word, "" when it rounds to none.
func milliseconds(f float64) (size, way string) {
	a := 1e3 * math.Abs(f)
	if a >= 1e5 {
		size = fmt.Sprintf("%.2e ms", a)
	} else {
		size = strconv.FormatFloat(a, 'f', 3, 64) + " ms"
	}
	switch {
	case size == "0.000 ms":
		return size, ""
	case f < 0:
		return size, "early"
	}
	return size, "late"
}

// late writes a delay and its direction: "1.234 ms late".
func late(f float64) string {
	if !defined(f) {
		return undefined
	}
	size, way := milliseconds(f)
	if way == "" {
		return size
	}
	return size + " " + way
}

// seconds writes an instant of a run.
func seconds(t float64) string {
	if !defined(t) {
		return undefined
	}
	return strconv.FormatFloat(t, 'f', 3, 64) + " s"
}

// whole writes a length of time that people chose: "30 s".
func whole(t float64) string {
	if !defined(t) {
		return undefined
	}
	return strconv.FormatFloat(t, 'g', 6, 64) + " s"
}

// micro writes a lateness.
func micro(d time.Duration) string {
	us := float64(d) / 1e3
	switch a := math.Abs(us); {
	case a >= 1e6:
		return strconv.FormatFloat(us/1e6, 'f', 2, 64) + " s"
	case a >= 1e5:
		return strconv.FormatFloat(us/1e3, 'f', 1, 64) + " ms"
	case a >= 100:
		return strconv.FormatFloat(us, 'f', 0, 64) + " µs"
	}
	return strconv.FormatFloat(us, 'f', 1, 64) + " µs"
}

// length writes a displacement that changes as it is read: three decimals of a
// millimetre at most, so that the digits hold still.
func length(v float64) string {
	switch a := 1e3 * math.Abs(v); {
	case !defined(v):
		return undefined
	case a >= 1e6:
		return "> 1000 m"
	case a >= 1e4:
		return strconv.FormatFloat(v, 'f', 2, 64) + " m"
	case a < 0.0005:
		return "0.000 mm"
	case a < 1:
		return strconv.FormatFloat(1e3*v, 'f', 3, 64) + " mm"
	default:
		return strconv.FormatFloat(1e3*v, 'f', 2, 64) + " mm"
	}
}

// outcome is how a lane stands, in a word that stands out where it must.
func outcome(o rtloop.Outcome) (string, canvas.Ink) {
	switch o {
	case rtloop.Tripped, rtloop.Diverged:
		return strings.ToUpper(o.String()), canvas.Bad
	case rtloop.Interrupted:
		return o.String(), canvas.Warn
	}
	return o.String(), canvas.Plain
}

// tripDim is the dimension of what tripped.
func tripDim(t *rtloop.Trip) quantity.Dim {
	switch {
	case strings.HasSuffix(t.Limit, "velocity"):
		return quantity.Velocity
	case strings.HasSuffix(t.Limit, "force"):
		return quantity.Force
	}
	return quantity.Length
}

// tripText says which limit ended a lane: "TRIPPED at 4.212 s: error 25.31 mm,
// allowed 25 mm".
func tripText(o rtloop.Outcome, t *rtloop.Trip) string {
	word := strings.ToUpper(o.String())
	if t == nil {
		return word
	}
	where := t.Limit
	if t.Channel != "" {
		where = t.Channel + ": " + t.Limit
	}
	at := word + " at " + seconds(t.Time) + ", " + where
	switch dim := tripDim(t); {
	case !t.Value.Defined():
		return at + " is no number any more"
	case o == rtloop.Diverged:
		return at + " is " + quantity.Format(float64(t.Value), dim)
	default:
		return at + " " + quantity.Format(float64(t.Value), dim) + ", allowed " + quantity.Short(float64(t.Allowed), dim)
	}
}

// unitFor is the unit in which values up to most are written on an axis, and
// what to multiply SI values by.
func unitFor(most float64, dim quantity.Dim) (factor float64, unit string) {
	if !defined(most) {
		most = 0
	}
	_, unit, _ = strings.Cut(quantity.Format(most, dim), " ")
	if u, err := quantity.ParseUnit(typed.Replace(unit)); err == nil && unit != "" {
		return u.From(1), unit
	}
	if unit = dim.SI(); unit == "" {
		return 1, ""
	}
	return 1, unit
}

var typed = strings.NewReplacer("µ", "u", "⁻¹", "^-1", "⁻²", "^-2", "²", "^2", "³", "^3", "·", "*")

// cut shortens a text to n columns, ending in "…" where something is lost.
func cut(s string, n int) string {
	if canvas.Width(s) <= n {
		return s
	}
	room := n - 1
	for i, r := range s {
		if room -= canvas.Width(string(r)); room < 0 {
			return s[:i] + "…"
		}
	}
	return s
}

// wrap breaks a text at blanks into lines of at most n columns, at most most of
// them; what does not fit ends in "…".
func wrap(s string, n, most int) []string {
	if most <= 0 {
		return nil
	}
	var lines []string
	line := ""
	words := strings.Fields(s)
	for i, word := range words {
		switch {
		case line == "":
			line = word
		case canvas.Width(line)+1+canvas.Width(word) <= n:
			line += " " + word
		case len(lines)+1 >= most:
			return append(lines, cut(line+" "+strings.Join(words[i:], " "), n))
		default:
			lines = append(lines, cut(line, n))
			line = word
		}
	}
	if line != "" {
		lines = append(lines, cut(line, n))
	}
	return lines
}

// flow writes texts side by side, gap columns apart, on as many rows as they
// need from row y, at most most, and returns the row after the last.
func flow(b box, y, most, gap int, items ...span) int {
	x, rows := 0, 1
	for _, it := range items {
		if it.text == "" {
			continue
		}
		w := canvas.Width(it.text)
		if x > 0 && x+w > b.at.w {
			if rows == most {
				break
			}
			x, rows = 0, rows+1
		}
		x += b.Text(x, y+rows-1, it.ink, it.text) + gap
	}
	return y + rows
}

// span is a piece of text in one ink.
type span struct {
	text string
	ink  canvas.Ink
}
