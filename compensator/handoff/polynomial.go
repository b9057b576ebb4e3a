package handoff

import (
	"fmt"
	"math"
	"strings"

	"antelag/compensator"
)

// polynomialMethod: u = Σ c_i·x(t − iτ), the weights spread over the ticks on
// either side. They are written out, so that nothing is looked up but the
// targets.
var polynomialMethod = method{"polynomial", func(t tuned) code {
	now, past := t.comp.(*compensator.Polynomial).Taps()
	sum, oldest := math.Abs(now), 0
	c := code{}
	c.real("NOW", now, "weight of the present target")
	var lines strings.Builder
	for i, tap := range past {
		name := fmt.Sprintf("W%d", i+1)
		c.real(name, tap.Weight, fmt.Sprintf("weight of the target %d ticks ago", tap.Ago))
		fmt.Fprintf(&lines, "    %s += %s * s->past[(s->head - %dul) & MASK];\n", [2]string{"even", "odd"}[i%2], name, tap.Ago)
		sum += math.Abs(tap.Weight)
		oldest = max(oldest, tap.Ago)
	}
	c.members = ringMembers(c.ring(oldest+1), "targets, m")
	c.start = fillRing + "    (void)y;\n"
	c.prime = "    (void)u;\n" + pushRing
	c.command = "    real even = NOW * in->x, odd = 0;\n" + pushRing + lines.String() + "    return even + odd;\n"
	c.roundings, c.terms = len(past)/2+5, peaks{x: sum}
	c.reason = "constant, product and one sum more than half the terms"
	return c
}}
