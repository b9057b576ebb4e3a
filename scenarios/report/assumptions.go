package report

import (
	"fmt"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
)

// assumptions says what the verdict rests on and what it does not cover, in so
// far as the scenario tells.
func (r *run) assumptions() Part {
	return Part{Heading: "Assumed, and not tested", List: r.assumed(),
		Text: []string{"The verdict holds for the models and settings on this page. It rests on:"}}
}

func (r *run) assumed() (list []string) {
	add := func(format string, args ...any) { list = append(list, fmt.Sprintf(format, args...)) }
	for i := range r.s.Channels {
		r.assumedOf(&r.s.Channels[i], add)
	}
	add("One motion, %s%s. Other motions, amplitudes and directions were not tried.", r.s.Excitation.Kind.Name, r.seeded())
	if r.s.Substructure != nil {
		add("The specimens' force comes back only through the channels named here; actuators do not move each other or their reaction frame.")
	}
	add("Every tick is met: computing, converters and the network take no time beyond the actuator's delay, and no sample is late or lost.")
	if slow := r.s.Loop.Num("slowdown"); slow != 1 {
		add("The test is slowed down %g times: what depends on speed in the specimen (viscous, friction, strain rate, inertia) is not what it would be at real speed.", slow)
	}
	switch {
	case len(r.s.Spread) > 0 && r.spread == nil:
		add("The scenario says how far settings may be off, [spread]; this page is of their nominal values alone. A sweep over the spread was not given.")
	case len(r.s.Spread) == 0 && r.spread == nil:
		add("All settings are as stated. How far they may be off was not stated and not tried.")
	}
	var missing []string
	for _, name := range accept.Figures() {
		structural := name == "energy_margin" || name == "response_error"
		if r.s.Accept.Has(name) || structural && r.s.Substructure == nil || name == "spectrum_error" {
			continue
		}
		missing = append(missing, accept.Label(name))
	}
	if len(missing) > 0 {
		add("No acceptance limit was given for: %s.", strings.Join(missing, "; "))
	}
	return list
}

func (r *run) seeded() string {
	for _, c := range r.s.Channels {
		if c.Sensor.Num("displacement_noise") > 0 || c.Sensor.Num("force_noise") > 0 {
			return fmt.Sprintf(", one draw of all noise (seed %d)", r.s.Loop.Int("seed"))
		}
	}
	if strings.Contains(r.s.Excitation.Kind.Name, "noise") {
		return fmt.Sprintf(", one draw of it (seed %d)", r.s.Loop.Int("seed"))
	}
	return ""
}

// assumedOf says what is assumed of a channel.
func (r *run) assumedOf(c *scenarios.Channel, add func(string, ...any)) {
	at := ""
	if len(r.s.Channels) > 1 {
		at = "Channel " + c.Name + ": "
	}
	add("%sThe actuator is a %s whose settings stay the same. A real one changes with oil temperature, supply pressure, amplitude and load: identify it on the day.", at, c.Actuator.Kind.Name)
	if c.Actuator.Kind.Name != "servo-hydraulic" {
		add("%sThis model of the actuator does not saturate, and the specimen's force does not slow it.", at)
	}
	if len(c.Specimen) > 0 {
		var names []string
		for _, e := range c.Specimen {
			names = append(names, e.Kind.Name)
		}
		add("%sThe specimen behaves like its model (%s); wear, heat, damage and play are not in it.", at, listed(names))
	}
	if perfect(c.Sensor) {
		add("%sSensors are perfect: no noise, bias, quantum or filter.", at)
	}
	var none []string
	for _, name := range []string{"stroke", "velocity", "force", "error"} {
		if !c.Limits.Has(name) {
			none = append(none, name)
		}
	}
	if len(none) > 0 {
		add("%sNo trip limit on %s is set.", at, listed(none))
	}
}

func perfect(v kind.Values) bool {
	for name, x := range v {
		plain := 0.0
		if strings.HasSuffix(name, "_gain") {
			plain = 1
		}
		if x.Num != plain {
			return false
		}
	}
	return true
}
