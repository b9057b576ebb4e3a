package scenarios

import (
	"fmt"
	"io"
	"slices"
	"strings"
	"text/tabwriter"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// Chapter is one table of kinds of the manual.
type Chapter struct {
	Title  string
	Header string // how a scenario opens a part of this sort
	Key    string // the key that names the kind
	Kinds  []*kind.Kind
}

// Chapters lists everything that a scenario can hold, from the tables.
func Chapters() []Chapter {
	return []Chapter{
		{"compensators", "[channel.compensator]", "kind", compensator.Kinds.Kinds()},
		{"actuators", "[channel.actuator]", "kind", plant.Actuators.Kinds()},
		{"specimens", "[[channel.specimen]]", "kind", plant.Elements.Kinds()},
		{"excitations", "[excitation]", "kind", excitation.Kinds.Kinds()},
		{"integrators", "[substructure]", "integrator", substructure.Integrators.Kinds()},
		{"sections", "", "", Sections()},
	}
}

// WriteManual writes the manual: of everything when name is "", of a chapter,
// or of one kind.
func WriteManual(w io.Writer, name string) error {
	var out strings.Builder
	if err := lookUp(name,
		func(c Chapter) { writeChapter(&out, c) },
		func(c Chapter, k *kind.Kind) { writeKind(&out, c, k) }); err != nil {
		return err
	}
	if name == "" {
		out.WriteString("antelag describe KIND shows its equation and settings.\n")
	}
	_, err := io.WriteString(w, out.String())
	return err
}

// lookUp finds what a name of the manual means: "" every chapter, else a
// chapter, or the kinds of that name.
func lookUp(name string, chapter func(Chapter), one func(Chapter, *kind.Kind)) error {
	var known []string
	found := name == ""
	for _, c := range Chapters() {
		known = append(known, c.Title)
		if name == "" || strings.EqualFold(name, c.Title) || strings.EqualFold(name+"s", c.Title) {
			found = true
			chapter(c)
		}
		for _, k := range c.Kinds {
			known = append(known, k.Name)
			if strings.EqualFold(name, k.Name) {
				found = true
				one(c, k)
			}
		}
	}
	if !found {
		slices.Sort(known)
		return &kind.UnknownError{What: "kind or chapter", Got: name, Known: known}
	}
	return nil
}

func writeChapter(out *strings.Builder, c Chapter) {
	fmt.Fprintf(out, "%s\n", c.Title)
	t := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	for _, k := range c.Kinds {
		fmt.Fprintf(t, "  %s\t%s\t%s\n", k.Name, k.Doc, k.Source)
	}
	t.Flush() //nolint:errcheck // a Builder does not fail
	out.WriteString("\n")
}

func writeKind(out *strings.Builder, c Chapter, k *kind.Kind) {
	fmt.Fprintf(out, "%s (%s): %s\n", k.Name, c.Title, k.Doc)
	if k.Equation != "" {
		fmt.Fprintf(out, "  equation  %s\n", k.Equation)
	}
	if k.Source != "" {
		fmt.Fprintf(out, "  source    %s\n", k.Source)
	}
	if len(k.Settings) > 0 {
		writeSettings(out, k)
	}
	out.WriteString("\n")
	if c.Header != "" {
		out.WriteString(c.Example(k))
		out.WriteString("\n")
	}
}

func writeSettings(out *strings.Builder, k *kind.Kind) {
	out.WriteString("\n")
	t := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	fmt.Fprintf(t, "  setting\tdefault\tallowed\tmeaning\n")
	for i := range k.Settings {
		s := &k.Settings[i]
		fmt.Fprintf(t, "  %s\t%s\t%s\t%s\n", s.Name, defaultText(s), s.Allowed(), s.Doc)
	}
	t.Flush() //nolint:errcheck // a Builder does not fail
}

func defaultText(s *kind.Setting) string {
	switch {
	case s.IsRequired():
		return "required"
	case s.IsOptional():
		return "none"
	}
	return s.FormatValue(s.Fallback)
}

// Example writes a block of a scenario that uses the kind: its defaults, and
// for what has none a value in the middle of the sensible range.
func (c Chapter) Example(k *kind.Kind) string {
	var out strings.Builder
	fmt.Fprintf(&out, "%s\n%s = %s\n", c.Header, c.Key, Quote(k.Name))
	for i := range k.Settings {
		s := &k.Settings[i]
		if value, ok := s.ExampleValue(); ok {
			fmt.Fprintf(&out, "%s = %s\n", s.Name, value)
		}
	}
	return out.String()
}
