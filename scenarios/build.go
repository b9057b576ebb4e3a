package scenarios

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/gonum/mat"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// targetWindow is the trailing window of a tracking test, which has no first
// mode to take five periods of, s.
const targetWindow = 5.0

// builder builds the loops of one scenario.
type builder struct {
	s         *Scenario
	structure *substructure.Structure
	initial   []float64
	window    float64
	ticks     int64
	memory    int  // ticks that a loop remembers for a compensator that takes over
	bare      bool // no gauges
}

// Build makes everything that runs: the motion, the reference response and
// one loop per lane, the configured one first. An error is an *Error that
// names the setting.
func (s *Scenario) Build() (*rtloop.Rig, error) { return s.BuildLive(0) }

// BuildLive is Build for a rig whose compensators may be replaced while it
// runs: the loops remember so many seconds of physical time for them.
func (s *Scenario) BuildLive(memory float64) (*rtloop.Rig, error) {
	b, rig, err := s.bare()
	if err != nil {
		return nil, err
	}
	b.memory = int(math.Ceil(memory * s.Loop.Num("rate")))
	for i := -1; i < len(s.Lanes); i++ {
		lane, err := b.named(i)
		if err != nil {
			return nil, err
		}
		rig.Lanes = append(rig.Lanes, lane)
	}
	return rig, nil
}

// builder readies all that the loops of a scenario have in common; motion is
// made unless there is one.
func (s *Scenario) builder(motion excitation.Source) (*builder, excitation.Source, error) {
	b := &builder{s: s, ticks: int64(math.Round(s.Loop.Num("rate") * s.Loop.Num("duration") * s.Loop.Num("slowdown")))}
	if motion == nil {
		var err error
		if motion, err = b.motion(); err != nil {
			return nil, nil, s.doc.settingError("excitation", s.Excitation.kind(), err)
		}
	}
	if s.Substructure != nil {
		if err := b.buildStructure(); err != nil {
			return nil, nil, b.structureError(err)
		}
		if err := b.release(motion); err != nil {
			return nil, nil, s.doc.settingError("excitation", s.Excitation.Kind, err)
		}
	}
	b.window = b.energyWindow()
	return b, motion, b.check()
}

// named builds lane i; -1 is the configured one.
func (b *builder) named(i int) (*rtloop.Lane, error) {
	lane := &rtloop.Lane{Name: Configured}
	if i >= 0 {
		lane.Name = b.s.Lanes[i].Name
	}
	var err error
	lane.Loop, err = b.lane(i)
	return lane, err
}

func (b *builder) tick() float64 { return 1 / b.s.Loop.Num("rate") }

// step is the model time of a tick.
func (b *builder) step() float64 { return b.tick() / b.s.Loop.Num("slowdown") }

func (b *builder) motion() (excitation.Source, error) {
	e := b.s.Excitation
	entry, err := excitation.Kinds.Find(e.Kind.Name)
	if err != nil {
		return nil, err
	}
	return entry.New(excitation.Context{
		Step: b.step(), Duration: b.s.Loop.Num("duration"), Seed: uint64(b.s.Loop.Num("seed")),
		Drives: e.Drives, Open: b.s.open,
	}, e.Part.Values)
}

func (b *builder) buildStructure() error {
	var at []substructure.Attachment
	for i := range b.s.Channels {
		c := &b.s.Channels[i]
		specimen, err := b.specimen(i)
		if err != nil {
			return err
		}
		at = append(at, substructure.Attachment{From: c.Between[0], To: c.Between[1], Stiffness: specimen.Stiffness()})
	}
	sub := b.s.Substructure
	damping := substructure.Damping{}
	if sub.Values.Has("damping_ratio") {
		damping.Ratios = sub.Values.List("damping_ratio")
	}
	var err error
	if len(sub.Storeys) > 0 {
		b.structure, err = substructure.FromStoreys(storeys(sub.Storeys), damping, at)
		return err
	}
	mass, err := symmetric(sub.Values, "mass_matrix")
	if err != nil {
		return err
	}
	stiffness, err := symmetric(sub.Values, "stiffness_matrix")
	if err != nil {
		return err
	}
	dashpots, err := symmetric(sub.Values, "damping_matrix")
	if err != nil {
		return err
	}
	var influence []float64
	if sub.Values.Has("influence") {
		influence = sub.Values.List("influence")
	}
	b.structure, err = substructure.FromMatrices(mass, stiffness, dashpots, influence, damping, at)
	return err
}

