package scenarios

import (
	"reflect"
	"regexp"
	"strings"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var (
	goodSetting = regexp.MustCompile(`^[a-z][a-z0-9]*(_[a-z0-9]+)*$`)
	goodKind    = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9]*(-[A-Za-z0-9]+)*$`)
)

// oneLine is how a line of documentation must look beside its setting.
func oneLine(doc string) bool {
	return doc != "" && strings.TrimSpace(doc) == doc && !strings.ContainsAny(doc, "\n\t") && !strings.HasSuffix(doc, ".")
}

// Every kind of every table keeps the promises that readers, manuals and
// messages rely on.
func TestEveryKind(t *testing.T) {
	tables := map[string][]*kind.Kind{
		"actuator": plant.Actuators.Kinds(), "specimen": plant.Elements.Kinds(), "compensator": compensator.Kinds.Kinds(),
		"excitation": excitation.Kinds.Kinds(), "integrator": substructure.Integrators.Kinds(), "section": Sections(),
	}
	names := map[string]string{}
	for table, kinds := range tables {
		if len(kinds) == 0 {
			t.Errorf("no %s", table)
		}
		for _, k := range kinds {
			t.Run(table+"/"+k.Name, func(t *testing.T) {
				// describe finds a kind by its name alone.
				if other, taken := names[k.Name]; taken {
					t.Errorf("the name is that of a kind of %s as well", other)
				}
				names[k.Name] = table
				if !goodKind.MatchString(k.Name) || !oneLine(k.Doc) || !oneLine(k.Source) {
					t.Errorf("name %q, doc %q, source %q", k.Name, k.Doc, k.Source)
				}
				if table != "section" && (k.Equation == "" || strings.Contains(k.Equation, "\n")) {
					t.Errorf("equation %q", k.Equation)
				}
				seen := map[string]bool{"kind": true} // which the file uses to choose
				for i := range k.Settings {
					s := &k.Settings[i]
					if seen[s.Name] {
						t.Errorf("%s stands twice, or is taken", s.Name)
					}
					seen[s.Name] = true
					checkSetting(t, s)
				}
			})
		}
	}
}

func checkSetting(t *testing.T, s *kind.Setting) {
	t.Helper()
	if !goodSetting.MatchString(s.Name) {
		t.Errorf("%s is not lower_snake_case", s.Name)
	}
	if !oneLine(s.Doc) {
		t.Errorf("%s: doc %q", s.Name, s.Doc)
	}
	if !(s.Min < s.Max) && s.Type != kind.WordType && s.Type != kind.TextType {
		t.Errorf("%s: range %g to %g", s.Name, s.Min, s.Max)
	}
	if s.Driven != (s.In(quantity.Force).Dim == quantity.Force && s.Dim == quantity.None) {
		t.Errorf("%s: driven %v with dimension %s", s.Name, s.Driven, s.Dim)
	}
	if s.HasDefault() {
		if err := s.Check(s.Fallback); err != nil {
			t.Errorf("%s: its default: %v", s.Name, err)
		}
	}
	// What an example shows is read back, and a default as itself up to the
	// six digits that are shown.
	if text, ok := s.ExampleValue(); ok {
		own := s.In(quantity.Acceleration)
		v, err := own.Read(parseValue(text))
		if err != nil {
			t.Errorf("%s: its example %s: %v", s.Name, text, err)
		}
		if s.Type == kind.WordType && !reflect.DeepEqual(v, s.Fallback) {
			t.Errorf("%s: the example is %v, the default %v", s.Name, v, s.Fallback)
		}
	} else if s.IsRequired() {
		t.Errorf("%s is required and has no example", s.Name)
	}
	if len(s.Words) > 0 != (s.Type == kind.WordType) {
		t.Errorf("%s: words %v", s.Name, s.Words)
	}
}

// Every kind builds from what is required of it alone, and at both ends of
// the range of each other setting it either builds or says which setting is
// to blame: values that are each allowed never panic together.
func TestEveryCompensatorAtTheEnds(t *testing.T) {
	for _, e := range compensator.Kinds.Entries {
		atTheEnds(t, &e.Kind, func(v kind.Values) error { _, err := e.New(1.0/1024, v); return err })
	}
}

func TestEveryActuatorAtTheEnds(t *testing.T) {
	for _, e := range plant.Actuators.Entries {
		atTheEnds(t, &e.Kind, func(v kind.Values) error { _, err := e.New(plant.Timing{Tick: 1.0 / 1024}, v); return err })
	}
}

func TestEveryElementAtTheEnds(t *testing.T) {
	for _, e := range plant.Elements.Entries {
		atTheEnds(t, &e.Kind, func(v kind.Values) error { _, err := e.New(v); return err })
	}
}

func atTheEnds(t *testing.T, k *kind.Kind, build func(kind.Values) error) {
	t.Helper()
	example := func() kind.Values {
		given := kind.Values{}
		for i := range k.Settings {
			s := &k.Settings[i]
			if text, ok := s.ExampleValue(); ok {
				v, err := s.Read(parseValue(text))
				if err != nil {
					t.Fatalf("%s.%s: %v", k.Name, s.Name, err)
				}
				given[s.Name] = v
			}
		}
		return given
	}
	try := func(what string, given kind.Values) {
		v, err := k.Resolve(given)
		if err != nil {
			t.Errorf("%s, %s: %v", k.Name, what, err)
			return
		}
		if err := build(v); err != nil {
			name, _, _ := strings.Cut(err.Error(), ": ")
			if !k.Has(name) {
				t.Errorf("%s, %s: the error does not name a setting: %v", k.Name, what, err)
			}
		}
	}
	if err := build(must(k.Resolve(example()))); err != nil {
		t.Errorf("%s: its example: %v", k.Name, err)
	}
	for i := range k.Settings {
		s := &k.Settings[i]
		for _, end := range []float64{s.Min, s.Max} {
			if s.Check(kind.Num(end)) != nil || s.Type != kind.NumberType && s.Type != kind.IntegerType {
				continue // an open end, or no number
			}
			given := example()
			given[s.Name] = kind.Num(end)
			try(s.Name+" = "+s.Format(end), given)
		}
	}
}

func must(v kind.Values, err error) kind.Values {
	if err != nil {
		panic(err)
	}
	return v
}
