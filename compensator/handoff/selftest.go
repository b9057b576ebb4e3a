package handoff

import (
	"fmt"
	"math"
	"strings"
)

// selfTest writes selftest.c: it runs vectors.csv through the C, and shows every
// guard what it must stop.
func selfTest(t *Test, digest string, units []*unit) []byte {
	var b strings.Builder
	b.WriteString(comment(
		"Self-test of the compensators in this directory, written by antelag "+plain(t.Version)+".",
		"", cautions[0], cautions[1], "",
		"  scenario "+quoted(t.Scenario)+", "+quoted(t.Title), "  digest, SHA-256 of scenario.toml: "+digest, "",
		"usage: selftest vectors.csv          runs the vectors; exit 0 if all is well, 1 if not, 2 if it cannot run",
		"       selftest vectors.csv STEPS    says how long a step takes, over so many"))
	b.WriteString("#include <math.h>\n#include <stdio.h>\n#include <stdlib.h>\n#include <string.h>\n#include <time.h>\n\n")
	for _, u := range units {
		fmt.Fprintf(&b, "#include %q\n", u.ident+".h")
	}
	b.WriteString(selfTestTop)
	for _, u := range units {
		b.WriteString(u.text(selfTestChannel))
	}
	b.WriteString("\nstatic struct channel channels[] = {\n")
	for _, u := range units {
		b.WriteString(u.text(u.selfTestEntry()))
	}
	b.WriteString("};\n")
	b.WriteString(selfTestBottom)
	return []byte(b.String())
}

// selfTestEntry is the line of a channel in the table of the self-test; limits
// that there are not are 0.
func (u *unit) selfTestEntry() string {
	limit := func(v float64) string {
		if math.IsInf(v, 1) {
			return "0.0"
		}
		return literal(v)
	}
	l := u.Limits
	return fmt.Sprintf("    {%q, %d, %s, %s, {%s, %s, %s, %s}, @do_init, @do_reset, @do_prime, @do_step, @do_flags, @do_time, 0, 0.0},\n",
		u.ident, len(u.rows), literal(u.report.DoubleBound), literal(u.report.FloatBound),
		limit(l.stroke()), limit(l.Velocity*u.tick), limit(l.Force), limit(l.Error))
}

const selfTestTop = `
/* x, v, a, y, r of an input, and the command. */
enum { X, V, A, Y, R, U, COLUMNS };

/* How many steps of a channel are kept to be timed. */
#define TIMED 1024

struct channel {
    const char *name;
    long rows;                       /* in the file */
    double allowed, allowed_float;   /* largest difference, m */
    struct { double stroke, travel, force, error; } limit; /* 0: none */
    double (*init)(void);
    double (*reset)(double x, double y);
    void (*prime)(const double *c);
    double (*step)(const double *c);
    unsigned (*flags)(void);
    double (*time)(long steps, double (*rows)[COLUMNS], int n);
    long seen;                       /* rows that were run */
    double worst;                    /* largest difference, m */
};

static double timed[TIMED][COLUMNS];
`

const selfTestChannel = `
static @state @s;

static @input @input_of(const double *c)
{
    @input in;
    in.x = (@real)c[X];
    in.v = (@real)c[V];
    in.a = (@real)c[A];
    in.y = (@real)c[Y];
    in.r = (@real)c[R];
    return in;
}

static double @do_init(void)
{
    memset(&@s, 0xff, sizeof @s); /* whatever was there before */
    @init(&@s);
    return (double)@s.command;
}

static double @do_reset(double x, double y)
{
    @reset(&@s, (@real)x, (@real)y);
    return (double)@s.command;
}

static void @do_prime(const double *c)
{
    const @input in = @input_of(c);
    @prime(&@s, &in, (@real)c[U]);
}

static double @do_step(const double *c)
{
    const @input in = @input_of(c);
    return (double)@step(&@s, &in);
}

static unsigned @do_flags(void) { return @s.flags; }

/* Seconds that so many steps take. */
static double @do_time(long steps, double (*rows)[COLUMNS], int n)
{
    static @input in[TIMED];
    clock_t from;
    long k;
    int i;
    for (i = 0; i < n; i++) in[i] = @input_of(rows[i]);
    @init(&@s);
    from = clock();
    for (k = 0; k < steps; k += n) {
        @reset(&@s, 0, 0);
        for (i = 0; i < n; i++) (void)@step(&@s, &in[i]);
    }
    return (double)(clock() - from) / (double)CLOCKS_PER_SEC * ((double)steps / (double)k);
}
`

