package study

import (
	"math"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Column is one figure of a run: of the worst channel, or of the lane.
type Column struct {
	Figure  string // "delay", "energy_margin", "peak_force"
	Label   string // "tracking error, rms"
	Channel string // "": the worst of all, or none in particular
	Dim     quantity.Dim

	judged bool // one that an acceptance limit can judge
	get    func(l *accept.Lane) float64
}

// Name is the name of the column, with its unit: "delay_s", "damper.nrmse".
func (c *Column) Name() string {
	name := c.Figure + suffix(c.Dim)
	if c.Channel != "" {
		name = c.Channel + "." + name
	}
	return name
}

var suffixes = strings.NewReplacer("/", "_", "*", "_", "^-", "_per", "^", "", "Hz", "hz")

// suffix is a unit as names of columns end in it.
func suffix(d quantity.Dim) string {
	if d == quantity.None {
		return ""
	}
	return "_" + suffixes.Replace(d.SI())
}

// SettingName is the column of a setting that varies.
func SettingName(path string, s *kind.Setting) string { return path + suffix(s.Dim) }

// Column is the name that the setting has as a column, with its unit.
func (r *Range) Column() string { return SettingName(r.Path, &r.Setting) }

// channelFigures are found for each channel.
var channelFigures = []struct {
	name, label string
	dim         quantity.Dim
	get         func(*rtloop.ChannelResult) rtloop.Figure
}{
	{"nrmse", "", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.NRMSE }},
	{"delay", "", quantity.Time, func(c *rtloop.ChannelResult) rtloop.Figure { return c.Delay }},
	{"peak_error", "", quantity.Length, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakError }},
	{"spectrum_error", "", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.SpectrumError }},
	{"peak_command", "command, peak", quantity.Length, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakCommand }},
	{"peak_velocity", "velocity, peak", quantity.Velocity, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakVelocity }},
	{"peak_command_velocity", "command velocity, peak", quantity.Velocity, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakHurry }},
	{"peak_force", "force, peak", quantity.Force, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakForce }},
}

// columns are the figures that runs of the scenario have: those that can be
// judged, in the order of judgement, then the others, each of the worst channel;
// then, where there are several channels, those of each.
func columns(s *scenarios.Scenario) []Column {
	var out []Column
	for _, name := range accept.Figures() {
		structure := name == "energy_margin" || name == "response_error"
		if structure && s.Substructure == nil || name == "spectrum_error" && !s.Accept.Has(name) {
			continue
		}
		_, dim := new(accept.Lane).Figure(name)
		out = append(out, Column{Figure: name, Label: accept.Label(name), Dim: dim, judged: true, get: func(l *accept.Lane) float64 {
			v, _ := l.Figure(name)
			return v
		}})
	}
	if s.Substructure != nil {
		out = append(out, Column{Figure: "added_damping", Label: "added damping", get: func(l *accept.Lane) float64 { return float64(l.Energy.AddedDamping) }})
	}
	for _, f := range channelFigures {
		if f.label == "" {
			continue
		}
		out = append(out, Column{Figure: f.name, Label: f.label, Dim: f.dim, get: func(l *accept.Lane) float64 {
			worst := 0.0
			for j := range l.Channels {
				worst = math.Max(worst, float64(f.get(&l.Channels[j])))
			}
			return worst
		}})
	}
	if len(s.Channels) < 2 {
		return out
	}
	for j, c := range s.Channels {
		for _, f := range channelFigures {
			if f.name == "spectrum_error" && !s.Accept.Has(f.name) {
				continue
			}
			out = append(out, Column{Figure: f.name, Label: f.label, Channel: c.Name, Dim: f.dim, get: func(l *accept.Lane) float64 {
				return float64(f.get(&l.Channels[j]))
			}})
		}
	}
	return out
}

// Judged reports whether an acceptance limit can judge the figure.
func (c *Column) Judged() bool { return c.judged }

// Of returns the figure of a lane, NaN where it is undefined.
func (c *Column) Of(l *accept.Lane) float64 { return c.get(l) }

// ColumnsOf are the figures that runs of a scenario have.
func ColumnsOf(s *scenarios.Scenario) []Column { return columns(s) }

// Columns returns the figures that every run of the study has.
func (st *Study) Columns() []Column { return st.columns }

// Bad turns a value of the figure so that more is worse: errors, delays and
// peaks by their size, margin and damping by how small they are. What is
// undefined is worst.
func (c *Column) Bad(v float64) float64 {
	switch {
	case math.IsNaN(v):
		return math.Inf(1)
	case c.Figure == "energy_margin" || c.Figure == "added_damping":
		return -v
	}
	return math.Abs(v)
}

// Good is the reverse of Bad, but for a sign that it has dropped.
func (c *Column) Good(bad float64) float64 {
	if math.IsInf(bad, 0) {
		return math.NaN()
	}
	if c.Figure == "energy_margin" || c.Figure == "added_damping" {
		return -bad
	}
	return bad
}

// Format writes a value of the figure for people.
func (c *Column) Format(v float64) string {
	f := rtloop.Figure(v)
	switch {
	case !f.Defined():
		return "–"
	case c.Figure == "energy_margin":
		return accept.Margin(f)
	case c.Figure == "delay":
		return accept.Late(f)
	case c.Dim == quantity.None:
		return accept.Share(f)
	}
	return quantity.Format(v, c.Dim)
}

// sharedSection reports whether the motion or the reference response may depend
// on a setting. Those of compensators, actuators, sensors and limits belong to
// a lane alone.
func sharedSection(path string) bool {
	steps := strings.Split(path, ".")
	switch {
	case len(steps) < 2:
		return true
	case steps[0] == "accept", steps[0] == "lane":
		return false
	}
	switch steps[1] {
	case "compensator", "actuator", "sensor", "limits":
		return false
	}
	return true
}
