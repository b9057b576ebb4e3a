package accept

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// How figures are written for people: every number with its unit, in as many
// digits as the figure is worth.

const undefined = "–"

// Share writes a ratio as a percentage of three significant digits.
func Share(f rtloop.Figure) string {
	if !f.Defined() {
		return undefined
	}
	v := 100 * float64(f)
	switch a := math.Abs(v); {
	case a == 0:
		return "0 %"
	case a < 0.001:
		return "< 0.001 %"
	case a >= 1e5:
		return fmt.Sprintf("%.2e %%", v)
	default:
		after := 2 - int(math.Floor(math.Log10(a)))
		return strconv.FormatFloat(v, 'f', max(0, after), 64) + " %"
	}
}

// Amplitude writes an amplitude ratio, of which parts in ten thousand count.
func Amplitude(f rtloop.Figure) string {
	if !f.Defined() || f >= 1e3 {
		return Share(f)
	}
	return strconv.FormatFloat(100*float64(f), 'f', 2, 64) + " %"
}

// Margin writes an energy margin. How far a loop that blew up was below any
// margin is of no interest.
func Margin(f rtloop.Figure) string {
	switch {
	case !f.Defined():
		return undefined
	case f < -10:
		return "< -1000 %"
	case f > 10:
		return "> 1000 %"
	}
	return strconv.FormatFloat(100*float64(f), 'f', 1, 64) + " %"
}

// Late writes a delay in milliseconds to the microsecond, which is finer than
// any record can tell, and says its direction in a word.
func Late(f rtloop.Figure) string {
	if !f.Defined() {
		return undefined
	}
	ms := strconv.FormatFloat(1e3*math.Abs(float64(f)), 'f', 3, 64)
	switch {
	case ms == "0.000":
		return ms + " ms"
	case f < 0:
		return ms + " ms early"
	}
	return ms + " ms late"
}

// seconds writes an instant of a run.
func seconds(t float64) string { return strconv.FormatFloat(t, 'f', 3, 64) + " s" }

// within writes a figure and the limit that it was to stay below, if any.
func within(f rtloop.Figure, dim quantity.Dim, limit *kind.Value) string {
	text := quantity.Format(float64(f), dim)
	if limit != nil {
		text += " of " + quantity.Short(limit.Num, dim)
	}
	return text
}

// sameUnit writes energies in the unit that suits the largest, to its fourth
// significant digit.
func sameUnit(terms ...rtloop.Figure) []string {
	largest := 0.0
	for _, t := range terms {
		if t.Defined() {
			largest = max(largest, math.Abs(float64(t)))
		}
	}
	_, name, _ := strings.Cut(quantity.Format(largest, quantity.Energy), " ")
	unit, err := quantity.ParseUnit(name)
	if err != nil {
		panic(err) // a unit that quantity wrote
	}
	after := 3
	if v := unit.From(largest); v > 0 {
		after = min(max(0, 3-int(math.Floor(math.Log10(v)))), 9)
	}
	out := make([]string, len(terms))
	for i, t := range terms {
		switch v := unit.From(float64(t)); {
		case !t.Defined():
			out[i] = undefined
		case math.Abs(v) >= 1e5:
			out[i] = fmt.Sprintf("%.3e %s", v, name)
		default:
			if math.Abs(v) < math.Pow10(-after)/2 {
				v = 0 // never −0.00
			}
			out[i] = strconv.FormatFloat(v, 'f', after, 64) + " " + name
		}
	}
	return out
}

// found writes the figure that was judged.
func (j *Judgement) found() string {
	switch j.Limit {
	case "delay":
		return Late(j.Got)
	case "peak_error":
		return quantity.Format(float64(j.Got), quantity.Length)
	case "energy_margin":
		return Margin(j.Got)
	}
	return Share(j.Got)
}

// allowed writes the limit in the unit of found.
func (j *Judgement) allowed() string {
	switch j.Limit {
	case "delay", "peak_error":
		return "≤ " + quantity.Short(j.Want, j.Dim)
	case "energy_margin":
		return "≥ " + quantity.Short(100*j.Want, quantity.None) + " %"
	}
	return "≤ " + quantity.Short(100*j.Want, quantity.None) + " %"
}

// room says how far the figure is from its limit: the energy margin in
// percentage points, the others as a share of the limit.
func (j *Judgement) room() string {
	got := math.Abs(float64(j.Got))
	switch {
	case !j.Got.Defined():
		return "not defined"
	case j.Limit == "energy_margin":
		if j.Pass {
			return parts(float64(j.Got)-j.Want) + " above"
		}
		if j.Got < -10 {
			return "far below"
		}
		return parts(j.Want-float64(j.Got)) + " below"
	case got <= j.Want:
		if j.Want == 0 {
			return "none"
		}
		left := 1 - got/j.Want
		if left > 0.1 {
			left = math.Floor(100*left) / 100 // all is left of a limit only at 0
		}
		return parts(left) + " left"
	case got < 2*j.Want:
		return parts(got/j.Want-1) + " over"
	case j.Want == 0:
		return "over"
	}
	return times(got/j.Want) + " times the limit"
}

// times writes a ratio of 2 or more in three digits, or all before the point.
func times(v float64) string {
	switch {
	case v >= 1e6:
		return fmt.Sprintf("%.2e", v)
	case v >= 100:
		return fmt.Sprintf("%.0f", v)
	}
	return fmt.Sprintf("%.3g", v)
}

// parts writes a ratio of 0 or more as a percentage in two digits, or all that
// stand before the point.
func parts(v float64) string {
	v *= 100
	switch {
	case v >= 1e5:
		return fmt.Sprintf("%.2e %%", v)
	case v >= 10:
		return fmt.Sprintf("%.0f %%", v)
	}
	return fmt.Sprintf("%.2g %%", v)
}
