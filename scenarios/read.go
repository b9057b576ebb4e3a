package scenarios

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// reader turns a document into a Scenario. It keeps the first error and does
// nothing after it.
type reader struct {
	doc *document
	err error
}

func (r *reader) fail(path string, err error) {
	if r.err == nil {
		r.err = r.doc.errorAt(path, err)
	}
}

func (r *reader) failf(path, format string, args ...any) { r.fail(path, fmt.Errorf(format, args...)) }

// read checks a document against the schema.
func read(doc *document, dir string) (*Scenario, error) {
	r := &reader{doc: doc}
	s := &Scenario{Name: doc.file, doc: doc, dir: dir}
	root := doc.tree
	r.known(root, "", "title", "loop", "substructure", "excitation", "channel", "lane", "accept", "spread", "provenance")
	s.Title = r.text(root, "title", "title", "untitled")
	s.Loop = r.section(&loopSection, r.table(root, "loop", "loop", true), "loop", quantity.None)
	s.Excitation = r.excitation(r.table(root, "excitation", "excitation", true))
	s.Channels = r.channels(root)
	s.Substructure = r.substructure(root, s.Excitation.Drives)
	s.Lanes = r.lanes(root, s.Channels)
	s.Accept = r.section(&acceptSection, r.table(root, "accept", "accept", false), "accept", quantity.None)
	if r.err == nil {
		r.levels(s)
		r.idle(s)
	}
	if r.err == nil {
		s.Spread = r.spread(s, r.table(root, "spread", "spread", false))
	}
	if r.err == nil {
		r.length(s)
	}
	if r.err != nil {
		return nil, r.err
	}
	return s, nil
}

// known complains about a key that a table may not have.
func (r *reader) known(t map[string]any, path string, keys ...string) {
	what := "section of a scenario"
	if path != "" {
		what = "key"
	}
	for _, key := range sortedKeys(t) {
		if !slices.Contains(keys, key) {
			r.fail(join(path, key), &kind.UnknownError{What: what, Got: key, Known: keys})
			return
		}
	}
}

func sortedKeys(t map[string]any) []string {
	keys := make([]string, 0, len(t))
	for key := range t {
		keys = append(keys, key)
	}
	slices.Sort(keys)
	return keys
}

// table returns the table at a key; an absent one is empty, or an error when
// it is needed.
func (r *reader) table(parent map[string]any, key, path string, needed bool) map[string]any {
	raw, ok := parent[key]
	if !ok {
		if needed {
			r.failf(path, "the section [%s] is missing", plainPath(path))
		}
		return nil
	}
	t, ok := raw.(map[string]any)
	if !ok {
		r.failf(path, "must be a section, [%s]", plainPath(path))
	}
	return t
}

var indexes = regexp.MustCompile(`\[\d+\]`)

func plainPath(path string) string { return indexes.ReplaceAllString(path, "") }

// tables returns the tables of an array of tables.
func (r *reader) tables(parent map[string]any, key, path string) []map[string]any {
	raw, ok := parent[key]
	if !ok {
		return nil
	}
	list, ok := raw.([]any)
	if !ok {
		r.failf(path, "must be a list of sections, [[%s]] with double brackets", plainPath(path))
		return nil
	}
	out := make([]map[string]any, len(list))
	for i, item := range list {
		if out[i], ok = item.(map[string]any); !ok {
			r.failf(path, "must be a list of sections, [[%s]] with double brackets", plainPath(path))
			return nil
		}
	}
	return out
}

func (r *reader) text(t map[string]any, key, path, fallback string) string {
	raw, ok := t[key]
	if !ok {
		return fallback
	}
	text, ok := raw.(string)
	if !ok {
		r.failf(path, "%v is not a text", raw)
	}
	return text
}

// section reads the settings of one kind from a table, which may also hold
// the extra keys. Defaults are filled in.
func (r *reader) section(k *kind.Kind, t map[string]any, path string, driven quantity.Dim, extra ...string) kind.Values {
	values := kind.Values{}
	if r.err != nil {
		return values
	}
	for _, key := range sortedKeys(t) {
		if slices.Contains(extra, key) {
			continue
		}
		setting, err := k.Setting(key)
		if err != nil {
			var unknown *kind.UnknownError
			if errors.As(err, &unknown) {
				unknown.Known = append(unknown.Known, extra...)
			}
			r.fail(join(path, key), err)
			return values
		}
		own := setting.In(driven)
		if values[key], err = own.Read(t[key]); err != nil {
			r.fail(join(path, key), err)
			return values
		}
	}
	for i := range k.Settings {
		setting := k.Settings[i].In(driven)
		if _, given := values[setting.Name]; given {
			continue
		}
		if setting.IsRequired() {
			r.fail(join(path, setting.Name), setting.Missing(k.Name))
			return values
		}
		if setting.HasDefault() {
			values[setting.Name] = setting.Fallback
		}
	}
	return values
}

