package handoff

// linearAccelerationMethod: u = x + τ·v + τ²·(2/3·a − 1/6·a(t−τ)).
var linearAccelerationMethod = method{"linear-acceleration", func(t tuned) code {
	a1, a2, b2 := t.coefficient("a1"), t.coefficient("a2"), -t.coefficient("b2")
	ago := a1 / t.tick
	c := code{
		parts: []string{historyPart},
		start: `    int i;
    for (i = 0; i < SIZE; i++) s->past[i] = 0;
    s->head = 0;
    (void)x; (void)y;
`,
		prime: `    (void)u;
    s->head = (s->head + 1ul) & MASK;
    s->past[s->head] = in->a;
`,
		command: `    s->head = (s->head + 1ul) & MASK;
    s->past[s->head] = in->a;
    return in->x + DELAY * in->v + (NOW * in->a - BEFORE * history_at(s->past, s->head, AGO));
`,
		roundings: 12, terms: peaks{x: 1, v: a1, a: a2 + b2},
		reason: "constant, product, seven of the interpolation and three sums",
	}
	c.real("DELAY", a1, "tau, s")
	c.real("NOW", a2, "2/3 tau^2, s^2")
	c.real("BEFORE", b2, "1/6 tau^2, s^2")
	c.double("AGO", ago, "tau in ticks")
	c.members = ringMembers(c.ring(int(ago)+2), "accelerations, m/s^2")
	return c
}}
