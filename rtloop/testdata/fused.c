/*
 * The standard lane of BenchmarkTick, fused by hand into one loop: what the
 * tick costs when nothing can be exchanged. The kinds are fixed here (one
 * storey on the ground, one channel, CR, polynomial of order 3, lag-delay
 * between ramps, one bouc-wen element with n = 1, perfect sensors), their
 * settings are not: every coefficient is worked out at the start. The
 * arithmetic of a tick and its order are those of the packages; what a kind
 * without hysteretic storeys, noise or a second level would add as zero is left
 * out.
 *
 *     fused TICKS REPEATS
 *
 * runs REPEATS tests of TICKS ticks, each begun at rest, and prints the time of
 * a tick in the fastest lap, and what the last test came to, one "name value" a
 * line, SI. A lap is once through the motion, 2^14 ticks; the first of a test
 * does not count, for its window is not full yet.
 */
#define _POSIX_C_SOURCE 200809L

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "lane.h"

/* 1 − e^(−x), to full relative precision. */
static inline double approach(double x)
{
	if (!(x < 1.0 / 16))
		return -expm1(-x);
	double x2 = x * x, x4 = x2 * x2;
	double low = (1 - x * (1.0 / 2)) + x2 * (1.0 / 6 - x * (1.0 / 24));
	double high = (1.0 / 120 - x * (1.0 / 720)) + x2 * (1.0 / 5040 - x * (1.0 / 40320));
	return x * (low + x4 * (high + x4 * (1.0 / 362880)));
}

/* The hysteretic variable after a path of length x, both seen along the path. */
static inline double follow(double zeta, double x, double a)
{
	if (zeta < 0) {
		if (a == 0) {
			if (zeta + x <= 0)
				return zeta + x;
			x += zeta;
		} else {
			double zero = -log1p(a * zeta) / a;
			if (x <= zero) {
				double end = zeta + (1 + a * zeta) * expm1(a * x) / a;
				return end < 0 ? end : 0;
			}
			x -= zero;
		}
		zeta = 0;
	}
	return zeta + (1 - zeta) * approach(x);
}

static void more_room(struct history *h)
{
	h->room *= 2;
	h->record = realloc(h->record, (size_t)h->room * sizeof *h->record);
	if (h->record == NULL)
		exit(1);
}

/* At rest at zero, under the first sample of the motion. */
static void start(const struct lane *l, struct state *s, struct history *h, double drive)
{
	memset(s, 0, sizeof *s);
	memset(h->targets, 0, (l->target_mask + 1) * sizeof *h->targets);
	memset(h->commands, 0, (l->command_mask + 1) * sizeof *h->commands);
	s->external = -l->mass * drive;
	s->a = l->inverse_mass * s->external;
	s->dv = l->gain * s->a;
	s->centred = s->v + 0.5 * s->dv;
	h->trail[0].x = h->trail[0].y = 0;
	s->tracking.at = 1;
	s->energy.vcv = s->centred * (l->damping * s->centred);
	s->energy.vmv = s->centred * (l->mass * s->centred);
	s->energy.ama = s->a * (l->mass * s->a);
	s->energy.margin = NAN;
	s->energy.lowest = INFINITY;
}

