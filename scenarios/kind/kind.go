// Package kind is the shape of one table of kinds. Every actuator, specimen
// element, compensator, excitation and every fixed section of a scenario is
// described by a Kind: a name, a line of documentation, a source, and its
// settings with dimension, default and sensible range. The scenario reader,
// its error messages, the manual pages, sweeps, tuning and the editor all
// work from these descriptions; none of them knows a setting by heart.
//
// The package knows quantities and nothing else: not what any kind does.
package kind

import (
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"github.com/agnivade/levenshtein"
)

// Kind describes one kind: what it is and what can be set.
type Kind struct {
	Name     string
	Doc      string // one line: what it is
	Equation string // the equation it solves, in the symbols of the source
	Source   string // published source, or "common practice"
	Settings []Setting
}

// Setting finds a setting by name. The error names the nearest one.
func (k *Kind) Setting(name string) (*Setting, error) {
	for i := range k.Settings {
		if k.Settings[i].Name == name {
			return &k.Settings[i], nil
		}
	}
	return nil, &UnknownError{What: "setting of " + k.Name, Got: name, Known: k.names()}
}

func (k *Kind) names() []string {
	names := make([]string, len(k.Settings))
	for i, s := range k.Settings {
		names[i] = s.Name
	}
	return names
}

// Resolve checks the given values and fills in the defaults. It is how code
// builds the values of a kind; text goes through Setting.Read first.
func (k *Kind) Resolve(given Values) (Values, error) {
	out := make(Values, len(k.Settings))
	for name, v := range given {
		s, err := k.Setting(name)
		if err != nil {
			return nil, err
		}
		if err := s.Check(v); err != nil {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		out[name] = v
	}
	for i := range k.Settings {
		s := &k.Settings[i]
		if _, ok := out[s.Name]; ok {
			continue
		}
		switch s.presence {
		case required:
			return nil, fmt.Errorf("%s: %w", s.Name, s.missing(k.Name))
		case defaulted:
			out[s.Name] = s.Fallback
		}
	}
	return out, nil
}

// Entry is one row of a table: the description of a kind and how to build it.
// B is the builder's function type, the same for every kind of one table.
type Entry[B any] struct {
	Kind
	New B
}

// Table is all kinds of one sort. What names the sort, as in "compensator".
type Table[B any] struct {
	What    string
	Entries []Entry[B]
}

// Find returns the entry of that name. The error names the nearest kind and
// lists the others.
func (t *Table[B]) Find(name string) (*Entry[B], error) {
	for i := range t.Entries {
		if t.Entries[i].Name == name {
			return &t.Entries[i], nil
		}
	}
	return nil, &UnknownError{What: t.What + " kind", Got: name, Known: t.Names()}
}

// Names lists the kinds in the order of the table.
func (t *Table[B]) Names() []string {
	names := make([]string, len(t.Entries))
	for i := range t.Entries {
		names[i] = t.Entries[i].Name
	}
	return names
}

// Kinds returns the descriptions alone, for readers and screens.
func (t *Table[B]) Kinds() []*Kind {
	kinds := make([]*Kind, len(t.Entries))
	for i := range t.Entries {
		kinds[i] = &t.Entries[i].Kind
	}
	return kinds
}

// UnknownError says that a name is none of those known.
type UnknownError struct {
	What  string // what the name should have been, "compensator kind"
	Got   string
	Known []string
}

func (e *UnknownError) Error() string {
	msg := fmt.Sprintf("unknown %s %q", e.What, e.Got)
	if near := Nearest(e.Got, e.Known); near != "" {
		msg += fmt.Sprintf("; did you mean %q?", near)
	}
	if len(e.Known) == 0 {
		return msg + " (none exists)"
	}
	return msg + " (known: " + strings.Join(e.Known, ", ") + ")"
}

// Nearest returns the known name that got is the beginning of, or else the one
// closest to it by edit distance, or "" when none is close enough to be a slip
// of the pen: at most half of got may differ, of short names two letters, and
// never all of them.
func Nearest(got string, known []string) string {
	for _, name := range known {
		if len(got) > 2 && strings.HasPrefix(strings.ToLower(name), strings.ToLower(got)) {
			return name
		}
	}
	letters := utf8.RuneCountInString(got)
	best, bestDistance := "", min(max(2, letters/2), letters-1)+1
	for _, name := range known {
		if d := levenshtein.ComputeDistance(strings.ToLower(got), strings.ToLower(name)); d < bestDistance {
			best, bestDistance = name, d
		}
	}
	return best
}

// Has reports whether the kind has a setting of that name.
func (k *Kind) Has(name string) bool { return slices.Contains(k.names(), name) }
