package report

import (
	"fmt"
	"strings"

	"antelag/rtloop"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// question is what the test engineer wants to know of the run.
func (r *run) question() string {
	var each []string
	for i := range r.s.Channels {
		c := &r.s.Channels[i]
		each = append(each, fmt.Sprintf("%s on channel %s", inShort(c.Compensator), c.Name))
	}
	settings := listed(each)
	if r.s.Substructure == nil {
		return fmt.Sprintf("With the compensation %s: does the actuator follow the target closely enough, within its limits?", settings)
	}
	return fmt.Sprintf("With the compensation %s: does the loop stay stable, and is the test accurate enough, before a specimen is put at risk?", settings)
}

// inShort is a part with its settings in a few words: "polynomial (order 3,
// delay 14 ms)".
func inShort(p scenarios.Part) string {
	var settings []string
	for i := range p.Kind.Settings {
		s := &p.Kind.Settings[i]
		v, ok := p.Values[s.Name]
		if !ok || s.HasDefault() && same(v, s.Fallback) && s.Name != "delay" && s.Name != "order" {
			continue
		}
		settings = append(settings, s.Name+" "+s.FormatValue(v))
	}
	if len(settings) == 0 {
		return p.Kind.Name
	}
	return p.Kind.Name + " (" + strings.Join(settings, ", ") + ")"
}

func same(a, b kind.Value) bool {
	return a.Num == b.Num && a.Text == b.Text && len(a.List)+len(b.List) == 0
}

// listed joins with commas and "and".
func listed(items []string) string {
	if len(items) < 2 {
		return strings.Join(items, "")
	}
	return strings.Join(items[:len(items)-1], ", ") + " and " + items[len(items)-1]
}

// verdict is the answer in a sentence.
func (r *run) verdict() string {
	text := r.lane.Ending(r.v.Time)
	if worst := r.tightest(); worst != nil {
		text += fmt.Sprintf("; %s: %s, %s", worst.Label(), worst.Found(), worst.Room())
	}
	return text + "."
}

// tightest is the limit that failed, or the one with the least room.
func (r *run) tightest() *accept.Judgement {
	var worst *accept.Judgement
	least := 0.0
	for i := range r.lane.Accept {
		j := &r.lane.Accept[i]
		if !j.Got.Defined() {
			return j
		}
		got, room := abs(float64(j.Got)), 0.0
		if j.Limit == "energy_margin" {
			room = float64(j.Got) - j.Want
		} else if j.Want > 0 {
			room = 1 - got/j.Want
		}
		if worst == nil || room < least {
			worst, least = j, room
		}
	}
	return worst
}

func abs(v float64) float64 { return max(v, -v) }

// overviewHead are the headings of the overview of several tests.
var overviewHead = []string{"test", "verdict", "compensator", "delay", "error, rms", "energy margin", "response error"}

func (r *run) overview() []string {
	delay, _ := r.lane.Figure("delay")
	nrmse, _ := r.lane.Figure("nrmse")
	return []string{r.lane.Word(), r.lane.Methods(), accept.Late(rtloop.Figure(delay)), accept.Share(rtloop.Figure(nrmse)),
		accept.Margin(r.lane.Energy.MarginMin), accept.Share(r.lane.ResponseError)}
}

// pace says how fast the test runs.
func pace(s *scenarios.Scenario) string {
	if slow := s.Loop.Num("slowdown"); slow != 1 {
		return "slowed down " + quantity.Short(slow, quantity.None) + " times"
	}
	return "at real speed"
}

// Cautions stand on every report.
var Cautions = []string{
	"Hydraulic actuators crush.",
	"This is a simulation.",
	"It is no interlock.",
	"Keep the hardware limits, the emergency stop and the lab’s procedure.",
	"Local codes and the responsible licensed engineer decide.",
}