/* Ticks number from to to of a test. */
static void run(const struct lane *lane, struct state *state, struct history *h, const double *motion, long from, long to)
{
	/* Copies that nothing else points to, so that they may stay in registers. */
	const struct lane l = *lane;
	struct state s = *state;
	double *const targets = h->targets, *const commands = h->commands;
	struct point *const trail = h->trail, *record = h->record;
	struct work *const past = h->work;
	const double half = l.dt / 2;
	const double per_tick = 1 / l.dt;

	for (long i = from; i < to && s.outcome == RUNNING; i++) {
		/* Predict. */
		const double x_was = s.x;
		s.v += s.dv;
		s.x += l.dt * s.v;
		if (!(fabs(s.x) < DIVERGENCE)) {
			s.outcome = DIVERGED;
			break;
		}
		const double x = s.x, y_was = s.measured, r_was = s.force;

		/* Compensate. */
		s.target_head = (s.target_head + 1) & l.target_mask;
		targets[s.target_head] = x;
		double even = l.weight_now * x, odd = 0;
		for (int k = 0; k < TAPS; k += 2) {
			even += l.weight[k] * targets[(s.target_head - l.ago[k]) & l.target_mask];
			odd += l.weight[k + 1] * targets[(s.target_head - l.ago[k + 1]) & l.target_mask];
		}
		const double u = even + odd;
		const double asked = (u - s.command) * per_tick;
		s.command = u;

		/* Act. */
		s.command_head = (s.command_head + 1) & l.command_mask;
		commands[s.command_head] = u;
		const double a = s.b, b = s.c, c = commands[(s.command_head - l.whole) & l.command_mask];
		s.b = b;
		s.c = c;
		s.q = l.e * s.q + (l.wb * (b - c) + l.wa * (a - c));
		s.lag_v = l.e * s.lag_v + (l.sc * (c - b) + l.sb * (b - a));
		const double y = c + s.q;
		s.velocity = s.lag_v;
		s.measured = y;

		/* The specimen and its energy. */
		const double path = (y - y_was) * l.per_yield;
		s.z = path < 0 ? -follow(-s.z, -path, l.unload) : follow(s.z, path, l.unload);
		const double r = l.elastic * y + l.hysteretic * s.z;
		const double dy = y - y_was;
		s.force = r;
		add(&s.work, 0.5 * (r_was + r) * dy);
		const double stored = 0.5 * l.elastic * y * y + 0.5 * l.hysteretic * l.yield * s.z * s.z;
		const double gone = value(s.work) - stored;
		const double dissipated = gone - s.dissipated;
		s.dissipated = gone;
		const double mean = 0.5 * (r_was + r);
		const double injected = mean * (dy - (x - x_was));
		const double specimen = mean * dy;

		/* Correct. */
		const double external_was = s.external;
		s.external = -l.mass * motion[i & (MOTION - 1)];
		s.a = l.inverse_mass * (s.external - r - l.damping * s.v - l.stiffness * x);
		s.dv = l.gain * s.a;
		s.centred = s.v + 0.5 * s.dv;

		/* Limits. */
		const double reach = larger(fabs(u), fabs(y)), error = x - y, lag = fabs(error);
		const double speed = fabs(s.velocity), push = fabs(r), hurry = fabs(asked);
		if (!(reach < DIVERGENCE) || !(push <= DBL_MAX) || !(speed <= DBL_MAX)) {
			s.outcome = DIVERGED;
			break;
		}
		if (reach > l.stroke || speed > l.velocity || hurry > l.velocity || push > l.force || lag > l.error)
			s.outcome = TRIPPED;

		/* Tracking. */
		struct tracking *t = &s.tracking;
		t->block += error * error;
		t->peak_error = larger(lag, t->peak_error);
		t->peak_target = larger(fabs(x), t->peak_target);
		const double mx = t->anchor.x, my = t->anchor.y;
		const double dx = x - t->last.x, dw = y - t->last.y;
		struct moments m = {x - mx, y - my, 0, 0, 0, 0, dx * dx};
		m.xx = m.x * m.x;
		m.yy = m.y * m.y;
		m.xy = m.x * m.y;
		m.area = m.x * dw - m.y * dx;
		t->last.x = x;
		t->last.y = y;
		t->fresh.x += m.x;
		t->fresh.y += m.y;
		t->fresh.xx += m.xx;
		t->fresh.yy += m.yy;
		t->fresh.xy += m.xy;
		t->fresh.area += m.area;
		t->fresh.step += m.step;
		if (t->full) {
			const struct point old = trail[t->at];
			const double ox = old.x - t->gone.x, oy = old.y - t->gone.y;
			const double ou = old.x - mx, ow = old.y - my;
			t->gone = old;
			m.x -= ou;
			m.y -= ow;
			m.xx -= ou * ou;
			m.yy -= ow * ow;
			m.xy -= ou * ow;
			m.area -= ou * oy - ow * ox;
			m.step -= ox * ox;
		}
		t->running.x += m.x;
		t->running.y += m.y;
		t->running.xx += m.xx;
		t->running.yy += m.yy;
		t->running.xy += m.xy;
		t->running.area += m.area;
		t->running.step += m.step;
		trail[t->at].x = x;
		trail[t->at].y = y;
		if (++t->at == l.window)
			wrap_tracking(t);

		/* Record and peaks. */
		if (s.kept == h->room) {
			more_room(h);
			record = h->record;
		}
		record[s.kept].x = x;
		record[s.kept].y = y;
		s.kept++;
		s.peak_command = larger(fabs(u), s.peak_command);
		s.peak_velocity = larger(speed, s.peak_velocity);
		s.peak_hurry = larger(hurry, s.peak_hurry);
		s.peak_force = larger(push, s.peak_force);

		/* Energy. */
		struct energy *e = &s.energy;
		const double vcv = s.centred * (l.damping * s.centred);
		const double vmv = s.centred * (l.mass * s.centred);
		const double ama = s.a * (l.mass * s.a);
		const double damped = half * (e->vcv + vcv);
		struct work in = {injected, damped + dissipated, half * (e->vmv + vmv), half * (e->ama + ama)};
		e->damped += damped;
		e->specimen += specimen;
		e->dissipated += dissipated;
		e->input += 0.5 * (external_was + s.external) * (x - x_was);
		e->vcv = vcv;
		e->vmv = vmv;
		e->ama = ama;
		e->strain = 0.5 * (x * (l.stiffness * x));
		e->fresh.injected += in.injected;
		e->fresh.damped += in.damped;
		e->fresh.motion += in.motion;
		e->fresh.acceleration += in.acceleration;
		const struct work old = past[e->at];
		past[e->at] = in;
		if (e->full) {
			in.injected -= old.injected;
			in.damped -= old.damped;
			in.motion -= old.motion;
			in.acceleration -= old.acceleration;
		}
		e->running.injected += in.injected;
		e->running.damped += in.damped;
		e->running.motion += in.motion;
		e->running.acceleration += in.acceleration;
		if (++e->at == l.window)
			wrap_energy(e);
		const double all = e->running.damped;
		e->largest = larger(all, e->largest);
		if (!(all > FLOOR * e->largest && all > l.trifle * e->running.motion) || (!e->full && e->at < l.early)) {
			e->margin = NAN;
		} else {
			e->margin = 1 - e->running.injected / all;
			if (e->margin < e->lowest)
				e->lowest = e->margin;
		}
	}
	*state = s;
}