// part reads a table whose key "kind" chooses from a table of kinds.
func part[B any](r *reader, table *kind.Table[B], t map[string]any, path string, driven quantity.Dim, extra ...string) Part {
	if r.err != nil {
		return Part{}
	}
	raw, ok := t["kind"]
	if !ok {
		r.failf(join(path, "kind"), "is missing; known kinds are %v", table.Names())
		return Part{}
	}
	name, ok := raw.(string)
	if !ok {
		r.failf(join(path, "kind"), "%v is not a text; known kinds are %v", raw, table.Names())
		return Part{}
	}
	entry, err := table.Find(name)
	if err != nil {
		r.fail(join(path, "kind"), err)
		return Part{}
	}
	return Part{&entry.Kind, r.section(&entry.Kind, t, path, driven, append(extra, "kind")...)}
}

func (r *reader) excitation(t map[string]any) Excitation {
	var e Excitation
	own := map[string]any{}
	var keys []string
	for _, s := range excitationSection.Settings {
		keys = append(keys, s.Name)
		if v, ok := t[s.Name]; ok {
			own[s.Name] = v
		}
	}
	// A release has a level of its own: the one that is held.
	if t["kind"] == "release" {
		delete(own, "level")
		keys = slices.DeleteFunc(keys, func(k string) bool { return k == "level" })
	}
	e.Values = r.section(&excitationSection, own, "excitation", quantity.None)
	if r.err != nil {
		return e
	}
	e.Drives = excitation.Drives(slices.Index(excitation.Words, e.Values.Text("drives")))
	e.Part = part(r, &excitation.Kinds, t, "excitation", e.Drives.Dim(), keys...)
	return e
}

var channelKeys = []string{"name", "between", "actuator", "specimen", "compensator", "sensor", "limits"}

// maxChannels bounds what one test may drive; real ones have a handful.
const maxChannels = 60

func (r *reader) channels(root map[string]any) []Channel {
	tables := r.tables(root, "channel", "channel")
	if r.err == nil && len(tables) == 0 {
		r.failf("channel", "no channel; a test needs at least one [[channel]]")
	}
	if len(tables) > maxChannels {
		r.failf("channel", "%d channels; at most %d", len(tables), maxChannels)
		return nil
	}
	var out []Channel
	for i, t := range tables {
		path := "channel[" + strconv.Itoa(i) + "]"
		r.known(t, path, channelKeys...)
		c := Channel{Name: r.text(t, "name", path+".name", "channel"+strconv.Itoa(i+1)), Between: r.between(t, path)}
		r.name(c.Name, path+".name", func(name string) bool {
			return slices.ContainsFunc(out, func(o Channel) bool { return o.Name == name })
		})
		c.Actuator = part(r, &plant.Actuators, r.table(t, "actuator", path+".actuator", true), path+".actuator", quantity.None)
		for k, e := range r.tables(t, "specimen", path+".specimen") {
			c.Specimen = append(c.Specimen, part(r, &plant.Elements, e, path+".specimen["+strconv.Itoa(k)+"]", quantity.None))
		}
		c.Compensator = part(r, &compensator.Kinds, r.table(t, "compensator", path+".compensator", true), path+".compensator", quantity.None)
		c.Sensor = r.section(&plant.SensorSettings, r.table(t, "sensor", path+".sensor", false), path+".sensor", quantity.None)
		c.Limits = r.section(&limitsSection, r.table(t, "limits", path+".limits", false), path+".limits", quantity.None)
		out = append(out, c)
	}
	return out
}

var (
	goodName = regexp.MustCompile(`^[A-Za-z0-9_-]+$`)
	reserved = []string{"title", "loop", "substructure", "excitation", "channel", "lane", "accept", "spread", "provenance"}
)

func (r *reader) name(name, path string, taken func(string) bool) {
	switch {
	case !goodName.MatchString(name):
		r.failf(path, "%q is no name; letters, digits, _ and - make one", name)
	case slices.Contains(reserved, name):
		r.failf(path, "%q is the name of a section; choose another", name)
	case taken(name):
		r.failf(path, "%q stands twice", name)
	}
}

// between reads the two levels that a channel acts between.
func (r *reader) between(t map[string]any, path string) [2]int {
	raw, ok := t["between"]
	if !ok {
		return [2]int{0, 1}
	}
	path += ".between"
	list, _ := raw.([]any)
	var levels []int
	for _, item := range list {
		if v, ok := item.(int64); ok && v >= 0 && v <= 1000 {
			levels = append(levels, int(v))
		}
	}
	if len(list) != 2 || len(levels) != 2 || levels[0] == levels[1] {
		r.failf(path, "%v does not name two levels; it must be like [0, 1], 0 being the ground", raw)
		return [2]int{0, 1}
	}
	return [2]int{levels[0], levels[1]}
}

