package accept

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// drawn writes one random scenario from the tables of kinds: every setting is
// left at its default, drawn near what a scenario typically says, or drawn
// anywhere inside its range or exactly at an end. It knows the sections of a
// scenario, but no kind: one that is added is drawn too.
//
// Settings of one kind that contradict each other are mostly drawn again: a
// scenario that is refused tests little. What contradicts is for the kinds to
// say.
type drawn struct {
	*rand.Rand
	wild    float64 // share of the numbers that are drawn from the whole range
	odd     float64 // share of the optional settings that no example gives
	refused float64 // share of the contradictions that stay
	flagged float64 // share of the settings that are given beside the file

	timing plant.Timing
	source excitation.Context
	levels int

	text  strings.Builder
	flags []scenarios.Change
}

// Ticks of a run: few, so that many runs are quick, and now and then more than
// one block of the pipeline that the lanes run behind (1024).
const fewTicks, manyTicks = 200, 1500

// draw returns the scenario of that number: its text and what is changed
// beside it. The record kinds find their files in dir under these names.
func draw(number uint64) (text string, flags []scenarios.Change) {
	d := &drawn{Rand: rand.New(rand.NewPCG(number, 0x5eed))}
	d.wild = pick(d, 0, 0.02, 0.05, 0.2, 0.5, 1)
	d.odd = pick(d, 0, 0, 0.05, 0.3)
	d.refused = pick(d, 0, 0, 0, 0.2)
	d.flagged = pick(d, 0, 0, 0, 0.05)
	drives := excitation.Drives(d.IntN(len(excitation.Words)))
	d.source.Drives, d.source.Open = drives, openRecord
	fmt.Fprintf(&d.text, "title = \"drawn %d\"\n", number)
	d.loop()
	if drives != excitation.Target {
		d.substructure()
	}
	d.excitation()
	names := make([]string, 1+d.IntN(3))
	for i := range names {
		names[i] = string(rune('a' + i))
		d.channel(names[i])
	}
	for i := range d.IntN(3) {
		d.lane("lane-"+strconv.Itoa(i), names)
	}
	d.accept(drives)
	return d.text.String(), d.flags
}

// pick draws one of the choices.
func pick[T any](d *drawn, choices ...T) T { return choices[d.IntN(len(choices))] }

func (d *drawn) chance(p float64) bool { return d.Float64() < p }

// section finds one of the fixed sections of a scenario.
func section(name string) *kind.Kind {
	for _, k := range scenarios.Sections() {
		if k.Name == name {
			return k
		}
	}
	panic("no section " + name)
}

func setting(k *kind.Kind, name string) *kind.Setting {
	s, err := k.Setting(name)
	if err != nil {
		panic(err)
	}
	return s
}

func (d *drawn) header(text string) { d.text.WriteString("\n" + text + "\n") }

// put writes one value, into the file or beside it.
func (d *drawn) put(path, key, value string) {
	if d.chance(d.flagged) {
		d.flags = append(d.flags, scenarios.Change{Path: path + "." + key, Value: value})
		return
	}
	fmt.Fprintf(&d.text, "%s = %s\n", key, value)
}

// settings writes all settings of a kind but those that are written already.
func (d *drawn) settings(k *kind.Kind, path string, but ...string) {
	d.write(k, d.values(k, but...), path)
}

func (d *drawn) write(k *kind.Kind, v kind.Values, path string) {
	for i := range k.Settings {
		s := k.Settings[i].In(d.source.Drives.Dim())
		if value, given := v[s.Name]; given {
			d.put(path, s.Name, written(&s, value))
		}
	}
}

// values draws settings of a kind.
func (d *drawn) values(k *kind.Kind, but ...string) kind.Values {
	values, lists := kind.Values{}, 1+d.IntN(3)
	for i := range k.Settings {
		s := k.Settings[i].In(d.source.Drives.Dim())
		if slices.Contains(but, s.Name) {
			continue
		}
		if v, given := d.value(&s, lists); given {
			values[s.Name] = v
		}
	}
	return values
}

// attempts bounds how often settings are drawn that contradict each other.
const attempts = 10

