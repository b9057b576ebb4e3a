// Package scenarios reads, checks, changes, writes and builds scenarios: the
// text that describes a hybrid test. It holds the schema; what a kind of part
// can be set to comes from the tables of the packages that build it.
package scenarios

import (
	"slices"

	"antelag/rtloop/excitation"
	"antelag/scenarios/kind"
)

// Part is one part of a test: its kind and its resolved settings.
type Part struct {
	Kind   *kind.Kind
	Values kind.Values
}

// Scenario is a whole test, resolved: every value in SI, every default filled
// in, everything checked.
type Scenario struct {
	Name         string // the file, or the name of an embedded scenario
	Title        string
	Loop         kind.Values
	Substructure *Substructure // nil when the excitation drives the target
	Excitation   Excitation
	Channels     []Channel
	Lanes        []Lane      // alternatives to the configured lane
	Accept       kind.Values // limits that were given
	Spread       []Spread

	doc *document
	dir string // where the files that it names are looked for
}

// Substructure is the numerical substructure as written.
type Substructure struct {
	Part                  // the section with the settings of its integrator
	Storeys []kind.Values // none: full matrices
}

// Levels returns the number of levels.
func (s *Substructure) Levels() int {
	if len(s.Storeys) > 0 {
		return len(s.Storeys)
	}
	return s.Values["mass_matrix"].Rows
}

// Excitation is the source and what it drives.
type Excitation struct {
	Part
	Drives excitation.Drives
	Values kind.Values // of the section itself
}

// kind is the kind with the settings of the section itself.
func (e *Excitation) kind() *kind.Kind {
	k := *e.Kind
	k.Settings = append(slices.Clone(k.Settings), excitationSection.Settings...)
	return &k
}

// Channel is one actuator with all that belongs to it.
type Channel struct {
	Name           string
	Between        [2]int
	Actuator       Part
	Specimen       []Part
	Compensator    Part
	Sensor, Limits kind.Values
}

// Lane is an alternative: other compensator settings for one channel, or, when
// Channel is "", for all.
type Lane struct {
	Name        string
	Channel     string
	Compensator Part
}

// Spread says how far a setting may be from its value, for studies.
type Spread struct {
	Path      string
	Low, High float64 // SI
}

// Configured is the name of the lane that uses the channels' own compensators.
const Configured = "configured"

// Compensator returns the compensator that a lane has for channel i.
func (s *Scenario) Compensator(lane string, i int) Part {
	for _, l := range s.Lanes {
		if l.Name == lane && (l.Channel == "" || l.Channel == s.Channels[i].Name) {
			return l.Compensator
		}
	}
	return s.Channels[i].Compensator
}
