package handoff

// The functions that several methods call. They are what the Go functions of
// the same names are, in the same order of arithmetic.

const historyPart = `
/* The signal so many ticks before its newest sample, on the straight line
 * between the samples on either side. */
static real history_at(const real *ring, unsigned long head, double ago)
{
    const unsigned long whole = (unsigned long)ago;
    const real a = ring[(head - whole) & MASK];
    const real b = ring[(head - whole - 1ul) & MASK];
    return a + (real)(ago - (double)whole) * (b - a);
}
`

const clampPart = `
static double clamp(double v, double lo, double hi)
{
    if (v < lo) return lo;
    if (v > hi) return hi;
    return v;
}
`

const followPart = `
/* Moves a parameter p by one tick of dp/dt = kappa w eps, eps = e q/(q^2 + q0^2)
 * bounded to +-(hi - lo), and bounds p to lo .. hi; step is kappa dt, q02
 * q0^2. */
static void follow(double *p, double e, double q, double w, double step, double q02, double lo, double hi)
{
    const double reach = hi - lo;
    const double off = clamp(e * q / (q * q + q02), -reach, reach);
    if (off != off) return; /* beyond all numbers: nothing can be learned */
    *p = clamp(*p + step * w * off, lo, hi);
}
`

const dotPart = `
/* The sum of a[i] b[i]. Several sums side by side need not wait for each
 * other's additions. */
static real dot(const real *a, const real *b, int n)
{
    real s0 = 0, s1 = 0, s2 = 0, s3 = 0;
    int i;
    for (i = 0; i + 8 <= n; i += 8) {
        s0 += a[i] * b[i] + a[i + 4] * b[i + 4];
        s1 += a[i + 1] * b[i + 1] + a[i + 5] * b[i + 5];
        s2 += a[i + 2] * b[i + 2] + a[i + 6] * b[i + 6];
        s3 += a[i + 3] * b[i + 3] + a[i + 7] * b[i + 7];
    }
    for (; i < n; i++) s0 += a[i] * b[i];
    return (s0 + s1) + (s2 + s3);
}
`

const approachPart = `
/* Goes from one value towards another, by no more than step. */
static double approach(double from, double to, double step)
{
    const double d = to - from;
    if (d > step) return from + step;
    if (d < -step) return from - step;
    return to;
}
`

// pushRing takes the target into the ring of a state.
const pushRing = `    s->head = (s->head + 1ul) & MASK;
    s->past[s->head] = in->x;
`

// fillRing makes all past samples the same.
const fillRing = `    int i;
    for (i = 0; i < SIZE; i++) s->past[i] = x;
    s->head = 0;
`

// ringMembers are a ring of so many samples.
func ringMembers(size int, doc string) []member {
	return []member{{"real", "past", size, doc}, {"unsigned long", "head", 0, "where the newest is"}}
}