const selfTestBottom = `
enum { CHANNELS = sizeof channels / sizeof channels[0] };

/* The bits of the flags, the same for every channel. */
enum { NOT_FINITE = 1, RANGE = 2, JUMP = 4, ERROR = 8, COMMAND = 16 };

static double allowed(const struct channel *c)
{
#ifdef ANTELAG_FLOAT
    return c->allowed_float;
#else
    return c->allowed;
#endif
}

/* Takes the next field of a line; 0 where there is none. */
static char *field(char **rest)
{
    char *from = *rest, *to;
    if (from == 0) return 0;
    to = strchr(from, ',');
    if (to != 0) *to++ = '\0';
    *rest = to;
    return from;
}

static struct channel *channel_of(const char *name)
{
    int i;
    for (i = 0; name != 0 && i < CHANNELS; i++)
        if (strcmp(name, channels[i].name) == 0) return &channels[i];
    return 0;
}

/* Reads one line of the vectors. Returns 0 if it is none. */
static int read_row(char *line, struct channel **c, char *call, double *v)
{
    char *rest = line, *word, *end;
    int i;
    line[strcspn(line, "\r\n")] = '\0';
    *c = channel_of(field(&rest));
    word = field(&rest);
    if (*c == 0 || word == 0) return 0;
    *call = word[0];
    for (i = 0; i < COLUMNS; i++) {
        word = field(&rest);
        if (word == 0) return 0;
        v[i] = strtod(word, &end);
        if (end == word || *end != '\0') return 0;
    }
    return rest == 0 && (*call == 'i' || *call == 'r' || *call == 'p' || *call == 's');
}

static void compare(struct channel *c, double got, double want)
{
    const double d = fabs(got - want);
    if (!(d <= c->worst)) c->worst = d; /* NaN too */
}

/* Runs all vectors. Returns 0 if the file is not what it should be. */
static int run(FILE *f)
{
    char line[512], call;
    double v[COLUMNS];
    struct channel *c;
    long number = 1;
    if (fgets(line, sizeof line, f) == 0) return 0; /* the header */
    while (fgets(line, sizeof line, f) != 0) {
        number++;
        if (!read_row(line, &c, &call, v)) {
            fprintf(stderr, "selftest: line %ld of the vectors is no row of this test\n", number);
            return 0;
        }
        c->seen++;
        if (call == 'i') compare(c, c->init(), v[U]);
        if (call == 'r') compare(c, c->reset(v[X], v[Y]), v[U]);
        if (call == 'p') c->prime(v);
        if (call == 's') compare(c, c->step(v), v[U]);
        if (c->flags() != 0) c->worst = HUGE_VAL; /* the guard stopped a good input */
    }
    return 1;
}

static int trouble(const struct channel *c, const char *what)
{
    printf("%s: GUARD: %s\n", c->name, what);
    return 1;
}

/* Shows the guard of a channel one bad value, after a good one. */
static int stops(const struct channel *c, int at, double bad, unsigned flag, const char *what)
{
    static const double rest[COLUMNS];
    double v[COLUMNS], held;
    memcpy(v, rest, sizeof v);
    (void)c->reset(0.0, 0.0);
    held = c->step(v);
    if (c->flags() != 0) return trouble(c, "stops a target at rest");
    v[at] = bad;
    if (c->step(v) != held || (c->flags() & flag) == 0) return trouble(c, what);
    if (c->step(rest) != held || (c->flags() & flag) == 0) return trouble(c, "lets go by itself");
    return 0;
}

/* Gives a channel what asks for a command that is none, if the method minds it:
 * it must be held, or be within the limits. */
static int bounds(const struct channel *c, int at, double large)
{
    double v[COLUMNS] = {0.0}, held, u;
    held = c->reset(0.0, 0.0);
    v[at] = large;
    u = c->step(v);
    if (c->flags() != 0) return u != held ? trouble(c, "passes a command and raises a flag") : 0;
    if (!(fabs(u) <= c->limit.stroke)) return trouble(c, "passes a command beyond the stroke");
    if (c->limit.travel > 0.0 && !(fabs(u - held) <= 1.000001 * c->limit.travel)) return trouble(c, "passes a jump of the command");
    return 0;
}

/* Shows the guard of a channel everything that it must stop. */
static int guard(const struct channel *c)
{
    static const double none[3] = {(double)NAN, (double)INFINITY, (double)-INFINITY};
    const double no_number[COLUMNS] = {0.0, 0.0, 0.0, (double)NAN};
    int bad = 0, i, at;
    for (at = X; at <= R; at++)
        for (i = 0; i < 3; i++) bad += stops(c, at, none[i], NOT_FINITE, "passes what is no number");
    for (i = -1; i <= 1; i += 2) {
        bad += stops(c, X, 1.001 * i * c->limit.stroke, RANGE, "passes a target beyond the stroke");
        bad += stops(c, Y, 1.001 * i * c->limit.stroke, RANGE, "passes a measured displacement beyond the stroke");
        if (c->limit.force > 0.0) bad += stops(c, R, 1.001 * i * c->limit.force, RANGE, "passes a force beyond the limit");
        if (c->limit.error > 0.0 && c->limit.error < c->limit.stroke)
            bad += stops(c, Y, 1.001 * i * c->limit.error, ERROR, "passes an error beyond the limit");
        if (c->limit.travel > 0.0 && c->limit.travel < c->limit.stroke)
            bad += stops(c, X, 1.001 * i * c->limit.travel, JUMP, "passes a jump");
    }
    for (at = X; at <= A; at++) bad += bounds(c, at, 1e30) + bounds(c, at, 1.0) + bounds(c, at, 0.99 * c->limit.travel);
    (void)c->reset(0.0, 0.0);
    c->prime(no_number);
    if (c->flags() != NOT_FINITE) bad += trouble(c, "is primed with what is no number");
    (void)c->reset((double)NAN, 0.0);
    if (c->flags() == 0) bad += trouble(c, "resets to what is no number");
    (void)c->reset(0.0, 0.0);
    if (c->flags() != 0) bad += trouble(c, "does not reset");
    return bad == 0;
}

/* Says how long a step of each channel takes. */
static int time_steps(FILE *f, long steps)
{
    char line[512], call;
    double v[COLUMNS];
    struct channel *c, *last = 0;
    int n = 0, done = 0, i;
    if (fgets(line, sizeof line, f) == 0) return 2;
    for (i = 0; i <= CHANNELS;) {
        const int more = fgets(line, sizeof line, f) != 0 && read_row(line, &c, &call, v);
        if (last != 0 && !done && (!more || c != last || call != 's' || n == TIMED)) {
            const double t = last->time(steps, timed, n);
            if (last->flags() != 0) return 1;
            printf("%s: %.2f ns a step\n", last->name, t / (double)steps * 1e9);
            done = 1;
        }
        if (!more) break;
        if (c != last) {
            last = c;
            n = done = 0; /* this is its first row, a reset */
            i++;
        } else if (!done) {
            memcpy(timed[n++], v, sizeof v);
        }
    }
    return last == 0 ? 2 : 0;
}

int main(int count, char **args)
{
    int i, good = 1;
    FILE *f = count > 1 ? fopen(args[1], "r") : 0;
    if (f == 0) {
        fprintf(stderr, count > 1 ? "selftest: the vectors cannot be read\n" : "usage: selftest vectors.csv [STEPS]\n");
        return 2;
    }
    if (count > 2) {
        const long steps = strtol(args[2], 0, 10);
        i = steps > 0 ? time_steps(f, steps) : 2;
        fclose(f);
        return i;
    }
    i = run(f);
    fclose(f);
    if (!i) return 2;
    for (i = 0; i < CHANNELS; i++) {
        struct channel *c = &channels[i];
        const int held = guard(c), close = c->worst <= allowed(c), all = c->seen == c->rows;
        printf("%s: %s, %ld vectors, largest difference %.3g m, allowed %.3g m; guard %s\n", c->name,
               close && held && all ? "ok" : "FAILED", c->seen, c->worst, allowed(c), held ? "holds" : "FAILED");
        if (!all) printf("%s: %ld vectors are missing\n", c->name, c->rows - c->seen);
        good = good && held && close && all;
    }
    return good ? 0 : 1;
}
`

