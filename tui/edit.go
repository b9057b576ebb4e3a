package tui

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// part is one compensator of a scenario: that of an alternative lane, or,
// where lane is own, a channel's own one. Several lanes may use the same part,
// and an alternative lane may use one part for all channels.
type part struct{ lane, channel int }

const own = -1

// partOf finds the part that a lane of the rig, 0 the configured one, uses for
// a channel.
func partOf(s *scenarios.Scenario, lane, channel int) part {
	if lane > 0 && covers(&s.Lanes[lane-1], &s.Channels[channel]) {
		return part{lane - 1, channel}
	}
	return part{own, channel}
}

func covers(l *scenarios.Lane, c *scenarios.Channel) bool {
	return l.Channel == "" || l.Channel == c.Name
}

// in is the part as a scenario has it.
func (p part) in(s *scenarios.Scenario) *scenarios.Part {
	if p.lane == own {
		return &s.Channels[p.channel].Compensator
	}
	return &s.Lanes[p.lane].Compensator
}

// path is where the part stands in a scenario.
func (p part) path() string {
	if p.lane == own {
		return fmt.Sprintf("channel[%d].compensator.", p.channel)
	}
	return fmt.Sprintf("lane[%d].compensator.", p.lane)
}

// same reports whether two parts are one.
func (p part) same(q part) bool {
	return p.lane == q.lane && (p.lane != own || p.channel == q.channel)
}

// edits are what a running rig must be told of the part.
func (p part) edits(s *scenarios.Scenario) []laneEdit {
	in := p.in(s)
	var out []laneEdit
	for lane := range len(s.Lanes) + 1 {
		for j := range s.Channels {
			if partOf(s, lane, j).same(p) {
				out = append(out, laneEdit{lane, rtloop.Edit{Channel: j, Method: in.Kind.Name, Values: in.Values}})
			}
		}
	}
	return out
}

// change sets one setting of the part.
func (p part) change(s *kind.Setting, v kind.Value) scenarios.Change {
	return scenarios.Change{Path: p.path() + s.Name, Value: spelled(s, v)}
}

// spelled writes a value so that it reads back the same.
func spelled(s *kind.Setting, v kind.Value) string {
	one := func(x float64) string {
		if s.Type == kind.IntegerType {
			return strconv.FormatFloat(x, 'f', -1, 64)
		}
		return quantity.Exact(x, s.Dim)
	}
	switch s.Type {
	case kind.WordType, kind.TextType:
		return v.Text
	case kind.ListType:
		parts := make([]string, len(v.List))
		for i, x := range v.List {
			parts[i] = strconv.Quote(one(x))
		}
		return "[" + strings.Join(parts, ", ") + "]"
	}
	return one(v.Num)
}

// replace gives the part another kind and other settings.
func (p part) replace(k *kind.Kind, values kind.Values, was string) []scenarios.Change {
	changes := []scenarios.Change{{Path: p.path() + "kind", Value: k.Name}}
	if was == k.Name {
		// Settings that are to go only go with their kind.
		other := compensator.Kinds.Names()
		i := slices.IndexFunc(other, func(name string) bool { return name != was })
		changes = append([]scenarios.Change{{Path: p.path() + "kind", Value: other[i]}}, changes...)
	}
	for i := range k.Settings {
		s := &k.Settings[i]
		if v, ok := values[s.Name]; ok && (s.Type == kind.TextType || s.Check(v) == nil) {
			changes = append(changes, p.change(s, v))
		}
	}
	return changes
}

// readTyped reads what was typed for a setting. The error is the table's own.
func readTyped(s *kind.Setting, text string) (kind.Value, error) {
	text = strings.TrimSpace(text)
	if s.Type != kind.ListType {
		return s.Read(text)
	}
	var items []any
	for _, item := range strings.Split(text, ",") {
		items = append(items, strings.TrimSpace(item))
	}
	return s.Read(items)
}

// typable writes a value as one would type it.
func typable(s *kind.Setting, v kind.Value) string {
	switch s.Type {
	case kind.WordType, kind.TextType, kind.IntegerType:
		return s.FormatValue(v)
	case kind.ListType:
		parts := make([]string, len(v.List))
		for i, x := range v.List {
			parts[i] = quantity.Plain(x, s.Dim)
		}
		return strings.Join(parts, ", ")
	}
	return quantity.Plain(v.Num, s.Dim)
}

// A nudge moves a number by about a twentieth of itself: a step of 1, 2 or 5
// times a power of ten, so that values stay round. Coarse ones are ten times that.
const (
	nudges     = 20
	coarseStep = 10
)

// nudge moves a value by one step up or down.
func nudge(s *kind.Setting, v kind.Value, up, big bool) (kind.Value, error) {
	sign := 1.0
	if !up {
		sign = -1
	}
	switch s.Type {
	case kind.WordType:
		i := slices.Index(s.Words, v.Text) + int(sign)
		return kind.Text(s.Words[(i+len(s.Words))%len(s.Words)]), nil
	case kind.NumberType, kind.IntegerType:
	default:
		return v, fmt.Errorf("%s is typed: press enter", s.Name)
	}
	size := math.Abs(v.Num)
	if size == 0 {
		size = typical(s)
	}
	step := below125(size / nudges)
	if s.Type == kind.IntegerType {
		step = 1
	}
	if big {
		step *= coarseStep
	}
	x := tidy(math.Round(v.Num/step)*step + sign*step)
	if s.Type == kind.IntegerType {
		x = v.Num + sign*step
	}
	x = min(max(x, s.Min), s.Max)
	if x == v.Num {
		return v, fmt.Errorf("%s goes no further: %s", s.Name, s.RangeText())
	}
	return kind.Num(x), nil
}

// below125 is the largest 1, 2 or 5 times a power of ten that is not above v.
func below125(v float64) float64 {
	e := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{10, 5, 2} {
		if m*e <= v*(1+1e-9) {
			return tidy(m * e)
		}
	}
	return tidy(e)
}

// tidy rounds to twelve digits, so that decimal steps stay decimal.
func tidy(v float64) float64 {
	x, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 12, 64), 64)
	if err != nil {
		return v
	}
	return x
}

// unquote takes the quotes off an example.
func unquote(text string) string { return strings.Trim(text, `"`) }
