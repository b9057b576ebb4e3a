package report

import (
	"fmt"
	"math"

	"antelag/plant"
	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// acceptance shows each limit, what was found and what room is left.
func (r *run) acceptance() Part {
	p := Part{Heading: "Acceptance"}
	if len(r.lane.Accept) == 0 {
		p.Text = []string{"The scenario gives no acceptance limits, so nothing was judged."}
		return p
	}
	t := Table{Caption: "Acceptance limits of the configured lane", Head: []string{"verdict", "limit", "found", "allowed", "room", "worst channel"}}
	several := len(r.lane.Channels) > 1
	if !several {
		t.Head = t.Head[:5]
	}
	for i := range r.lane.Accept {
		j := &r.lane.Accept[i]
		row := Row{word(j.Pass), j.Label(), j.Found(), j.Allowed(), j.Room()}
		if several {
			row = append(row, dash(j.Channel))
		}
		t.Rows = append(t.Rows, row)
	}
	p.Tables = append(p.Tables, t)
	return p
}

func word(pass bool) string {
	if pass {
		return "PASS"
	}
	return "FAIL"
}

// compared ranks the lanes.
func (r *run) compared() Part {
	p := Part{Heading: "Alternatives"}
	if len(r.v.Lanes) < 2 {
		return p
	}
	t := Table{Caption: "Lanes on the same motion, best first; the configured one decides",
		Head: []string{"verdict", "lane", "compensator", "delay", "error, rms", "energy margin, least", "response error", "failed"}}
	for _, l := range accept.Rank(r.v.Lanes) {
		delay, _ := l.Figure("delay")
		nrmse, _ := l.Figure("nrmse")
		t.Rows = append(t.Rows, Row{l.Word(), l.Name, l.Methods(), accept.Late(rtloop.Figure(delay)), accept.Share(rtloop.Figure(nrmse)),
			accept.Margin(l.Energy.MarginMin), accept.Share(l.ResponseError), dash(l.Trouble())})
	}
	p.Tables = append(p.Tables, t)
	return p
}

func dash(s string) string {
	if s == "" {
		return "–"
	}
	return s
}

// reached shows how each channel followed its target, and how far it went of
// what it may.
func (r *run) reached() Part {
	tracking := Table{Caption: "How each channel followed its target",
		Head: []string{"channel", "compensator", "delay", "amplitude", "error, rms", "error, peak", "tracking indicator at the end"}}
	reach := Table{Caption: "How far each channel went, of what it may before the loop trips",
		Head: []string{"channel", "peak target", "peak command", "peak velocity", "peak command velocity", "peak force"}}
	for i, c := range r.lane.Channels {
		limit := func(name string) *kind.Value {
			if v, ok := r.s.Channels[i].Limits[name]; ok {
				return &v
			}
			return nil
		}
		tracking.Rows = append(tracking.Rows, Row{c.Name, c.Compensator, accept.Late(c.Delay), accept.Amplitude(c.AmplitudeRatio), accept.Share(c.NRMSE),
			accept.Within(c.PeakError, quantity.Length, limit("error")), indicator(c.TrackingIndicator)})
		reach.Rows = append(reach.Rows, Row{c.Name, accept.Within(c.PeakTarget, quantity.Length, nil), accept.Within(c.PeakCommand, quantity.Length, limit("stroke")),
			accept.Within(c.PeakVelocity, quantity.Velocity, limit("velocity")), accept.Within(c.PeakHurry, quantity.Velocity, limit("velocity")),
			accept.Within(c.PeakForce, quantity.Force, limit("force"))})
	}
	return Part{Heading: "Figures by channel", Tables: []Table{tracking, reach},
		Text: []string{"Delays are physical time, positive when late. The tracking indicator is the area that the trail of measured over target encloses; it grows while late and falls while early."}}
}

func indicator(f rtloop.Figure) string {
	if !f.Defined() {
		return "–"
	}
	return fmt.Sprintf("%.4g mm²", 1e6*float64(f))
}

// energyTable is the balance of the whole run in one unit.
func energyTable(e rtloop.EnergyResult) Table {
	in := accept.SameUnit(e.Input, e.Kinetic, e.Strain, e.Damped, e.Specimen, e.Injected)
	return Table{Caption: "Energy over the whole run: input = kinetic + strain + damped + specimens − injected",
		Head: []string{"energy", "value", "meaning"},
		Rows: []Row{
			{"input", in[0], "by the excitation"},
			{"kinetic", in[1], "of the numerical substructure, at the end"},
			{"strain", in[2], "of the numerical substructure, at the end"},
			{"damped", in[3], "by damping and hysteresis of the numerical substructure"},
			{"specimens", in[4], "taken by the specimens, stored and dissipated"},
			{"injected", in[5], "by the tracking error of the actuators"},
			{"balance", accept.Share(e.BalanceError), "what is left over, of the largest term"},
			{"least energy margin", accept.Margin(e.MarginMin), "1 − injected/damped over the trailing window, at its worst"},
			{"energy margin at the end", accept.Margin(e.MarginFinal), "over the last " + quantity.Format(float64(e.Window), quantity.Time)},
			{"added damping", accept.Share(e.AddedDamping) + " of critical", "what the tracking error looks like at the end; negative puts energy in"},
		}}
}

// structure shows the numerical substructure and the motion.
func (r *run) structure() Part {
	p := Part{Heading: "Structure and motion"}
	p.Text = append(p.Text, fmt.Sprintf("%s of test %s, %s ticks a second, %d ticks; a command gets to the next tick by a %s.",
		quantity.Short(r.v.Time, quantity.Time), pace(r.s), quantity.Short(r.v.Rate, quantity.None), r.v.Ticks, r.s.Loop.Text("hold")))
	sub := r.s.Substructure
	if sub == nil {
		p.Text = append(p.Text, "There is no numerical substructure: the excitation drives the target itself.")
	} else {
		if len(sub.Storeys) > 0 {
			p.Tables = append(p.Tables, storeyTable(sub.Storeys))
		}
		p.Tables = append(p.Tables, r.settings("Numerical substructure", sub.Part))
		p.Tables = append(p.Tables, r.modes())
	}
	e := r.s.Excitation
	table := r.settings(fmt.Sprintf("Excitation: %s, drives the %s", e.Kind.Name, excitation.Words[e.Drives]), e.Part)
	p.Tables = append(p.Tables, table)
	return p
}

// storeyTable lists storeys from the lowest up, with the settings that any has.
func storeyTable(storeys []kind.Values) Table {
	t := Table{Caption: "Storeys, the lowest first", Head: []string{"storey"}}
	var shown []kind.Setting
	for _, s := range sectionSettings("storey") {
		for _, v := range storeys {
			if x, ok := v[s.Name]; ok && (s.Name == "mass" || s.Name == "stiffness" || x.Num != 0) {
				shown = append(shown, s)
				t.Head = append(t.Head, spaced(s.Name))
				break
			}
		}
	}
	for i, v := range storeys {
		row := Row{fmt.Sprint(i + 1)}
		for _, s := range shown {
			row = append(row, valueOr(v, &s))
		}
		t.Rows = append(t.Rows, row)
	}
	return t
}

func valueOr(v kind.Values, s *kind.Setting) string {
	if x, ok := v[s.Name]; ok {
		return s.FormatValue(x)
	}
	return "–"
}

// sectionSettings finds the settings of a fixed section of a scenario.
func sectionSettings(name string) []kind.Setting {
	for _, k := range scenarios.Sections() {
		if k.Name == name {
			return k.Settings
		}
	}
	return nil
}

// modes lists frequencies, periods and damping ratios of the whole structure.
func (r *run) modes() Table {
	t := Table{Caption: "Modes of the whole structure, the specimens' initial stiffness included", Head: []string{"mode", "frequency", "period", "damping ratio"}}
	st := r.rec.loop.Structure()
	for i, w := range st.Frequencies() {
		t.Rows = append(t.Rows, Row{fmt.Sprint(i + 1), quantity.Format(w/(2*math.Pi), quantity.Frequency), quantity.Format(2*math.Pi/w, quantity.Time), accept.Share(rtloop.Figure(modeDamping(st, i)))})
	}
	return t
}

// modeDamping is φᵀCφ/(2ω) of a mass-normalised mode: the numerical damping
// alone, without what the specimens dissipate.
func modeDamping(s *substructure.Structure, mode int) float64 {
	sum := 0.0
	for i := range s.N() {
		for j := range s.N() {
			sum += s.Shapes().At(i, mode) * s.Damping().At(i, j) * s.Shapes().At(j, mode)
		}
	}
	return sum / (2 * s.Frequencies()[mode])
}

// settings lists what a part is set to, with units and meaning.
func (r *run) settings(caption string, p scenarios.Part) Table {
	return settingsTable(caption, p.Kind.Settings, p.Values, r.s.Excitation.Drives.Dim(), false)
}

// settingsTable lists the settings of a section; with changed, only those that
// are not at their default.
func settingsTable(caption string, settings []kind.Setting, v kind.Values, driven quantity.Dim, changed bool) Table {
	t := Table{Caption: caption, Head: []string{"setting", "value", "meaning"}}
	for i := range settings {
		s := settings[i].In(driven)
		x, ok := v[s.Name]
		if !ok || changed && s.HasDefault() && same(x, s.Fallback) {
			continue
		}
		t.Rows = append(t.Rows, Row{spaced(s.Name), s.FormatValue(x), s.Doc})
	}
	if len(t.Rows) == 0 {
		t.Rows = append(t.Rows, Row{"–", "–", "nothing is set"})
	}
	return t
}

func spaced(name string) string {
	out := []rune(name)
	for i, c := range out {
		if c == '_' {
			out[i] = ' '
		}
	}
	return string(out)
}

// channels shows actuator, specimen, compensator, sensors and limits of each
// channel.
func (r *run) channels() []Part {
	var out []Part
	for i := range r.s.Channels {
		c := &r.s.Channels[i]
		p := Part{Heading: "Channel " + c.Name}
		if r.s.Substructure != nil {
			p.Text = append(p.Text, fmt.Sprintf("The specimen acts between level %d and level %d (0 is the ground).", c.Between[0], c.Between[1]))
		}
		p.Tables = append(p.Tables, r.part("Actuator", c.Actuator))
		for _, e := range c.Specimen {
			p.Tables = append(p.Tables, r.part("Specimen", e))
		}
		p.Tables = append(p.Tables, r.part("Compensator", c.Compensator), r.coefficients(i))
		dim := r.s.Excitation.Drives.Dim()
		p.Tables = append(p.Tables,
			settingsTable("Sensors, where not perfect", plant.SensorSettings.Settings, c.Sensor, dim, true),
			settingsTable("Limits at which the loop trips", sectionSettings("limits"), c.Limits, dim, false))
		out = append(out, p)
	}
	return out
}

// part is a table of a kind with its equation and source.
func (r *run) part(what string, p scenarios.Part) Table {
	caption := what + ": " + p.Kind.Name + ", " + p.Kind.Doc
	if p.Kind.Equation != "" {
		caption += "; " + p.Kind.Equation
	}
	return r.settings(caption+". Source: "+p.Kind.Source, p)
}

// coefficients shows what the compensator worked with at the end.
func (r *run) coefficients(j int) Table {
	t := Table{Caption: "What the compensator worked with at the end of the run", Head: []string{"coefficient", "value"}}
	for _, k := range r.rec.loop.Coefficients(j, nil) {
		t.Rows = append(t.Rows, Row{k.Name, quantity.Format(k.Value, k.Dim)})
	}
	if len(t.Rows) == 0 {
		t.Rows = append(t.Rows, Row{"–", "none"})
	}
	return t
}