// part writes a kind of a table and its settings, such as mostly fit together.
func part[B any](d *drawn, header, path string, table *kind.Table[B], build func(B, kind.Values) error) *kind.Kind {
	var entry *kind.Entry[B]
	var values kind.Values
	for range attempts {
		entry = &table.Entries[d.IntN(len(table.Entries))]
		values = d.values(&entry.Kind)
		if d.chance(d.refused) {
			break
		}
		all := maps.Clone(values)
		for i := range entry.Settings {
			if s := &entry.Settings[i]; s.HasDefault() && !all.Has(s.Name) {
				all[s.Name] = s.Fallback
			}
		}
		if build(entry.New, all) == nil {
			break
		}
	}
	if header != "" {
		d.header(header)
	}
	fmt.Fprintf(&d.text, "kind = %q\n", entry.Name)
	d.write(&entry.Kind, values, path)
	return &entry.Kind
}

func (d *drawn) actuator(n plant.NewActuator, v kind.Values) error {
	_, err := n(d.timing, v)
	return err
}
func (d *drawn) element(n plant.NewElement, v kind.Values) error { _, err := n(v); return err }
func (d *drawn) motion(n excitation.New, v kind.Values) error    { _, err := n(d.source, v); return err }
func (d *drawn) method(n compensator.New, v kind.Values) error {
	_, err := n(d.timing.Tick, v)
	return err
}

// loop keeps rate, slowdown and duration such that the run is short; each by
// itself is drawn from its range.
func (d *drawn) loop() {
	k := section("loop")
	rate, slowdown, duration := setting(k, "rate"), setting(k, "slowdown"), setting(k, "duration")
	ticks := float64(2 + d.IntN(fewTicks))
	if d.chance(0.01) {
		ticks = fewTicks + float64(d.IntN(manyTicks-fewTicks))
	}
	r := logUniform(d, 256, 4096)
	if d.chance(d.wild) {
		r = clip(rate, pick(d, logUniform(d, rate.Min, rate.Max), rate.Min, rate.Max))
	}
	slow := 1.0
	if most := min(slowdown.Max, ticks/(r*duration.Min)); most > 1 && d.chance(0.3) {
		slow = pick(d, logUniform(d, 1, most), most)
	}
	d.header("[loop]")
	span := clip(duration, ticks/(r*slow))
	d.put("loop", "rate", written(rate, kind.Num(r)))
	d.put("loop", "slowdown", written(slowdown, kind.Num(slow)))
	d.put("loop", "duration", written(duration, kind.Num(span)))
	d.timing.Tick, d.source.Step, d.source.Duration = 1/r, 1/(r*slow), span
	d.settings(k, "loop", "rate", "slowdown", "duration")
}

func (d *drawn) substructure() {
	k := section("substructure")
	integrator := pick(d, substructure.Integrators.Entries...)
	d.levels = 1 + d.IntN(4)
	d.header("[substructure]")
	d.put("substructure", "integrator", strconv.Quote(integrator.Name))
	d.settings(&integrator.Kind, "substructure")
	full := d.chance(0.25)
	dashpots := d.chance(0.3)
	if !dashpots {
		ratio := setting(k, "damping_ratio")
		d.put("substructure", "damping_ratio", written(ratio, d.list(ratio, pick(d, 1, 1, 1, min(2, d.levels)), 0.05)))
	}
	if full {
		d.matrices(k, dashpots)
		return
	}
	storey := section("storey")
	for i := range d.levels {
		path := fmt.Sprintf("substructure.storey[%d]", i)
		d.header("[[substructure.storey]]")
		d.put(path, "mass", d.typical(storey, "mass"))
		d.put(path, "stiffness", d.typical(storey, "stiffness"))
		if dashpots {
			d.put(path, "damping", d.typical(storey, "damping"))
		}
		if d.chance(0.25) {
			d.put(path, "yield_displacement", d.typical(storey, "yield_displacement"))
			d.settings(storey, path, "mass", "stiffness", "damping", "yield_displacement")
		}
	}
}

// matrices writes full matrices: of a chain, whose masses may be coupled, or of
// anything that is symmetric.
func (d *drawn) matrices(k *kind.Kind, dashpots bool) {
	storey := section("storey")
	d.put("substructure", "mass_matrix", d.matrix(setting(k, "mass_matrix"), setting(storey, "mass"), false))
	d.put("substructure", "stiffness_matrix", d.matrix(setting(k, "stiffness_matrix"), setting(storey, "stiffness"), true))
	if dashpots {
		d.put("substructure", "damping_matrix", d.matrix(setting(k, "damping_matrix"), setting(storey, "damping"), true))
	}
	if d.chance(0.3) {
		influence := setting(k, "influence")
		d.put("substructure", "influence", written(influence, d.list(influence, d.levels, 1)))
	}
}