func (r *reader) substructure(root map[string]any, drives excitation.Drives) *Substructure {
	t := r.table(root, "substructure", "substructure", drives != excitation.Target)
	if drives == excitation.Target {
		if t != nil {
			r.failf("substructure", "a driven target needs no numerical substructure; remove the section, or let the excitation drive the ground or a force")
		}
		return nil
	}
	name := r.text(t, "integrator", "substructure.integrator", defaultIntegrator)
	if _, err := substructure.Integrators.Find(name); err != nil {
		r.fail("substructure.integrator", err)
	}
	k := substructureKind(name)
	for _, key := range sortedKeys(t) {
		for _, other := range substructure.Integrators.Kinds() {
			if !k.Has(key) && other.Has(key) {
				r.failf("substructure."+key, "is a setting of the integrator %s; here it is %s", other.Name, name)
			}
		}
	}
	s := &Substructure{Part: Part{k, r.section(k, t, "substructure", quantity.None, "storey")}}
	for i, storey := range r.tables(t, "storey", "substructure.storey") {
		s.Storeys = append(s.Storeys, r.section(&storeySection, storey, "substructure.storey["+strconv.Itoa(i)+"]", quantity.None))
	}
	if r.err != nil {
		return nil
	}
	matrices := s.Values.Has("mass_matrix") || s.Values.Has("stiffness_matrix")
	switch {
	case len(s.Storeys) > 0 && (matrices || s.Values.Has("damping_matrix") || s.Values.Has("influence")):
		r.failf("substructure", "has storeys and full matrices; give one or the other")
	case len(s.Storeys) == 0 && !(s.Values.Has("mass_matrix") && s.Values.Has("stiffness_matrix")):
		r.failf("substructure", "needs storeys, [[substructure.storey]], or both mass_matrix and stiffness_matrix")
	case s.Levels() > substructure.MaxLevels:
		r.failf("substructure", "has %d levels; at most %d", s.Levels(), substructure.MaxLevels)
	}
	return s
}

func (r *reader) lanes(root map[string]any, channels []Channel) []Lane {
	var out []Lane
	for i, t := range r.tables(root, "lane", "lane") {
		path := "lane[" + strconv.Itoa(i) + "]"
		r.known(t, path, "name", "channel", "compensator")
		l := Lane{Name: r.text(t, "name", path+".name", "lane"+strconv.Itoa(i+1)), Channel: r.text(t, "channel", path+".channel", "")}
		r.name(l.Name, path+".name", func(name string) bool {
			return name == Configured || slices.ContainsFunc(out, func(o Lane) bool { return o.Name == name })
		})
		if l.Channel != "" && !slices.ContainsFunc(channels, func(c Channel) bool { return c.Name == l.Channel }) {
			r.fail(path+".channel", &kind.UnknownError{What: "channel", Got: l.Channel, Known: channelNames(channels)})
		}
		l.Compensator = part(r, &compensator.Kinds, r.table(t, "compensator", path+".compensator", true), path+".compensator", quantity.None)
		out = append(out, l)
	}
	return out
}

func channelNames(channels []Channel) []string {
	names := make([]string, len(channels))
	for i, c := range channels {
		names[i] = c.Name
	}
	return names
}

// levels checks every level that the scenario names against the structure.
func (r *reader) levels(s *Scenario) {
	if s.Substructure == nil {
		return
	}
	n := s.Substructure.Levels()
	for i, c := range s.Channels {
		if top := max(c.Between[0], c.Between[1]); top > n {
			r.failf("channel["+strconv.Itoa(i)+"].between", "names level %d; the structure has levels 0 (ground) to %d", top, n)
		}
	}
	level := s.Excitation.Values.Int("level")
	if s.Excitation.Part.Values.Has("level") {
		level = s.Excitation.Part.Values.Int("level")
	}
	if level > n {
		r.failf("excitation.level", "is %d; the structure has levels 1 to %d", level, n)
	}
}

// idle complains about what is set and would do nothing: who set it expects
// something.
func (r *reader) idle(s *Scenario) {
	e, _ := r.doc.tree["excitation"].(map[string]any)
	if _, set := e["level"]; set && s.Excitation.Drives != excitation.Force && !s.Excitation.Part.Values.Has("level") {
		r.failf("excitation.level", "is for drives = \"force\"; here the excitation drives the %s", s.Excitation.Values.Text("drives"))
	}
	if s.Excitation.Drives != excitation.Target {
		if s.Accept.Has("spectrum_error") {
			r.failf("accept.spectrum_error", "is for drives = \"target\": it compares the motion of a table with its target")
		}
		return
	}
	for i, c := range r.tables(r.doc.tree, "channel", "channel") {
		if _, set := c["between"]; set {
			r.failf("channel["+strconv.Itoa(i)+"].between", "means nothing with drives = \"target\": there is no structure")
		}
	}
	for _, limit := range []string{"energy_margin", "response_error"} {
		if s.Accept.Has(limit) {
			r.failf("accept."+limit, "cannot be judged with drives = \"target\": there is no structure and no loop")
		}
	}
}

// maxTicks bounds a run: at a few hundred nanoseconds a tick this is a day of
// computing.
const maxTicks = 1e11

func (r *reader) length(s *Scenario) {
	ticks := s.Loop.Num("rate") * s.Loop.Num("duration") * s.Loop.Num("slowdown")
	switch {
	case ticks > maxTicks:
		r.failf("loop.duration", "rate, duration and slowdown make %.3g ticks; at most %.0e", ticks, maxTicks)
	case math.Round(ticks) < 2:
		r.failf("loop.duration", "rate and duration make %.3g ticks; at least 2", ticks)
	}
}
