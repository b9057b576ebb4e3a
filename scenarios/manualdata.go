package scenarios

import "antelag/scenarios/kind"

// Entry is one kind of the manual as data, SI, for programs that read it.
type Entry struct {
	Chapter  string         `json:"chapter"`
	Name     string         `json:"name"`
	Doc      string         `json:"doc"`
	Equation string         `json:"equation,omitempty"`
	Source   string         `json:"source"`
	Settings []EntrySetting `json:"settings"`
}

// EntrySetting is one setting of an Entry. What does not apply is left out: a
// word has no smallest value, a required setting no default.
type EntrySetting struct {
	Name     string   `json:"name"`
	Doc      string   `json:"doc"`
	Unit     string   `json:"unit,omitempty"` // SI
	Driven   bool     `json:"driven,omitempty"`
	Required bool     `json:"required"`
	Default  any      `json:"default,omitempty"`
	Min      *float64 `json:"min,omitempty"`
	Max      *float64 `json:"max,omitempty"`
	Words    []string `json:"words,omitempty"`
}

// Manual returns the manual as data: of everything when name is "", of a
// chapter, or of one kind.
func Manual(name string) ([]Entry, error) {
	var out []Entry
	err := lookUp(name,
		func(c Chapter) {
			for _, k := range c.Kinds {
				out = append(out, entry(c, k))
			}
		},
		func(c Chapter, k *kind.Kind) { out = append(out, entry(c, k)) })
	return out, err
}

func entry(c Chapter, k *kind.Kind) Entry {
	e := Entry{Chapter: c.Title, Name: k.Name, Doc: k.Doc, Equation: k.Equation, Source: k.Source, Settings: []EntrySetting{}}
	for i := range k.Settings {
		s := &k.Settings[i]
		es := EntrySetting{Name: s.Name, Doc: s.Doc, Unit: s.Dim.SI(), Driven: s.Driven, Required: s.IsRequired(), Words: s.Words}
		if s.HasRange() {
			es.Min, es.Max = &s.Min, &s.Max
		}
		switch {
		case !s.HasDefault():
		case s.Type == kind.WordType || s.Type == kind.TextType:
			es.Default = s.Fallback.Text
		case s.Type == kind.ListType || s.Type == kind.MatrixType:
			es.Default = s.Fallback.List
		default:
			es.Default = s.Fallback.Num
		}
		e.Settings = append(e.Settings, es)
	}
	return e
}
