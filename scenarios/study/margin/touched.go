package margin

import (
	"strings"

	"antelag/rtloop/stability"
	"antelag/scenarios"
)

// touched says which parts of the loop a setting changes; ok is false where that
// cannot be told, as of the rate, which changes all.
func touched(s *scenarios.Scenario, lane, path string) (b stability.Blocks, ok bool) {
	n := len(s.Channels)
	b = stability.Blocks{Plants: make([]bool, n), Compensators: make([]bool, n)}
	first, rest, _ := strings.Cut(full(s, path), ".")
	section, _, _ := strings.Cut(rest, ".")
	switch {
	case first == "substructure":
		b.Structure = true
		return b, true
	case first == "excitation", first == "accept":
		return b, true
	case first == "lane":
		return b, laneTouched(s, lane, rest, &b)
	case first == "loop":
		return b, section == "seed" || section == "duration" || section == "energy_window"
	}
	for j := range s.Channels {
		if full(s, s.Channels[j].Name+"."+rest) != first+"."+rest {
			continue
		}
		switch {
		case section == "actuator", section == "sensor":
			b.Plants[j] = true
		case section == "compensator":
			b.Compensators[j] = true
		case strings.HasPrefix(section, "specimen"):
			// Integrators and damping count with the specimen's stiffness.
			b.Plants[j], b.Structure = true, true
		case section == "limits":
		default:
			return b, false
		}
		return b, true
	}
	return b, false
}

// laneTouched marks the compensators of a lane.
func laneTouched(s *scenarios.Scenario, lane, rest string, b *stability.Blocks) bool {
	name, _, _ := strings.Cut(rest, ".")
	for i := range s.Lanes {
		if s.Lanes[i].Name != name || name != lane {
			continue
		}
		for j := range s.Channels {
			if s.Lanes[i].Channel == "" || s.Lanes[i].Channel == s.Channels[j].Name {
				b.Compensators[j] = true
			}
		}
	}
	return true
}