// makefile writes the Makefile.
func makefile(t *Test, digest string, units []*unit) []byte {
	var names []string
	for _, u := range units {
		names = append(names, u.ident)
	}
	sources, headers := strings.Join(names, ".c ")+".c", strings.Join(names, ".h ")+".h"
	return []byte("# Written by antelag " + strings.ReplaceAll(plain(t.Version), "#", "") + "; digest of the scenario " + digest + "\n" +
		strings.NewReplacer("%SOURCES%", sources, "%HEADERS%", headers).Replace(makefileText))
}

const makefileText = `#
#   make test    builds the self-test in double and float, and runs both
#   make time    says how long a step takes on this machine
#
# Products must not be fused into sums, or the numbers are not those that were
# proved; -ffast-math is refused.

CFLAGS ?= -O2
STRICT = -std=c99 -Wall -Wextra -Wpedantic -Wconversion -Wdouble-promotion -ffp-contract=off
STEPS ?= 5000000
SOURCES = selftest.c %SOURCES%
HEADERS = %HEADERS%

all: selftest_double selftest_float

selftest_double: $(SOURCES) $(HEADERS)
	$(CC) $(STRICT) $(CFLAGS) $(LDFLAGS) -o $@ $(SOURCES) -lm

selftest_float: $(SOURCES) $(HEADERS)
	$(CC) $(STRICT) $(CFLAGS) -DANTELAG_FLOAT $(LDFLAGS) -o $@ $(SOURCES) -lm

test: selftest_double selftest_float
	@echo "double:"; ./selftest_double vectors.csv
	@echo "float:"; ./selftest_float vectors.csv

time: selftest_double selftest_float
	@echo "double:"; ./selftest_double vectors.csv $(STEPS)
	@echo "float:"; ./selftest_float vectors.csv $(STEPS)

clean:
	rm -f selftest_double selftest_float

.PHONY: all test time clean
`
