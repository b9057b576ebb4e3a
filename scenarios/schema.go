package scenarios

import (
	"slices"

	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// The fixed sections of a scenario, described like every kind.

// Loop is the [loop] section.
var loopSection = kind.Kind{
	Name: "loop", Doc: "the fixed-rate loop", Source: "common practice",
	Settings: []kind.Setting{
		kind.Number("rate", quantity.Frequency, "ticks per physical second").Range(10, 100e3),
		kind.Number("duration", quantity.Time, "length of the test in model time").Range(0.01, 7*86400),
		kind.Number("slowdown", quantity.None, "physical seconds per model second; 1 is real time").Default(1).Range(1, 10000),
		kind.Word("hold", "how a command gets from tick to tick: along a straight line, or at once", "ramp", "step"),
		kind.Integer("seed", "seed of all noise, so that a run repeats bit for bit").Default(1).Range(0, 1<<53),
		kind.Number("energy_window", quantity.Time, "trailing window of energy margin and synchronization subspace, model time; default: five periods of the first mode, or 5 s for a driven target").Optional().Range(0.01, 86400),
	},
}

const defaultIntegrator = "CR"

// integratorWords lists the integrators, the default first.
func integratorWords() []string {
	words := []string{defaultIntegrator}
	for _, name := range substructure.Names() {
		if name != defaultIntegrator {
			words = append(words, name)
		}
	}
	return words
}

var substructureSection = kind.Kind{
	Name: "substructure", Doc: "the numerical substructure: storeys, or full matrices", Source: "common practice",
	Settings: []kind.Setting{
		kind.Word("integrator", "how the structure is integrated; its own settings follow it", integratorWords()...),
		kind.Numbers("damping_ratio", quantity.None, "Rayleigh damping: the ratio of first and last mode of the whole structure, or one each").Optional().Range(0, 1),
		kind.Matrix("mass_matrix", quantity.Mass, "full mass matrix, instead of storeys").Optional().Range(-1e10, 1e10),
		kind.Matrix("stiffness_matrix", quantity.Stiffness, "full stiffness matrix, instead of storeys").Optional().Range(-1e13, 1e13),
		kind.Matrix("damping_matrix", quantity.Damping, "full damping matrix, instead of a ratio").Optional().Range(-1e13, 1e13),
		kind.Numbers("influence", quantity.None, "how the ground motion acts on each level of full matrices; default all 1").Optional().Range(-10, 10),
	},
}

// substructureKind is the [substructure] section with the settings of its
// integrator.
func substructureKind(integrator string) *kind.Kind {
	k := substructureSection
	if entry, err := substructure.Integrators.Find(integrator); err == nil {
		k.Settings = append(slices.Clone(k.Settings), entry.Settings...)
	}
	return &k
}

var storeySection = kind.Kind{
	Name: "storey", Doc: "one storey of a shear building, the lowest first", Source: "common practice",
	Settings: []kind.Setting{
		kind.Number("mass", quantity.Mass, "mass of the level on top of the storey").Range(1e-3, 1e9),
		kind.Number("stiffness", quantity.Stiffness, "initial lateral stiffness").Default(0).Range(0, 1e12),
		kind.Number("damping", quantity.Damping, "dashpot between the levels, instead of a damping ratio").Default(0).Range(0, 1e12),
		kind.Number("yield_displacement", quantity.Length, "storey drift at yield; without it the storey stays elastic").Optional().Range(1e-6, 10),
		kind.Number("hardening", quantity.None, "stiffness after yield over initial stiffness").Default(0).Range(0, 1),
	},
}

var excitationSection = kind.Kind{
	Name: "excitation", Doc: "what shakes the structure; kind names the source", Source: "common practice",
	Settings: []kind.Setting{
		kind.Word("drives", "what the excitation acts as: ground acceleration, force on a level, or the target itself", excitation.Words...),
		kind.Integer("level", "with drives = \"force\": the level that the force acts on; 0 is the topmost").Default(0).Range(0, 60),
	},
}

var limitsSection = kind.Kind{
	Name: "limits", Doc: "what a channel may reach before the loop trips", Source: "common practice",
	Settings: []kind.Setting{
		kind.Number("stroke", quantity.Length, "largest commanded or measured displacement").Optional().Range(1e-6, 100),
		kind.Number("velocity", quantity.Velocity, "largest velocity of the actuator, and largest change of the command in a tick over the tick, physical").Optional().Range(1e-6, 100),
		kind.Number("force", quantity.Force, "largest measured force").Optional().Range(1e-3, 1e10),
		kind.Number("error", quantity.Length, "largest difference of target and measured").Optional().Range(1e-7, 100),
	},
}

// acceptSection is the [accept] section. Package accept judges by it.
var acceptSection = kind.Kind{
	Name: "accept", Doc: "acceptance limits that a run must meet", Source: "common practice",
	Settings: []kind.Setting{
		kind.Number("nrmse", quantity.None, "largest rms tracking error over rms target").Optional().Range(0, 10),
		kind.Number("delay", quantity.Time, "largest remaining delay, late or early").Optional().Range(0, 1),
		kind.Number("peak_error", quantity.Length, "largest tracking error").Optional().Range(0, 10),
		kind.Number("energy_margin", quantity.None, "smallest energy margin at any time of the run").Optional().Range(-10, 1),
		kind.Number("spectrum_error", quantity.None, "largest rms deviation of the measured response spectrum (5 % damping, periods of 0.1 s to 3 s in model time) from the target's; for a driven target").Optional().Range(0, 10),
		kind.Number("response_error", quantity.None, "largest rms error of the structure's response over rms reference response").Optional().Range(0, 10),
	},
}

// What the reader reads by hand, described for the manual.
var (
	channelSection = kind.Kind{
		Name: "channel", Doc: "one actuator with its specimen, sensors, compensator and limits; [[channel]], as many as there are", Source: "common practice",
		Settings: []kind.Setting{
			kind.FreeText("name", "name of the channel, in paths and logs: letters, digits, _ and -").Optional().Sample(`"damper"`),
			kind.Numbers("between", quantity.None, "the two levels that the specimen acts between, 0 being the ground; the target is that of the second less that of the first").Optional().Range(0, 60).Sample("[0, 1]"),
		},
	}
	laneSection = kind.Kind{
		Name: "lane", Doc: "an alternative compensator, [lane.compensator], run beside the configured one; [[lane]], as many as wanted", Source: "common practice",
		Settings: []kind.Setting{
			kind.FreeText("name", "name of the lane").Optional().Sample(`"other"`),
			kind.FreeText("channel", "the one channel that it is for; without it, all").Optional(),
		},
	}
	spreadSection = kind.Kind{
		Name: "spread", Doc: "how far settings may be from their values in studies: \"PATH\" = 0.2 for a fifth either way, or = [low, high]", Source: "common practice",
	}
)

// Sections lists the fixed sections, for the manual.
func Sections() []*kind.Kind {
	return []*kind.Kind{
		&loopSection, &substructureSection, &storeySection, &excitationSection, &channelSection,
		&plant.SensorSettings, &limitsSection, &laneSection, &acceptSection, &spreadSection,
	}
}
