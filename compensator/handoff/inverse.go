package handoff

// inverseMethod: u = α·x_{k+1} − (α−1)·x_k.
var inverseMethod = method{"inverse", func(t tuned) code {
	alpha := t.coefficient("alpha")
	c := code{
		members: []member{{"real", "before", 0, "target one tick ago, m"}},
		start:   "    (void)y;\n    s->before = x;\n",
		prime:   "    (void)u;\n    s->before = in->x;\n",
		command: `    const real u = ALPHA * in->x - REST * s->before;
    s->before = in->x;
    return u;
`,
		roundings: 3, terms: peaks{x: 2*alpha - 1},
		reason: "constant, product and difference of two terms that nearly cancel",
	}
	c.real("ALPHA", alpha, "alpha = 1 + tau/dt")
	c.real("REST", alpha-1, "alpha - 1")
	return c
}}
