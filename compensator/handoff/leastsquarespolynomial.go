package handoff

import (
	"math"

	"antelag/compensator"
)

// leastSquaresPolynomialMethod: u = A·Σ w_i(τ)·x(t − i·dt). Where nothing adapts
// the weights are a table, and else the polynomials on the points are.
var leastSquaresPolynomialMethod = method{"least-squares-polynomial", func(t tuned) code {
	comp := t.comp.(*compensator.LeastSquaresPolynomial)
	fit, points := comp.Fit(), t.values.Int("points")
	c := code{parts: []string{dotPart}}
	c.whole("POINTS", points, "M")
	size := c.ring(points)
	c.members = []member{
		{"real", "past", 2 * size, "targets, m, each held twice, a ring length apart, so that the newest are in one piece"},
		{"unsigned long", "head", 0, "where the newest is, in the second half"},
	}
	c.start = `    int i;
    for (i = 0; i < 2 * SIZE; i++) s->past[i] = x;
    s->head = SIZE;
`
	if t.values.Text("adapt") == "off" {
		c.fixedFit(fit, points)
	} else {
		c.adaptiveFit(comp, fit, t)
	}
	return c
}}

const pushTwice = `    s->head = SIZE + ((s->head + 1ul) & MASK);
    s->past[s->head] = in->x;
    s->past[s->head - SIZE] = in->x;
`

func (c *code) fixedFit(fit compensator.Fit, points int) {
	sum := 0.0
	for _, w := range fit.Weights {
		sum += math.Abs(w)
	}
	c.tables = table("weight", "POINTS", fit.Weights, "w_i, the oldest target first")
	c.start += "    (void)y;\n"
	c.prime = "    (void)u;\n" + pushTwice
	c.command = pushTwice + "    return dot(weight, &s->past[s->head + 1ul - POINTS], POINTS);\n"
	c.roundings, c.terms = dotRoundings(points), peaks{x: sum}
	c.reason = "constant, product and one sum more than an eighth of the terms, and ten"
}

// dotRoundings is how many roundings one term of a dot of so many goes through:
// constant, product, the sum of the pair, its chain, the rest, and the two last
// sums.
func dotRoundings(points int) int { return points/8 + 12 }

func (c *code) adaptiveFit(comp *compensator.LeastSquaresPolynomial, fit compensator.Fit, t tuned) {
	order := orderOf(t.values)
	c.cautions = learns
	amplitude := t.values.Text("adapt") == "delay-and-amplitude"
	c.whole("ORDER", order, "N")
	c.double("RATE", 1/t.tick, "ticks a second")
	c.double("EDGE", fit.Edge, "(M - 1)/2")
	c.double("FIRST", fit.First, "p_0 = 1/sqrt(M)")
	c.follower("", fit.Delay, "tau, s", "kappa dt", "v0^2, (m/s)^2")
	c.tables = doubles("beta", "ORDER + 1", fit.Beta, "beta_j; that of j = 0 is not used") +
		doubles("invert", "ORDER + 1", fit.Invert, "1/beta_j, likewise") +
		grid("basis", "ORDER + 1", "POINTS", fit.Basis, "p_j on the points, the oldest first")
	c.members = append(c.members,
		member{"double", "delay", 0, "tau, adapted, s"},
		member{"real", "x", 0, "target at the last tick, m"},
		member{"real", "v", 0, "its velocity, m/s"})
	c.start += `    (void)y;
    s->delay = START;
    s->x = x;
    s->v = 0;
`
	adapt, scale, fade := "", "u", ""
	if amplitude {
		c.follower("AMPLITUDE_", fit.Amplitude, "A", "kappa dt", "x0^2, m^2")
		c.double("FADE", fit.Fade, "part of the mean square speed that a tick renews")
		c.double("ACTIVE", fit.Floor, "mean square speed, (m/s)^2, that counts for half")
		c.members = append(c.members,
			member{"double", "amplitude", 0, "A, adapted"},
			member{"double", "activity", 0, "mean square speed, (m/s)^2"})
		c.start += "    s->amplitude = AMPLITUDE_START;\n    s->activity = 0.0;\n"
		fade = "    s->activity += FADE * ((double)s->v * (double)s->v - s->activity);\n"
		adapt = fade + `    follow(&s->amplitude, e, (double)s->x, s->activity / (s->activity + ACTIVE),
           AMPLITUDE_STEP, AMPLITUDE_FLOOR, AMPLITUDE_LOW, AMPLITUDE_HIGH);
`
		scale = "(real)s->amplitude * u"
	}
	c.parts = append(c.parts, clampPart, followPart)
	c.prime = "    (void)u;\n" + pushTwice + fade + "    s->x = in->x;\n    s->v = in->v;\n"
	c.command = `    const double e = (double)s->x - (double)in->y;
    double p[ORDER + 1], at, last = 0.0;
    real u = 0;
    int j;
` + pushTwice + `    follow(&s->delay, e, (double)s->v, 1.0, STEP, FLOOR, LOW, HIGH);
` + adapt + `    s->x = in->x;
    s->v = in->v;
    at = EDGE + s->delay * RATE; /* the polynomials there */
    p[0] = FIRST;
    for (j = 0; j < ORDER; j++) {
        p[j + 1] = (at * p[j] - last) * invert[j + 1];
        last = beta[j + 1] * p[j];
    }
    for (j = 0; j <= ORDER; j++)
        u += (real)p[j] * dot(basis[j], &s->past[s->head + 1ul - POINTS], POINTS);
    return ` + scale + `;
`
	// Beyond the points the polynomials grow, so the longest delay is worst.
	sum := 0.0
	for j, p := range comp.Ahead(fit.Delay.High) {
		row := 0.0
		for _, b := range fit.Basis[j] {
			row += math.Abs(b)
		}
		sum += math.Abs(p) * row
	}
	sum *= fit.Amplitude.High
	c.roundings, c.terms = dotRoundings(len(fit.Weights))+order+5, peaks{x: sum}
	c.reason = "constants, products and one sum more than an eighth of the points and for each order; delay and amplitude are double in either build"
}
