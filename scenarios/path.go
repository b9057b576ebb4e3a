package scenarios

import (
	"fmt"
	"maps"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"github.com/pelletier/go-toml/v2"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// Change is one setting given beside the file: PATH=VALUE.
type Change struct{ Path, Value string }

// ParseChange splits "damper.compensator.delay=12 ms".
func ParseChange(text string) (Change, error) {
	path, value, ok := strings.Cut(text, "=")
	path, value = strings.TrimSpace(path), strings.TrimSpace(value)
	if !ok || path == "" || value == "" {
		return Change{}, fmt.Errorf("%q: a setting is given as PATH=VALUE, like damper.compensator.delay=\"12 ms\"", text)
	}
	return Change{path, value}, nil
}

// apply puts a change into the tree. Whether the setting exists and the value
// is allowed is judged when the document is read, like text of the file.
func (d *document) apply(c Change) error {
	where := "--set " + c.Path
	fail := func(format string, args ...any) error {
		return &Error{Where: where, Err: fmt.Errorf(format, args...)}
	}
	full, err := d.expand(c.Path)
	if err != nil {
		return &Error{Where: where, Err: err}
	}
	steps := strings.Split(full, ".")
	at, path := d.tree, ""
	for _, step := range steps[:len(steps)-1] {
		name, index, err := splitStep(step)
		if err != nil {
			return fail("%w", err)
		}
		path = join(path, name)
		next, ok := at[name]
		if index < 0 {
			if !ok {
				next = map[string]any{}
				at[name] = next
				d.where[path] = where
			}
			if list, isList := next.([]any); isList && len(list) == 1 {
				next, path = list[0], path+"[0]"
			}
			if at, ok = next.(map[string]any); !ok {
				return fail("%s is not one section; name it with its number, like %s[0]", path, path)
			}
			continue
		}
		list, _ := next.([]any)
		if index >= len(list) {
			return fail("there is no %s[%d]; there are %d, counted from 0", path, index, len(list))
		}
		if at, ok = list[index].(map[string]any); !ok {
			return fail("%s[%d] is not a section", path, index)
		}
		path += "[" + strconv.Itoa(index) + "]"
	}
	key := steps[len(steps)-1]
	path = join(path, key)
	value := parseValue(c.Value)
	if word, ok := value.(string); ok && at[key] != word {
		d.dropOthers(full, key, at)
	}
	at[key] = value
	d.where[path] = where
	return nil
}

// chooses reports whether a change chooses what other settings mean.
func (c Change) chooses() bool {
	return strings.HasSuffix(c.Path, ".kind") || c.Path == "substructure.integrator"
}

// dropOthers takes out the settings that mean nothing any more when another
// kind or integrator is chosen in a section, and what [spread] says of them.
func (d *document) dropOthers(full, key string, section map[string]any) {
	switch {
	case key == "kind":
		maps.DeleteFunc(section, func(k string, _ any) bool {
			// What an excitation drives is no setting of its kind.
			return k != "drives" && (k != "level" || section["drives"] != "force")
		})
		if spread, ok := d.tree["spread"].(map[string]any); ok {
			maps.DeleteFunc(spread, func(p string, _ any) bool {
				of, err := d.expand(p)
				return err == nil && strings.HasPrefix(of, strings.TrimSuffix(full, "kind"))
			})
		}
	case full == "substructure.integrator":
		maps.DeleteFunc(section, func(k string, _ any) bool { return k != "storey" && !substructureSection.Has(k) })
	}
}

// expand turns the name of a channel or lane at the start of a path into its
// place in the tree.
func (d *document) expand(path string) (string, error) {
	first, rest, ok := strings.Cut(path, ".")
	if !ok && first != "title" {
		return "", fmt.Errorf("%q names no setting; a path is like loop.rate or damper.compensator.delay", path)
	}
	if first == "lane" {
		if name, inner, ok := strings.Cut(rest, "."); ok {
			if i := slices.Index(names(d.tree["lane"], "lane"), name); i >= 0 {
				return fmt.Sprintf("lane[%d].%s", i, inner), nil
			}
			return "", &kind.UnknownError{What: "lane", Got: name, Known: names(d.tree["lane"], "lane")}
		}
	}
	if name, _, err := splitStep(first); err == nil && slices.Contains(reserved, name) {
		return path, nil
	}
	if i := slices.Index(names(d.tree["channel"], "channel"), first); i >= 0 {
		return fmt.Sprintf("channel[%d].%s", i, rest), nil
	}
	known := append(names(d.tree["channel"], "channel"), "loop", "substructure", "excitation", "accept", "lane")
	return "", &kind.UnknownError{What: "channel or section", Got: first, Known: known}
}

// names lists the names of a list of tables; unnamed ones are called after
// what they are, channel1, channel2, ….
func names(list any, what string) []string {
	var out []string
	items, _ := list.([]any)
	for i, item := range items {
		t, _ := item.(map[string]any)
		name, ok := t["name"].(string)
		if !ok {
			name = what + strconv.Itoa(i+1)
		}
		out = append(out, name)
	}
	return out
}

var stepForm = regexp.MustCompile(`^([A-Za-z0-9_-]+)(?:\[(\d{1,4})\])?$`)

// splitStep takes "storey[1]" apart; the index is -1 where there is none.
func splitStep(step string) (name string, index int, err error) {
	m := stepForm.FindStringSubmatch(step)
	if m == nil {
		return "", 0, fmt.Errorf("%q is no step of a path", step)
	}
	if m[2] == "" {
		return m[1], -1, nil
	}
	index, err = strconv.Atoi(m[2])
	return m[1], index, err
}

// parseValue reads the right side of a change: anything that TOML takes as a
// value, else a bare text like 12 ms.
func parseValue(text string) any {
	var t map[string]any
	if err := toml.Unmarshal([]byte("v = "+text+"\n"), &t); err == nil && len(t) == 1 {
		return t["v"]
	}
	return text
}

// Located is a setting found by its path.
type Located struct {
	Setting kind.Setting
	Values  kind.Values // of the part that has it
}

// Locate finds a setting of a resolved scenario by its path, like
// damper.compensator.delay, loop.rate or substructure.storey[1].mass.
func (s *Scenario) Locate(path string) (Located, error) {
	steps := strings.Split(path, ".")
	if len(steps) < 2 {
		return Located{}, fmt.Errorf("%q names no setting; a path is like loop.rate or damper.compensator.delay", path)
	}
	k, values, err := s.section(steps[:len(steps)-1])
	if err != nil {
		return Located{}, err
	}
	setting, err := k.Setting(steps[len(steps)-1])
	if err != nil {
		return Located{}, err
	}
	return Located{setting.In(s.Excitation.Drives.Dim()), values}, nil
}

// section finds the part that a path without its last step leads to.
func (s *Scenario) section(steps []string) (*kind.Kind, kind.Values, error) {
	name, index, err := splitStep(steps[0])
	if err != nil {
		return nil, nil, err
	}
	rest := steps[1:]
	switch {
	case name == "loop" && len(rest) == 0:
		return &loopSection, s.Loop, nil
	case name == "accept" && len(rest) == 0:
		return &acceptSection, s.Accept, nil
	case name == "excitation" && len(rest) == 0:
		return s.Excitation.Part.Kind, s.Excitation.Part.Values, nil
	case name == "substructure" && s.Substructure != nil:
		return s.Substructure.section(rest)
	case name == "lane" && len(rest) == 2 && rest[1] == "compensator":
		for i := range s.Lanes {
			if s.Lanes[i].Name == rest[0] {
				return s.Lanes[i].Compensator.Kind, s.Lanes[i].Compensator.Values, nil
			}
		}
		return nil, nil, fmt.Errorf("no lane %q", rest[0])
	case name == "channel" && index >= 0 && index < len(s.Channels):
		return s.Channels[index].section(rest)
	}
	for i := range s.Channels {
		if s.Channels[i].Name == name {
			return s.Channels[i].section(rest)
		}
	}
	return nil, nil, &kind.UnknownError{What: "channel or section", Got: name,
		Known: append(channelNames(s.Channels), "loop", "substructure", "excitation", "accept", "lane")}
}

func (s *Substructure) section(rest []string) (*kind.Kind, kind.Values, error) {
	if len(rest) == 0 {
		return s.Kind, s.Values, nil
	}
	name, index, err := splitStep(rest[0])
	switch {
	case err != nil:
		return nil, nil, err
	case name != "storey" || len(rest) > 1:
		return nil, nil, &kind.UnknownError{What: "section of substructure", Got: rest[0], Known: []string{"storey"}}
	case index < 0 || index >= len(s.Storeys):
		return nil, nil, fmt.Errorf("there is no %s; there are %d storeys, counted from 0", rest[0], len(s.Storeys))
	}
	return &storeySection, s.Storeys[index], nil
}

func (c *Channel) section(rest []string) (*kind.Kind, kind.Values, error) {
	sections := []string{"actuator", "specimen", "compensator", "sensor", "limits"}
	if len(rest) != 1 {
		return nil, nil, fmt.Errorf("channel %s has the sections %s", c.Name, strings.Join(sections, ", "))
	}
	name, index, err := splitStep(rest[0])
	if err != nil {
		return nil, nil, err
	}
	switch name {
	case "actuator":
		return c.Actuator.Kind, c.Actuator.Values, nil
	case "compensator":
		return c.Compensator.Kind, c.Compensator.Values, nil
	case "sensor":
		return &plant.SensorSettings, c.Sensor, nil
	case "limits":
		return &limitsSection, c.Limits, nil
	case "specimen":
		if index < 0 && len(c.Specimen) == 1 {
			index = 0
		}
		if index < 0 || index >= len(c.Specimen) {
			return nil, nil, fmt.Errorf("channel %s has %d specimen elements; name one like specimen[0]", c.Name, len(c.Specimen))
		}
		return c.Specimen[index].Kind, c.Specimen[index].Values, nil
	}
	return nil, nil, &kind.UnknownError{What: "section of channel " + c.Name, Got: name, Known: sections}
}
