package handoff

import (
	"antelag/compensator"
)

// adaptiveInverseMethod: u = α·x_{k+1} − (α−1)·x_k, α following the tracking
// indicator. All of it is double in either build: α is learned, and the two
// terms nearly cancel.
var adaptiveInverseMethod = method{"adaptive-inverse", func(t tuned) code {
	start, low, high := t.comp.(*compensator.AdaptiveInverse).Bounds()
	c := code{
		members: []member{
			{"double", "alpha", 0, "adapted"},
			{"double", "ti", 0, "tracking indicator TI, m^2"},
			{"double", "sum", 0, "its integral over time, m^2 s"},
			{"real", "older", 0, "target two ticks ago, m"},
			{"real", "x", 0, "target at the last tick, m"},
			{"real", "y", 0, "measured, given at the last tick, m"},
		},
		parts: []string{clampPart, adaptAlpha},
		start: `    s->alpha = START;
    s->ti = 0.0;
    s->sum = 0.0;
    s->older = x;
    s->x = x;
    s->y = y;
`,
		prime: `    (void)u;
    s->older = s->x;
    s->x = in->x;
    s->y = in->y;
`,
		command: `    double u;
    adapt(s, 0.5 * ((double)s->older * (double)in->y - (double)s->x * (double)s->y));
    u = s->alpha * (double)in->x - (s->alpha - 1.0) * (double)s->x;
    s->older = s->x;
    s->x = in->x;
    s->y = in->y;
    return (real)u;
`,
		cautions:  learns,
		roundings: 1, terms: peaks{u: 1},
		reason: "all is double in either build, and the command is rounded once",
	}
	c.double("TICK", t.tick, "dt, s")
	c.double("KP", t.values.Num("kp"), "gain on TI, 1/m^2")
	c.double("KI", t.values.Num("ki"), "gain on the integral of TI, 1/(m^2 s)")
	c.double("START", start, "alpha at the start, 1 + tau/dt")
	c.double("LOW", low, "its lower bound, 1 + delay_min/dt")
	c.double("HIGH", high, "its upper bound, 1 + delay_max/dt")
	return c
}}

const adaptAlpha = `
/* Adapts alpha where it would pass a bound; out is the sign of outwards. */
static void adapt_at(@state *s, double bound, double out, double growth)
{
    double ti = s->ti + growth, alpha;
    if (ti * out <= 0.0) s->sum += ti * TICK;
    alpha = START + KP * ti + KI * s->sum;
    if ((alpha - bound) * out > 0.0 && KP > 0.0)
        ti = (bound - START - KI * s->sum) / KP;
    s->alpha = clamp(alpha, LOW, HIGH);
    if (!(KP > 0.0) && growth * out > 0.0) ti = s->ti;
    s->ti = ti;
}

/* Moves alpha by one tick in which TI grew by so many m^2. */
static void adapt(@state *s, double growth)
{
    const double ti = s->ti + growth;
    const double sum = s->sum + ti * TICK;
    const double alpha = START + KP * ti + KI * sum;
    if (alpha > HIGH) {
        adapt_at(s, HIGH, 1.0, growth);
    } else if (alpha < LOW) {
        adapt_at(s, LOW, -1.0, growth);
    } else {
        s->alpha = alpha;
        s->ti = ti;
        s->sum = sum;
    }
}
`
