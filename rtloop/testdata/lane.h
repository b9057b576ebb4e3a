/*
 * The parts of fused.c around its loop: what a test is made of, how its
 * coefficients follow from the settings, what happens once a window, and what
 * is printed in the end.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double PI = 3.14159265358979323846;

enum { ORDER = 3, TAPS = 2 * ORDER, MOTION = 1 << 14 };

static const double DIVERGENCE = 1000; /* m */
static const double FLOOR = 1e-3;      /* of the largest W_d, for a margin */
static const double ROUNDING = 1e-9;   /* of the mean v'Mv, likewise */

enum outcome { RUNNING, TRIPPED, DIVERGED };

struct point { double x, y; };

/* A running sum and the rounding error of its additions (Knuth's TwoSum). */
struct sum { double sum, lost; };

static inline void add(struct sum *s, double v)
{
	double t = s->sum + v, kept = t - s->sum;
	s->lost += (s->sum - (t - kept)) + (v - kept);
	s->sum = t;
}

static double value(struct sum s) { return s.sum + s.lost; }

static inline double larger(double a, double b) { return a > b ? a : b; }

/* What a test does not change. */
struct lane {
	double dt;
	double mass, damping, stiffness, inverse_mass, gain; /* gain is dt·α */

	double weight_now, weight[TAPS];
	size_t ago[TAPS], target_mask;

	size_t whole, command_mask; /* ticks of delay */
	double e, wb, wa, sc, sb;

	double per_yield, yield, elastic, hysteretic, unload;

	double stroke, velocity, force, error; /* limits */
	int window, early;
	double trifle; /* W_d over ∫v'Mv dt at which it is rounding, 1/s */
};

/* Σu, Σw, Σu², Σw², Σuw about the anchor, twice the area swept, Σ(Δu)². */
struct moments { double x, y, xx, yy, xy, area, step; };

struct tracking {
	struct moments running, fresh;
	struct point anchor, last, gone, wrapped;
	int at, full, ticks;
	double base_xx, base_yy;
	double block, peak_error, peak_target;
	struct sum errors, targets, measured, area;
};

struct work { double injected, damped, motion, acceleration; };

struct energy {
	struct work running, fresh, base;
	int at, full;
	double vcv, vmv, ama, strain;
	double margin, lowest, largest;
	double damped, specimen, dissipated, input; /* since the last wrap */
	struct sum all_injected, all_damped, all_specimen, all_dissipated, all_input;
	struct sum all_motion, all_acceleration;
};

/* What a test does change. */
struct state {
	enum outcome outcome;
	double x, v, a, dv, centred;
	double external;
	double command, measured, velocity, force;
	size_t target_head, command_head;
	double b, c, q, lag_v; /* of the actuator; c is the delayed command */
	double z, dissipated;
	struct sum work;
	double peak_command, peak_velocity, peak_hurry, peak_force;
	struct tracking tracking;
	struct energy energy;
	long kept;
};

/* Memory of a test. */
struct history {
	double *targets, *commands;
	struct point *trail, *record;
	struct work *work;
	long room; /* of record */
};

/* How T·y' + y = w, T > 0, answers w that goes straight from a to b in the
 * time d: y(d) = e·y(0) + a·a + b·b. Below d/T = 1/4 by series. */
static void straight(double d, double lag, double *e, double *a, double *b)
{
	double r = d / lag, term = -1;
	*e = exp(-r);
	if (r >= 0.25) {
		double p = -expm1(-r) / r;
		*a = p - *e;
		*b = 1 - p;
		return;
	}
	*a = *b = 0;
	for (int k = 1; k <= 14; k++) {
		term *= -r / (k + 1);
		*a += k * term;
		*b += term;
	}
}

static size_t power_of_two(size_t n)
{
	size_t size = 1;
	while (size < n)
		size *= 2;
	return size;
}