// structureError places what package substructure says: "storey 2: mass: …" at
// that storey's setting, "mass: …" at the matrix.
func (b *builder) structureError(err error) error {
	path, k := "substructure", &substructureSection
	var placed *Error
	if errors.As(err, &placed) {
		return err
	}
	text := err.Error()
	first, rest, _ := strings.Cut(text, ": ")
	var storey int
	switch n, _ := fmt.Sscanf(first, "storey %d", &storey); {
	case n == 1:
		path, k, text = fmt.Sprintf("substructure.storey[%d]", storey-1), &storeySection, rest
	case b.s.Substructure.Values.Has(first + "_matrix"):
		text = first + "_matrix: " + rest
	}
	return b.s.doc.settingError(path, k, &settingProblem{text, err})
}

func storeys(values []kind.Values) []substructure.Storey {
	out := make([]substructure.Storey, len(values))
	for i, v := range values {
		out[i] = substructure.Storey{Mass: v.Num("mass"), Stiffness: v.Num("stiffness"), Damping: v.Num("damping"), Hardening: v.Num("hardening")}
		if v.Has("yield_displacement") {
			out[i].YieldDisplacement = v.Num("yield_displacement")
		}
	}
	return out
}

// symmetric reads a matrix setting; one that was not given is nil.
func symmetric(v kind.Values, name string) (*mat.SymDense, error) {
	if !v.Has(name) {
		return nil, nil
	}
	m, err := substructure.Symmetric(v[name].Rows, v[name].List)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	return m, nil
}

// release sets the initial displacements when the motion is a release.
func (b *builder) release(motion excitation.Source) error {
	r, ok := motion.(excitation.Release)
	if !ok {
		return nil
	}
	x, level := r.Initial()
	if level == 0 {
		level = b.structure.N()
	}
	var specimens []*plant.Specimen
	for j := range b.s.Channels {
		s, err := b.specimen(j)
		if err != nil {
			return err
		}
		specimens = append(specimens, s)
	}
	var err error
	b.initial, err = b.structure.Held(level, x, func(j int, extension float64) float64 {
		specimens[j].Start(extension)
		return specimens[j].Force()
	})
	return err
}

// energyWindow is five periods of the first mode unless the scenario says.
func (b *builder) energyWindow() float64 {
	window := targetWindow
	switch {
	case b.s.Loop.Has("energy_window"):
		window = b.s.Loop.Num("energy_window")
	case b.structure != nil:
		window = 5 * 2 * math.Pi / b.structure.Frequencies()[0]
	}
	return min(window, b.s.Loop.Num("duration"))
}

// integrator returns the integrator's name and those settings of the section
// that are its own.
func (s *Substructure) integrator() (string, kind.Values) {
	own := kind.Values{}
	for name, v := range s.Values {
		if !substructureSection.Has(name) {
			own[name] = v
		}
	}
	return s.Values.Text("integrator"), own
}

func (b *builder) config(channels []rtloop.Channel) rtloop.Config {
	level := b.s.Excitation.Values.Int("level")
	if level == 0 && b.s.Substructure != nil {
		level = b.s.Substructure.Levels()
	}
	cfg := rtloop.Config{
		Tick: b.tick(), Slowdown: b.s.Loop.Num("slowdown"), Drives: b.s.Excitation.Drives, Level: level,
		Structure: b.structure, Initial: b.initial, Channels: channels, Window: b.window, Ticks: b.ticks, Memory: b.memory,
		Spectra: b.s.Accept.Has("spectrum_error"), Judge: !b.bare,
	}
	if b.s.Substructure != nil {
		cfg.Integrator, cfg.Method = b.s.Substructure.integrator()
	}
	return cfg
}

// loop builds one loop; what may fail there is the integrator.
func (b *builder) loop(cfg rtloop.Config) (*rtloop.Loop, error) {
	l, err := rtloop.NewLoop(cfg)
	if err != nil {
		return nil, b.s.doc.settingError("substructure", &substructureSection, err)
	}
	return l, nil
}

// found is an entry of a table with values resolved for it.
type found[B any] struct {
	*kind.Entry[B]
	values kind.Values
}

func buildPart[B any](table *kind.Table[B], name string, given kind.Values) (found[B], error) {
	entry, err := table.Find(name)
	if err != nil {
		return found[B]{}, err
	}
	values, err := entry.Resolve(given)
	return found[B]{entry, values}, err
}