func (d *drawn) matrix(s, of *kind.Setting, chain bool) string {
	n := d.levels
	m := kind.Value{List: make([]float64, n*n), Rows: n}
	at := func(i, j int) *float64 { return &m.List[i*n+j] }
	anything := d.chance(d.wild / 4)
	for i := range n {
		x := d.number(of, typicalOf(of))
		*at(i, i) += x
		if i > 0 && chain {
			*at(i-1, i-1) += x
			*at(i, i-1), *at(i-1, i) = -x, -x
		}
	}
	for i := range n {
		for j := range i {
			switch {
			case anything:
				*at(i, j) = pick(d, 1, -1, 0.) * d.number(s, typicalOf(of))
			case !chain && d.chance(0.3):
				*at(i, j) = 0.1 * min(*at(i, i), *at(j, j))
			}
			*at(j, i) = *at(i, j)
		}
	}
	return written(s, m)
}

func (d *drawn) excitation() {
	d.header("[excitation]")
	d.put("excitation", "drives", strconv.Quote(excitation.Words[d.source.Drives]))
	source := part(d, "", "excitation", &excitation.Kinds, d.motion)
	if d.source.Drives == excitation.Force && !source.Has("level") && d.chance(0.5) {
		d.put("excitation", "level", strconv.Itoa(d.IntN(d.levels+1)))
	}
}

func (d *drawn) channel(name string) {
	d.header("[[channel]]")
	fmt.Fprintf(&d.text, "name = %q\n", name)
	if d.levels > 0 {
		from := d.IntN(d.levels + 1)
		fmt.Fprintf(&d.text, "between = [%d, %d]\n", from, (from+1+d.IntN(d.levels))%(d.levels+1))
	}
	part(d, "[channel.actuator]", name+".actuator", &plant.Actuators, d.actuator)
	for i := range d.IntN(4) {
		part(d, "[[channel.specimen]]", fmt.Sprintf("%s.specimen[%d]", name, i), &plant.Elements, d.element)
	}
	part(d, "[channel.compensator]", name+".compensator", &compensator.Kinds, d.method)
	d.header("[channel.sensor]")
	d.sensor(name + ".sensor")
	d.header("[channel.limits]")
	limits := section("limits")
	for i := range limits.Settings {
		if s := &limits.Settings[i]; d.chance(0.4) {
			d.put(name+".limits", s.Name, written(s, kind.Num(pick(d, s.Max, logUniform(d, s.Max/1e4, s.Max), logUniform(d, s.Min, s.Max)))))
		}
	}
}

func (d *drawn) sensor(path string) {
	k := &plant.SensorSettings
	var values kind.Values
	for range attempts {
		values = d.values(k)
		all, err := k.Resolve(values)
		for _, of := range []string{"displacement", "force"} {
			if err == nil {
				_, err = plant.NewSensor(d.timing.Tick, all, of, 1)
			}
		}
		if err == nil || d.chance(d.refused) {
			break
		}
	}
	d.write(k, values, path)
}

func (d *drawn) lane(name string, channels []string) {
	d.header("[[lane]]")
	fmt.Fprintf(&d.text, "name = %q\n", name)
	if d.chance(0.5) {
		fmt.Fprintf(&d.text, "channel = %q\n", pick(d, channels...))
	}
	part(d, "[lane.compensator]", "lane."+name+".compensator", &compensator.Kinds, d.method)
}

// accept draws limits, mostly of those that mean something for what is driven.
func (d *drawn) accept(drives excitation.Drives) {
	d.header("[accept]")
	k := section("accept")
	for i := range k.Settings {
		s := &k.Settings[i]
		target := s.Name == "spectrum_error"
		either := s.Name != "energy_margin" && s.Name != "response_error" && !target
		if fits := either || target == (drives == excitation.Target); d.chance(0.4) && (fits || d.chance(d.wild/10)) {
			d.put("accept", s.Name, written(s, kind.Num(pick(d, s.Min, s.Max, s.Max, uniform(d, s.Min, s.Max)))))
		}
	}
}