static void set_structure(struct lane *l, double mass, double stiffness, double ratio, double specimen)
{
	double total = stiffness + specimen, omega = sqrt(total / mass), dt = l->dt;
	l->mass = mass;
	l->stiffness = stiffness;
	l->damping = 2 * ratio * omega * mass;
	l->inverse_mass = 1 / mass;
	l->gain = dt * mass / (mass + dt / 2 * l->damping + dt * dt / 4 * total);
	l->window = (int)round(5 * 2 * PI / omega / dt);
	l->early = (l->window + 4) / 5;
	l->trifle = ROUNDING / (dt * l->window);
}

static void set_polynomial(struct lane *l, double delay)
{
	double binomial = 1;
	for (int i = 0; i <= ORDER; i++) {
		binomial *= (double)(ORDER + 1 - i) / (i + 1);
		double c = i % 2 ? -binomial : binomial;
		if (i == 0) {
			l->weight_now = c;
			continue;
		}
		double at = i * delay / l->dt, whole = floor(at), part = at - whole;
		if (fabs(at - round(at)) < 1e-9) {
			whole = round(at);
			part = 0;
		}
		l->ago[2 * i - 2] = (size_t)whole;
		l->weight[2 * i - 2] = c * (1 - part);
		l->ago[2 * i - 1] = (size_t)whole + 1;
		l->weight[2 * i - 1] = c * part;
	}
	l->target_mask = power_of_two(l->ago[TAPS - 1] + 1) - 1;
}

static void set_actuator(struct lane *l, double delay, double lag)
{
	double h = l->dt, at = delay / h, whole = floor(at), phi = at - whole;
	if (fabs(at - round(at)) <= 1e-9) {
		whole = round(at);
		phi = 0;
	}
	double e1, a1, b1, e2, a2, b2;
	straight(phi * h, lag, &e1, &a1, &b1);
	straight((1 - phi) * h, lag, &e2, &a2, &b2);
	l->whole = (size_t)whole;
	l->command_mask = power_of_two(l->whole + 1) - 1;
	l->e = e1 * e2;
	l->wa = e2 * a1 * phi;
	l->wb = l->e + e2 * (a1 * (1 - phi) + b1) + a2 + b2 * phi;
	l->sc = -expm1(-(1 - phi) * h / lag) / h;
	l->sb = -e2 * expm1(-phi * h / lag) / h;
}

static void set_specimen(struct lane *l, double stiffness, double yield, double hardening, double beta)
{
	l->yield = yield;
	l->per_yield = 1 / yield;
	l->elastic = stiffness * hardening;
	l->hysteretic = (1 - hardening) * stiffness * yield;
	l->unload = 1 - 2 * beta;
}

/* The same n samples about a point at shift from the anchor. */
static struct moments about(struct moments m, struct point shift, int n, struct point travel)
{
	double k = n;
	m.xx += shift.x * (k * shift.x - 2 * m.x);
	m.yy += shift.y * (k * shift.y - 2 * m.y);
	m.xy += k * shift.x * shift.y - shift.x * m.y - shift.y * m.x;
	m.area -= shift.x * travel.y - shift.y * travel.x;
	m.x -= k * shift.x;
	m.y -= k * shift.y;
	return m;
}

static struct moments since_wrap(const struct tracking *t)
{
	struct point origin = {-t->anchor.x, -t->anchor.y};
	struct point travel = {t->last.x - t->wrapped.x, t->last.y - t->wrapped.y};
	return about(t->fresh, origin, t->at, travel);
}

static void wrap_tracking(struct tracking *t)
{
	int n = t->at;
	struct moments gained = since_wrap(t);
	add(&t->errors, t->block);
	add(&t->targets, gained.xx);
	add(&t->measured, gained.yy);
	add(&t->area, gained.area);
	t->block = 0;
	struct point shift = {t->fresh.x / n, t->fresh.y / n};
	struct point travel = {t->last.x - t->wrapped.x, t->last.y - t->wrapped.y};
	t->base_xx = t->fresh.xx;
	t->base_yy = t->fresh.yy;
	t->running = about(t->fresh, shift, n, travel);
	memset(&t->fresh, 0, sizeof t->fresh);
	t->anchor.x += shift.x;
	t->anchor.y += shift.y;
	t->ticks += n - !t->full;
	t->wrapped = t->last;
	t->at = 0;
	t->full = 1;
}

