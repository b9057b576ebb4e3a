package handoff

// taylorMethod: u = x + τ·v + τ²/2·a.
var taylorMethod = method{"taylor", func(t tuned) code {
	a1, a2 := t.coefficient("a1"), t.coefficient("a2")
	c := code{
		start:   "    (void)s; (void)x; (void)y;\n",
		prime:   "    (void)s; (void)in; (void)u;\n",
		command: "    (void)s;\n    return in->x + DELAY * in->v + HALF * in->a;\n",

		roundings: 4, terms: peaks{x: 1, v: a1, a: a2},
		reason: "constant, product and two sums",
	}
	c.real("DELAY", a1, "tau, s")
	c.real("HALF", a2, "tau^2/2, s^2")
	return c
}}
