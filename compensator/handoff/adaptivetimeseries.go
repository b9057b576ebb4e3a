package handoff

import (
	"antelag/compensator"
)

// adaptiveTimeSeriesMethod: u = a₀·x + a₁·v + a₂·a, the coefficients learned by
// least squares over a moving window. All of it is double in either build: the
// sums run over thousands of ticks, and second differences of 24 bits are noise.
var adaptiveTimeSeriesMethod = method{"adaptive-time-series", func(t tuned) code {
	l := t.comp.(*compensator.AdaptiveTimeSeries).Learning()
	c := code{
		types: timeSeriesTypes,
		members: []member{
			{"double", "a0", 0, "adapted"},
			{"double", "a1", 0, "adapted, s"},
			{"double", "a2", 0, "adapted, s^2"},
			{"double", "delay", 0, "a1/a0, s"},
			{"@lowpass", "measured", 0, "filter of the measured displacement"},
			{"@lowpass", "commanded", 0, "filter of the command"},
			{"double", "last", 0, "command of the last tick, m, before it was rounded to real"},
			{"double", "older", 0, "measured, filtered, two ticks ago, m"},
			{"double", "centre", 0, "measured, filtered, one tick ago, m"},
			{"double", "partner", 0, "command, filtered, one tick ago, m"},
			{"@sums", "run", 0, "of the rows in the window"},
			{"@sums", "fresh", 0, "of the rows since the last change-over"},
			{"unsigned long", "since", 0, "how many those are"},
			{"unsigned long", "count", 0, "rows in the window"},
			{"unsigned long", "next", 0, "where the next row goes"},
			{"@row", "rows", l.Window, "the window"},
		},
		parts:   []string{clampPart, approachPart, timeSeriesFilter, timeSeriesWindow, timeSeriesLearn},
		start:   timeSeriesStart,
		prime:   "    learn(s, (double)in->y);\n    s->last = (double)u;\n",
		command: timeSeriesCommand,

		cautions:  learns,
		roundings: 1, terms: peaks{u: 1},
		reason: "all is double in either build, and the command is rounded once",
	}
	c.timeSeriesConstants(t, l)
	return c
}}

func (c *code) timeSeriesConstants(t tuned, l compensator.Learning) {
	c.consts = append(c.consts, constant{"WINDOW", literalWhole(l.Window), "rows"})
	for i, s := range l.Sections {
		n := string(rune('1' + i))
		c.double("F"+n+"_B", s.B, "section "+n+" of the low-pass")
		c.double("F"+n+"_A1", s.A1, "")
		c.double("F"+n+"_A2", s.A2, "")
	}
	c.double("PER_TWO_TICKS", 1/(2*t.tick), "1/(2 dt), 1/s")
	c.double("PER_TICK_SQUARED", 1/(t.tick*t.tick), "1/dt^2, 1/s^2")
	c.double("LEAST", l.Floor, "least N sum (Y - mean)^2 that is learned from, m^2")
	c.double("PIVOT", l.Pivot, "least part of a column's square in a pivot")
	c.double("START_A0", l.A0, "a0 at the start")
	c.double("START_A1", l.A1, "a1 at the start, s")
	c.double("START_A2", l.A2, "a2 at the start, s^2")
	c.double("START_DELAY", l.Delay, "a1/a0 at the start, s")
	c.double("A0_MIN", t.values.Num("amplitude_min"), "bounds of a0")
	c.double("A0_MAX", t.values.Num("amplitude_max"), "")
	c.double("A2_MAX", l.MaxA2, "upper bound of a2, s^2")
	c.double("DELAY_MIN", t.values.Num("delay_min"), "bounds of a1/a0, s")
	c.double("DELAY_MAX", t.values.Num("delay_max"), "")
	c.double("STEP_A0", l.StepAmplitude, "most that a tick may change a0")
	c.double("STEP_A2", l.StepA2, "a2, s^2")
	c.double("STEP_DELAY", l.StepDelay, "the delay, s")
}

const timeSeriesTypes = `
/* One line of the least-squares problem: the command, m, that belongs to a
 * measured displacement, m, velocity, m/s, and acceleration, m/s^2. */
typedef struct { double y, v, a, u; } @row;

/* The normal equations of some rows: the sums of products. */
typedef struct { double yy, yv, ya, vv, va, aa, uy, uv, ua, y; } @sums;

/* The memory of one signal's low-pass filter. */
typedef struct { double p1, p2, q1, q2; } @lowpass;
`

const timeSeriesFilter = `
/* The memory of a filter whose input has been x for ever. */
static @lowpass lowpass_at(double x)
{
    @lowpass f;
    f.p1 = x - F1_B * x;
    f.p2 = F1_B * x - F1_A2 * x;
    f.q1 = x - F2_B * x;
    f.q2 = F2_B * x - F2_A2 * x;
    return f;
}

/* Filters one sample: fourth-order Butterworth, two second-order sections. */
static double lowpass_step(@lowpass *f, double x)
{
    const double bx = F1_B * x;
    const double y = bx + f->p1;
    double by, z;
    f->p1 = 2.0 * bx - F1_A1 * y + f->p2;
    f->p2 = bx - F1_A2 * y;
    by = F2_B * y;
    z = by + f->q1;
    f->q1 = 2.0 * by - F2_A1 * z + f->q2;
    f->q2 = by - F2_A2 * z;
    return z;
}
`

