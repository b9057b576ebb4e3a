package handoff

import (
	"fmt"
	"math"

	"antelag/compensator"
)

// delaySeekingMethod: a polynomial whose delay follows the error.
var delaySeekingMethod = method{"delay-seeking", func(t tuned) code {
	law, order := t.comp.(*compensator.DelaySeeking).Law(), orderOf(t.values)
	weights, sum := make([]float64, order+1), 0.0
	for i := range weights {
		weights[i] = t.coefficient(fmt.Sprintf("c%d", i))
		sum += math.Abs(weights[i])
	}
	c := code{
		parts: []string{clampPart, followPart, historyPart},
		start: fillRing + `    (void)y;
    s->delay = START;
    s->x = x;
    s->v = 0;
`,
		prime: "    (void)u;\n" + pushRing + `    s->x = in->x;
    s->v = in->v;
`,
		command: `    real u;
    double back, ago;
    int i;
    follow(&s->delay, (double)s->x - (double)in->y, (double)s->v, 1.0, STEP, FLOOR, LOW, HIGH);
    s->x = in->x;
    s->v = in->v;
` + pushRing + `    u = weight[0] * in->x;
    back = s->delay * RATE;
    ago = back;
    for (i = 1; i <= ORDER; i++) {
        u += weight[i] * history_at(s->past, s->head, ago);
        ago += back;
    }
    return u;
`,
		tables:    table("weight", "ORDER + 1", weights, "c_i = (-1)^i C(n+1, i+1)"),
		cautions:  learns,
		roundings: order + 10, terms: peaks{x: sum},
		reason: "constant, product, seven of the interpolation and one sum for each term; the delay is double in either build",
	}
	c.whole("ORDER", order, "n")
	c.double("RATE", 1/t.tick, "ticks a second")
	c.follower("", law, "tau, s", "kappa dt", "v0^2, (m/s)^2")
	c.members = append(ringMembers(c.ring(int(float64(order)*law.High/t.tick)+3), "targets, m"),
		member{"double", "delay", 0, "tau, adapted, s"},
		member{"real", "x", 0, "target at the last tick, m"},
		member{"real", "v", 0, "its velocity, m/s"})
	return c
}}

// follower adds the constants of a parameter that follows the error.
func (c *code) follower(prefix string, l compensator.Law, what, step, floor string) {
	c.double(prefix+"START", l.Start, what+", at the start")
	c.double(prefix+"LOW", l.Low, "its lower bound")
	c.double(prefix+"HIGH", l.High, "its upper bound")
	c.double(prefix+"STEP", l.Step, step)
	c.double(prefix+"FLOOR", l.Floor, floor)
}