// lane builds the loop of lane i; -1 is the configured one.
func (b *builder) lane(i int) (*rtloop.Loop, error) {
	var channels []rtloop.Channel
	for j := range b.s.Channels {
		c, err := b.compensated(i, j)
		if err != nil {
			return nil, err
		}
		channels = append(channels, c)
	}
	return b.loop(b.config(channels))
}

// compensated builds channel j with the compensator that lane i has there.
func (b *builder) compensated(i, j int) (rtloop.Channel, error) {
	part, path := b.s.Channels[j].Compensator, "channel["+strconv.Itoa(j)+"].compensator"
	if i >= 0 && (b.s.Lanes[i].Channel == "" || b.s.Lanes[i].Channel == b.s.Channels[j].Name) {
		part, path = b.s.Lanes[i].Compensator, "lane["+strconv.Itoa(i)+"].compensator"
	}
	c, err := b.channel(j)
	if err != nil {
		return c, err
	}
	c.Method = part.Kind.Name
	comp, err := buildPart(&compensator.Kinds, part.Kind.Name, part.Values)
	if err == nil {
		c.Compensator, err = comp.New(b.tick(), comp.values)
	}
	return c, b.s.doc.settingError(path, part.Kind, err)
}

// channel builds all of channel j but its compensator.
func (b *builder) channel(j int) (rtloop.Channel, error) {
	s, path := &b.s.Channels[j], "channel["+strconv.Itoa(j)+"]"
	c := rtloop.Channel{Name: s.Name, Limits: limits(s.Limits)}
	fail := func(section string, k *kind.Kind, err error) (rtloop.Channel, error) {
		return c, b.s.doc.settingError(path+"."+section, k, err)
	}
	timing := plant.Timing{Tick: b.tick()}
	if b.s.Loop.Text("hold") == "step" {
		timing.Hold = plant.Step
	}
	actuator, err := buildPart(&plant.Actuators, s.Actuator.Kind.Name, s.Actuator.Values)
	if err == nil {
		c.Actuator, err = actuator.New(timing, actuator.values)
	}
	if err != nil {
		return fail("actuator", s.Actuator.Kind, err)
	}
	if c.Specimen, err = b.specimen(j); err != nil {
		return c, err
	}
	// Each sensor has a stream of its own, the same in every lane, so that
	// lanes are compared under the same noise.
	seed := uint64(b.s.Loop.Num("seed"))
	if c.Displacement, err = plant.NewSensor(b.tick(), s.Sensor, "displacement", sensorSeed(seed, j, 0)); err != nil {
		return fail("sensor", &plant.SensorSettings, err)
	}
	if c.Force, err = plant.NewSensor(b.tick(), s.Sensor, "force", sensorSeed(seed, j, 1)); err != nil {
		return fail("sensor", &plant.SensorSettings, err)
	}
	return c, nil
}

func sensorSeed(seed uint64, channel, sensor int) uint64 {
	return seed + uint64(2*channel+sensor+1)*0x9e3779b97f4a7c15
}

func (b *builder) specimen(j int) (*plant.Specimen, error) {
	var elements []plant.Element
	for i, part := range b.s.Channels[j].Specimen {
		entry, err := buildPart(&plant.Elements, part.Kind.Name, part.Values)
		if err != nil {
			return nil, err
		}
		e, err := entry.New(entry.values)
		if err != nil {
			return nil, b.s.doc.settingError(fmt.Sprintf("channel[%d].specimen[%d]", j, i), part.Kind, err)
		}
		elements = append(elements, e)
	}
	return plant.NewSpecimen(elements...), nil
}

func limits(v kind.Values) rtloop.Limits {
	get := func(name string) float64 {
		if v.Has(name) {
			return v.Num(name)
		}
		return math.Inf(1)
	}
	return rtloop.Limits{Stroke: get("stroke"), Velocity: get("velocity"), Force: get("force"), Error: get("error")}
}

// settingError places what a builder of a part says. Builders name the
// setting they could not work with first, "delay: …"; that setting's line is
// then the place.
func (d *document) settingError(path string, k *kind.Kind, err error) error {
	var placed *Error
	if err == nil || errors.As(err, &placed) {
		return err
	}
	name, rest, ok := strings.Cut(err.Error(), ": ")
	if ok && k.Has(name) {
		return d.errorAt(join(path, name), &settingProblem{rest, err})
	}
	return d.errorAt(path, err)
}

// settingProblem shows an error without the setting's name in front, which
// its place tells already.
type settingProblem struct {
	text string
	err  error
}

func (e *settingProblem) Error() string { return e.text }
func (e *settingProblem) Unwrap() error { return e.err }