const timeSeriesWindow = `
static void add(@sums *s, const @row *r)
{
    s->yy += r->y * r->y;
    s->yv += r->y * r->v;
    s->ya += r->y * r->a;
    s->vv += r->v * r->v;
    s->va += r->v * r->a;
    s->aa += r->a * r->a;
    s->uy += r->u * r->y;
    s->uv += r->u * r->v;
    s->ua += r->u * r->a;
    s->y += r->y;
}

static void take_away(@sums *s, const @row *r)
{
    s->yy -= r->y * r->y;
    s->yv -= r->y * r->v;
    s->ya -= r->y * r->a;
    s->vv -= r->v * r->v;
    s->va -= r->v * r->a;
    s->aa -= r->a * r->a;
    s->uy -= r->u * r->y;
    s->uv -= r->u * r->v;
    s->ua -= r->u * r->a;
    s->y -= r->y;
}

/* Takes the newest row in and the oldest out. A second set of sums, which only
 * adds, takes the place of the running ones once a window, so that no rounding
 * error lives longer than two windows. */
static void window_push(@state *s, const @row *r)
{
    static const @sums none = {0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0};
    if (s->count == WINDOW) take_away(&s->run, &s->rows[s->next]);
    else s->count++;
    s->rows[s->next] = *r;
    s->next++;
    if (s->next >= WINDOW) s->next = 0;
    add(&s->run, r);
    add(&s->fresh, r);
    s->since++;
    if (s->since >= WINDOW) {
        s->run = s->fresh;
        s->fresh = none;
        s->since = 0;
    }
}
`

const timeSeriesLearn = `
/* Fits the coefficients to the window and moves them there as far as bounds and
 * rates allow. Elimination in the order Y, Y', Y''; z is the right side, d the
 * pivots, each lifted to its least by a pull towards a known value. */
static void adapt(@state *s)
{
    const @sums *n = &s->run;
    const double count = (double)s->count;
    double inv0, inv1, l1, l2, d1, z1, m, d2, z2, least, other, a0, a1, a2, rest;
    if (!(count * n->yy - n->y * n->y >= LEAST * count)) return;
    inv0 = 1.0 / n->yy;
    l1 = n->yv * inv0;
    l2 = n->ya * inv0;
    d1 = n->vv - l1 * n->yv;
    z1 = n->uv - l1 * n->uy;
    least = PIVOT * n->vv;
    if (d1 < least) {
        z1 += (least - d1) * s->a1;
        d1 = least;
    }
    inv1 = 1.0 / d1;
    m = n->va - l1 * n->ya;
    d2 = n->aa - l2 * n->ya - m * m * inv1;
    z2 = n->ua - l2 * n->uy - m * z1 * inv1;
    /* vv^2/yy is what aa is in a pure sine; it stands in where Y'' is nil. */
    other = n->vv * n->vv * inv0;
    least = PIVOT * (n->aa > other ? n->aa : other);
    if (d2 < least) {
        z2 += (least - d2) * 0.5 * s->delay * s->a1;
        d2 = least;
    }

    a2 = approach(s->a2, clamp(z2 / d2, 0.0, A2_MAX), STEP_A2);
    a1 = (z1 - m * a2) * inv1;
    a0 = (n->uy - n->yv * a1 - n->ya * a2) * inv0;
    rest = a0 + a1;
    if (!(rest - rest >= 0.0)) return; /* NaN or infinite: the sums overflowed */
    s->a2 = a2;
    s->a0 = approach(s->a0, clamp(a0, A0_MIN, A0_MAX), STEP_A0);
    s->delay = approach(s->delay, clamp(a1 / s->a0, DELAY_MIN, DELAY_MAX), STEP_DELAY);
    s->a1 = s->delay * s->a0;
}

/* Learns from the newest measurement. */
static void learn(@state *s, double measured)
{
    const double y = lowpass_step(&s->measured, measured);
    const double u = lowpass_step(&s->commanded, s->last);
    @row r;
    r.y = s->centre;
    r.v = (y - s->older) * PER_TWO_TICKS;
    r.a = (y - 2.0 * s->centre + s->older) * PER_TICK_SQUARED;
    r.u = s->partner;
    window_push(s, &r);
    adapt(s);
    s->older = s->centre;
    s->centre = y;
    s->partner = u;
}
`

const timeSeriesStart = `    static const @sums none = {0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0};
    s->a0 = START_A0;
    s->a1 = START_A1;
    s->a2 = START_A2;
    s->delay = START_DELAY;
    s->last = s->a0 * (double)x;
    s->measured = lowpass_at((double)y);
    s->commanded = lowpass_at(s->last);
    s->older = (double)y;
    s->centre = (double)y;
    s->partner = s->last;
    s->run = none;
    s->fresh = none;
    s->since = 0;
    s->count = 0;
    s->next = 0;
`

const timeSeriesCommand = `    learn(s, (double)in->y);
    s->last = s->a0 * (double)in->x + s->a1 * (double)in->v + s->a2 * (double)in->a;
    return (real)s->last;
`
