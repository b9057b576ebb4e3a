package margin

import (
	"errors"
	"fmt"

	"antelag/plant"
	"antelag/scenarios"
)

// place is where an element of a channel stands, and plain what is wrong with it.
func place(err error) string {
	var e *plant.ElementError
	if errors.As(err, &e) {
		return fmt.Sprintf("specimen[%d]", e.Index)
	}
	return "specimen"
}

func plain(err error) error {
	var e *plant.ElementError
	if errors.As(err, &e) {
		return e.Err
	}
	return err
}

// linearKinds are the elements that are linear as they are.
var linearKinds = map[string]bool{"spring": true, "mass": true}

// notes say what the linearization takes for what.
func notes(s *scenarios.Scenario) []string {
	out := []string{}
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	for i := range s.Channels {
		c := &s.Channels[i]
		for j, p := range c.Specimen {
			exponent, has := p.Values["exponent"]
			switch {
			case linearKinds[p.Kind.Name], has && exponent.Num == 1:
			case p.Kind.Name == "viscous":
				add("%s: specimen[%d], viscous of exponent %v, has no force in the smallest motions", c.Name, j, exponent.Num)
			case p.Kind.Name == "maxwell" && exponent.Num < 1:
				add("%s: specimen[%d], maxwell of exponent %v, is its spring alone in the smallest motions", c.Name, j, exponent.Num)
			case p.Kind.Name == "maxwell":
				add("%s: specimen[%d], maxwell of exponent %v, has no force in the smallest motions", c.Name, j, exponent.Num)
			case p.Kind.Name == "gap":
				add("%s: specimen[%d], gap, as it is at rest", c.Name, j)
			default:
				add("%s: specimen[%d], %s, with its initial stiffness", c.Name, j, p.Kind.Name)
			}
		}
		if c.Actuator.Kind.Name == "servo-hydraulic" {
			add("%s: servo-hydraulic actuator near rest, where valve and friction are linear", c.Name)
		}
	}
	if s.Substructure != nil {
		for i, storey := range s.Substructure.Storeys {
			if storey.Has("yield_displacement") {
				add("storey %d, with its initial stiffness", i+1)
			}
		}
	}
	return out
}