static void wrap_energy(struct energy *e)
{
	add(&e->all_injected, e->fresh.injected);
	add(&e->all_motion, e->fresh.motion);
	add(&e->all_acceleration, e->fresh.acceleration);
	add(&e->all_damped, e->damped);
	add(&e->all_specimen, e->specimen);
	add(&e->all_dissipated, e->dissipated);
	add(&e->all_input, e->input);
	e->damped = e->specimen = e->dissipated = e->input = 0;
	e->running = e->base = e->fresh;
	memset(&e->fresh, 0, sizeof e->fresh);
	e->at = 0;
	e->full = 1;
}

static void put(const char *name, double v) { printf("%s %.17g\n", name, v); }

/* −W_i/(2ω∫vᵀMv). */
static double added_damping(double injected, double motion, double acceleration)
{
	return (0 - injected) / (2 * sqrt(motion) * sqrt(acceleration));
}

static void put_tracking(const struct lane *l, const struct tracking *t)
{
	struct moments g = since_wrap(t);
	double targets = value(t->targets) + g.xx;
	put("nrmse", sqrt((value(t->errors) + t->block) / targets));
	put("amplitude_ratio", sqrt((value(t->measured) + g.yy) / targets));
	put("indicator", (value(t->area) + g.area) / 2);
	put("peak_error", t->peak_error);
	put("peak_target", t->peak_target);

	/* The synchronization subspace over a full window. */
	double n = l->window;
	struct point centre = {t->running.x / n, t->running.y / n};
	struct point travel = {t->last.x - t->gone.x, t->last.y - t->gone.y};
	struct moments m = about(t->running, centre, l->window, travel);
	double xx = m.xx / n, yy = m.yy / n, xy = m.xy / n;
	double mean = (xx + yy) / 2, radius = hypot((xx - yy) / 2, xy);
	double omega = 2 * asin(sqrt(m.step / n / xx) / 2);
	put("subspace_centre_x", t->anchor.x + centre.x);
	put("subspace_centre_y", t->anchor.y + centre.y);
	put("subspace_major", sqrt(2 * (mean + radius)));
	put("subspace_minor", sqrt(2 * larger(0, (xx * yy - xy * xy) / (mean + radius))));
	put("subspace_delay", atan2(m.area / n / sin(omega), 2 * xy) / omega);
}

static void put_energy(const struct energy *e)
{
	double injected = value(e->all_injected) + e->fresh.injected;
	put("margin", e->margin);
	put("margin_min", e->lowest);
	put("window_added_damping", added_damping(e->running.injected, e->running.motion, e->running.acceleration));
	put("injected", injected);
	put("damped", value(e->all_damped) + e->damped);
	put("specimen", value(e->all_specimen) + e->specimen);
	put("dissipated", value(e->all_dissipated) + e->dissipated);
	put("input", value(e->all_input) + e->input);
	put("kinetic", e->vmv / 2);
	put("strain", e->strain);
	put("added_damping", added_damping(injected, value(e->all_motion) + e->fresh.motion,
	                                   value(e->all_acceleration) + e->fresh.acceleration));
}

static void put_results(const struct lane *l, const struct state *s, const struct history *h)
{
	double x = 0, y = 0;
	for (long k = 0; k < s->kept; k++) {
		x += h->record[k].x;
		y += h->record[k].y;
	}
	put("outcome", s->outcome);
	put("window", l->window);
	put("x", s->x);
	put("command", s->command);
	put("measured", s->measured);
	put("velocity", s->velocity);
	put("force", s->force);
	put("peak_command", s->peak_command);
	put("peak_velocity", s->peak_velocity);
	put("peak_command_velocity", s->peak_hurry);
	put("peak_force", s->peak_force);
	put("record_ticks", (double)s->kept);
	put("record_target", x);
	put("record_measured", y);
	put_tracking(l, &s->tracking);
	put_energy(&s->energy);
}
