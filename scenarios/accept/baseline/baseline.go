// Package baseline keeps the figures of a scenario's run in a file beside the
// scenario and compares later runs with them, so that whatever changes a test,
// a setting, a plant, a default or a formula of a new version, shows as what it
// did to each figure. It knows verdicts; it runs nothing.
package baseline

import (
	"math"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// Baseline is what a scenario came to when it was recorded.
type Baseline struct {
	Version  string // of the program that recorded it
	Settings []scenarios.Resolved
	Entries  []Entry // in the order of the run
}

// Entry is one figure. Words, the outcome and what tripped, have no tolerance.
type Entry struct {
	Lane    string
	Channel string // "" for a figure of the whole lane
	Figure  string
	Word    string  // of an outcome or trip
	Was     float64 // SI; NaN is undefined
	Within  float64 // how far the figure may be from Was, SI
}

// key tells entries apart.
func (e *Entry) key() [3]string { return [3]string{e.Lane, e.Channel, e.Figure} }

// word reports whether the entry holds a word instead of a number.
func (e *Entry) word() bool { return isWord(e.Figure) }

func isWord(figure string) bool { return figure == "outcome" || figure == "trip" }

// Ending is how the name of a baseline file ends.
const Ending = ".baseline.toml"

// Path is the file of the baseline of a scenario.
func Path(scenario string) string { return strings.TrimSuffix(scenario, ".toml") + Ending }

// From takes the figures of a verdict.
func From(v *accept.Verdict, version string) *Baseline {
	b := &Baseline{Version: version, Settings: v.Scene.Settings()}
	for i := range v.Lanes {
		b.lane(v, &v.Lanes[i])
	}
	for i := range b.Entries {
		if e := &b.Entries[i]; e.Within == 0 && !e.word() {
			e.Within = b.usual(e)
		}
	}
	return b
}

func (b *Baseline) lane(v *accept.Verdict, l *accept.Lane) {
	b.Entries = append(b.Entries, Entry{Lane: l.Name, Figure: "outcome", Word: l.Outcome.String()})
	if l.Trip != nil {
		b.trip(v, l)
	}
	if v.Scene.Substructure != nil {
		for i := range laneFigures {
			b.Entries = append(b.Entries, laneFigures[i].entry(l.Name, "", l))
		}
	}
	for j := range l.Channels {
		for i := range channelFigures {
			f := &channelFigures[i]
			if f.name == "spectrum_error" && !v.Scene.Accept.Has(f.name) {
				continue // found only where it is asked for
			}
			b.Entries = append(b.Entries, f.entry(l.Name, l.Channels[j].Name, &l.Channels[j]))
		}
	}
}

// trip keeps which limit ended the lane, and when: a tick sooner or later may
// be a rounding beside the limit.
func (b *Baseline) trip(v *accept.Verdict, l *accept.Lane) {
	what := l.Trip.Limit
	if l.Trip.Channel != "" {
		what += " of " + l.Trip.Channel
	}
	b.Entries = append(b.Entries,
		Entry{Lane: l.Name, Figure: "trip", Word: what},
		Entry{Lane: l.Name, Figure: "trip_time", Was: l.Trip.Time, Within: roundUp(1.5 * v.Step)})
}

// holds reports whether a figure is still what it was.
func (e *Entry) holds(is *Entry) bool {
	if e.word() {
		return e.Word == is.Word
	}
	if math.IsNaN(e.Was) || math.IsNaN(is.Was) {
		return math.IsNaN(e.Was) && math.IsNaN(is.Was)
	}
	return math.Abs(is.Was-e.Was) <= e.Within
}

// number shows an undefined value as null in JSON.
func number(v float64) rtloop.Figure { return rtloop.Figure(v) }
