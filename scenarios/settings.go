package scenarios

import (
	"strconv"
	"strings"

	"antelag/plant"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Resolved is one setting of a resolved scenario: where it is, as --set takes
// it, and its value as text that reads back to the very same value.
type Resolved struct{ Path, Text string }

// Settings lists every setting that a run or its judgement depends on, defaults
// included, in the order of the file: two runs of equal lists by the same
// version come to the same figures, but for the content of data files.
func (s *Scenario) Settings() []Resolved {
	l := &lister{driven: s.Excitation.Drives.Dim()}
	l.settings("loop", &loopSection, s.Loop)
	if sub := s.Substructure; sub != nil {
		l.settings("substructure", sub.Kind, sub.Values)
		for i, v := range sub.Storeys {
			l.settings("substructure.storey["+strconv.Itoa(i)+"]", &storeySection, v)
		}
	}
	l.settings("excitation", &excitationSection, s.excitationValues())
	l.part("excitation", s.Excitation.Part)
	for _, c := range s.Channels {
		if s.Substructure != nil {
			l.add(c.Name+".between", strconv.Itoa(c.Between[0])+", "+strconv.Itoa(c.Between[1]))
		}
		l.part(c.Name+".actuator", c.Actuator)
		for i, e := range c.Specimen {
			l.part(c.Name+".specimen["+strconv.Itoa(i)+"]", e)
		}
		l.part(c.Name+".compensator", c.Compensator)
		l.settings(c.Name+".sensor", &plant.SensorSettings, c.Sensor)
		l.settings(c.Name+".limits", &limitsSection, c.Limits)
	}
	for _, lane := range s.Lanes {
		if lane.Channel != "" {
			l.add("lane."+lane.Name+".channel", lane.Channel)
		}
		l.part("lane."+lane.Name+".compensator", lane.Compensator)
	}
	l.settings("accept", &acceptSection, s.Accept)
	return l.out
}

// lister gathers settings.
type lister struct {
	driven quantity.Dim
	out    []Resolved
}

func (l *lister) add(path, text string) { l.out = append(l.out, Resolved{path, text}) }

func (l *lister) part(path string, p Part) {
	l.add(path+".kind", p.Kind.Name)
	l.settings(path, p.Kind, p.Values)
}

func (l *lister) settings(path string, k *kind.Kind, v kind.Values) {
	for i := range k.Settings {
		setting := k.Settings[i].In(l.driven)
		if value, ok := v[setting.Name]; ok {
			l.add(path+"."+setting.Name, plainValue(&setting, value))
		}
	}
}

// plainValue writes a value for people, but so that nothing of it is lost.
func plainValue(s *kind.Setting, v kind.Value) string {
	switch s.Type {
	case kind.WordType, kind.TextType:
		return v.Text
	case kind.ListType, kind.MatrixType:
		parts := make([]string, len(v.List))
		for i, x := range v.List {
			parts[i] = plainNumber(s, x)
		}
		return strings.Join(parts, ", ")
	}
	return plainNumber(s, v.Num)
}

func plainNumber(s *kind.Setting, v float64) string {
	if s.Type == kind.IntegerType {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	text := quantity.Plain(v, s.Dim)
	if back, err := quantity.ParseAs(text, s.Dim); err == nil && back == v {
		return text
	}
	return quantity.Exact(v, s.Dim)
}