static void *room_for(size_t n, size_t size)
{
	void *p = calloc(n, size);
	if (p == NULL)
		exit(1);
	return p;
}

static double now(void)
{
	struct timespec t;
	clock_gettime(CLOCK_MONOTONIC, &t);
	return 1e9 * (double)t.tv_sec + (double)t.tv_nsec;
}

int main(int argc, char **argv)
{
	long ticks = argc == 3 ? atol(argv[1]) : 0, repeats = argc == 3 ? atol(argv[2]) : 0;
	if (ticks < 1 || repeats < 1) {
		fprintf(stderr, "usage: fused TICKS REPEATS\n");
		return 2;
	}
	const double stiffness = 1.5e6;
	struct lane l = {.dt = 1.0 / 2048, .stroke = INFINITY, .velocity = INFINITY, .force = INFINITY, .error = INFINITY};
	set_structure(&l, 60e3, 4e6, 0.03, stiffness);
	set_polynomial(&l, 0.010);
	set_actuator(&l, 0.0083, 0.006);
	set_specimen(&l, stiffness, 0.01, 0.1, 0.5);

	double *motion = room_for(MOTION, sizeof *motion);
	const double cycles[] = {7, 11, 17, 29};
	for (int i = 0; i < MOTION; i++)
		for (int k = 0; k < 4; k++)
			motion[i] += 1.2 / (k + 1) * sin(2 * PI * cycles[k] * ((double)i / MOTION));

	struct history h = {
		.targets = room_for(l.target_mask + 1, sizeof *h.targets),
		.commands = room_for(l.command_mask + 1, sizeof *h.commands),
		.trail = room_for((size_t)l.window, sizeof *h.trail),
		.record = room_for((size_t)ticks, sizeof *h.record),
		.work = room_for((size_t)l.window, sizeof *h.work),
		.room = ticks,
	};
	/* The pages are there before the clock runs, as in a second test. */
	memset(h.record, 0xff, (size_t)ticks * sizeof *h.record);

	struct state s;
	double best = INFINITY;
	for (long r = 0; r < repeats; r++) {
		start(&l, &s, &h, motion[0]);
		for (long from = 0; from < ticks; from += MOTION) {
			long to = from + MOTION < ticks ? from + MOTION : ticks;
			double began = now();
			run(&l, &s, &h, motion, from, to);
			double took = (now() - began) / (double)(to - from);
			if (took < best && from > 0 && to - from == MOTION)
				best = took;
		}
	}
	put("ns_per_tick", best);
	put_results(&l, &s, &h);

	free(motion);
	free(h.targets);
	free(h.commands);
	free(h.trail);
	free(h.record);
	free(h.work);
	return 0;
}
