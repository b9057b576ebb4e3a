package handoff

import (
	"antelag/scenarios/kind"
)

// modelInverseMethod: u = a₀·x + a₁·v + a₂·a + (a₃/dt)·(a − a one tick ago).
var modelInverseMethod = method{"model-inverse", func(t tuned) code {
	var a [4]float64
	for i := range orderOf(t.values) + 1 {
		a[i] = t.coefficient([...]string{"a0", "a1", "a2", "a3"}[i])
	}
	jerk := a[3] / t.tick
	c := code{
		members: []member{{"real", "before", 0, "acceleration one tick ago, m/s^2"}},
		start:   "    (void)x; (void)y;\n    s->before = 0;\n",
		prime:   "    (void)u;\n    s->before = in->a;\n",
		command: `    const real change = in->a - s->before;
    s->before = in->a;
    return A0 * in->x + A1 * in->v + A2 * in->a + JERK * change;
`,
		roundings: 6, terms: peaks{x: a[0], v: a[1], a: a[2] + 2*jerk},
		reason: "constant, difference, product and three sums",
	}
	c.real("A0", a[0], "1/g")
	c.real("A1", a[1], "(T + tau)/g, s")
	c.real("A2", a[2], "(T tau + tau^2/2)/g, s^2; 0 below order 2")
	c.real("JERK", jerk, "(T tau^2/2 + tau^3/6)/g/dt, s^2; 0 below order 3")
	return c
}}

func orderOf(v kind.Values) int { return v.Int("order") }
