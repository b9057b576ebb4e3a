package handoff

import (
	"fmt"
	"math"
	"strings"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

// Limits are the largest magnitudes that the guard lets through; +Inf where
// there is none. They are those at which the loop of the scenario trips, as far
// as a compensator can see them.
type Limits struct {
	Stroke   float64 // of target, measured and command, m
	Velocity float64 // of the target, and of the change of target and command over a tick, m/s
	Force    float64 // measured, N
	Error    float64 // of target − measured at the same instant, m
}

// LimitsOf reads the limits of a channel from its settings; those not given are
// +Inf.
func LimitsOf(v kind.Values) Limits {
	get := func(name string) float64 {
		if v.Has(name) {
			return v.Num(name)
		}
		return math.Inf(1)
	}
	return Limits{get("stroke"), get("velocity"), get("force"), get("error")}
}

// divergence is the displacement, m, that no test can mean; the guard allows no
// more even where there is no stroke limit.
const divergence = 1000

// missing lists the limits that there are not.
func (l Limits) missing() []string {
	out := []string{}
	for _, m := range []struct {
		name  string
		value float64
	}{{"stroke", l.Stroke}, {"velocity", l.Velocity}, {"force", l.Force}, {"error", l.Error}} {
		if math.IsInf(m.value, 1) {
			out = append(out, m.name)
		}
	}
	return out
}

func (l Limits) stroke() float64 { return min(l.Stroke, divergence) }

// worst returns the largest part of a limit that a tick takes up. x and u are
// target and command of the tick before.
func (l Limits) worst(tick, x, u float64, in *compensator.Input, command float64) float64 {
	s, v := l.stroke(), l.Velocity
	part := 0.0
	for _, p := range []float64{
		in.X / s, in.Y / s, command / s, in.R / l.Force, (x - in.Y) / l.Error,
		in.V / v, (in.X - x) / (v * tick), (command - u) / (v * tick),
	} {
		part = max(part, math.Abs(p)) // NaN stays
	}
	return part
}

// guardBytes is the guard's part of the state: target, command, flags, padding.
const guardBytes = 8 + 8 + 8

// guardFlags are the bits of the flags, in their order.
var guardFlags = []struct{ name, doc string }{
	{"NOT_FINITE", "an input was NaN or infinite"},
	{"RANGE", "target, measured, velocity or force was beyond its limit"},
	{"JUMP", "the target moved farther in a tick than the velocity limit allows"},
	{"ERROR", "target and measured were farther apart than the error limit allows"},
	{"COMMAND", "the command would have passed the stroke, or moved faster than the velocity limit"},
}

// guardConstants are the limits as macros.
func (u *unit) guardConstants() []constant {
	c := code{}
	l := u.Limits
	doc := "limit of stroke, m"
	if math.IsInf(l.Stroke, 1) {
		doc = "no limit of stroke in the scenario; beyond this nothing is meant, m"
	}
	c.real("STROKE", l.stroke(), doc)
	if !math.IsInf(l.Velocity, 1) {
		c.real("SPEED", l.Velocity, "limit of velocity, m/s")
		c.real("TRAVEL", l.Velocity*u.tick, "that over one tick, m")
	}
	if !math.IsInf(l.Force, 1) {
		c.real("FORCE", l.Force, "limit of force, N")
	}
	if !math.IsInf(l.Error, 1) {
		c.real("LAG", l.Error, "limit of error, m")
	}
	return c.consts
}

const guardWithin = `
/* Whether v is no more than so much either way; written so that NaN fails. */
static int within(real v, real most) { return v <= most && -v <= most; }
`

// guardSource is the guard and the functions that people call.
func (u *unit) guardSource() string {
	l := u.Limits
	var in, out strings.Builder
	check := func(b *strings.Builder, limit float64, test, flag string) {
		if !math.IsInf(limit, 1) {
			fmt.Fprintf(b, "    if (!within(%s)) flags |= $%s;\n", test, flag)
		}
	}
	check(&in, 0, "in->x, STROKE) || !within(in->y, STROKE", "RANGE")
	check(&in, l.Velocity, "in->v, SPEED", "RANGE")
	check(&in, l.Force, "in->r, FORCE", "RANGE")
	check(&in, l.Velocity, "in->x - s->target, TRAVEL", "JUMP")
	check(&in, l.Error, "s->target - in->y, LAG", "ERROR")
	check(&out, 0, "u, STROKE", "COMMAND")
	check(&out, l.Velocity, "u - s->command, TRAVEL", "COMMAND")
	return strings.NewReplacer("%INPUT%", in.String(), "%OUTPUT%", out.String()).Replace(guardTemplate)
}

const guardTemplate = `
static int finite_input(const @input *in)
{
    return within(in->x, LARGEST) && within(in->v, LARGEST) && within(in->a, LARGEST) &&
           within(in->y, LARGEST) && within(in->r, LARGEST);
}

/* What is wrong with an input, 0 if nothing is. */
static unsigned check_input(const @state *s, const @input *in)
{
    unsigned flags = 0;
    (void)s;
    if (!finite_input(in)) return $NOT_FINITE;
%INPUT%    return flags;
}

/* What is wrong with a command, 0 if nothing is. */
static unsigned check_command(const @state *s, real u)
{
    unsigned flags = 0;
    (void)s;
%OUTPUT%    return flags;
}

void @init(@state *s)
{
    s->target = 0;
    s->command = 0;
    s->flags = 0;
    @reset(s, 0, 0);
}

void @reset(@state *s, @real x, @real y)
{
    @input in;
    if (!within(x, STROKE) || !within(y, STROKE)) {
        s->flags |= within(x, LARGEST) && within(y, LARGEST) ? $RANGE : $NOT_FINITE;
        return;
    }
    in.x = x;
    in.v = 0;
    in.a = 0;
    in.y = y;
    in.r = 0;
    method_start(s, x, y);
    s->command = method_command(s, &in); /* what keeps the actuator there */
    method_start(s, x, y);
    s->target = x;
    s->flags = 0;
    if (!within(s->command, STROKE)) {
        s->flags = $COMMAND;
        s->command = x;
    }
}

void @prime(@state *s, const @input *in, @real u)
{
    if (s->flags != 0) return;
    if (!finite_input(in) || !within(u, LARGEST)) {
        s->flags = $NOT_FINITE;
        return;
    }
    method_prime(s, in, u);
    s->target = in->x;
    s->command = u;
}

@real @step(@state *s, const @input *in)
{
    real u;
    if (s->flags != 0) return s->command; /* held until a reset */
    s->flags = check_input(s, in);
    if (s->flags != 0) return s->command;
    u = method_command(s, in);
    s->flags = check_command(s, u);
    if (s->flags != 0) return s->command;
    s->target = in->x;
    s->command = u;
    return u;
}
`
