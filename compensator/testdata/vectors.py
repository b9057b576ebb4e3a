"""Reference vectors for the adaptive compensators and for least squares.

Run in this directory: python3 vectors.py
Made with NumPy 1.24.2 and SciPy 1.10.1.
"""
import numpy as np
from scipy.signal import butter, sosfilt, sosfilt_zi


def save(name, header, *columns):
    np.savetxt(name, np.column_stack(columns), fmt="%.17g", delimiter=",", header=header, comments="")


def area(x, y):
    """Growth of 1/2 the line integral of x dy - y dx from point to point."""
    return 0.5 * (x[:-1] * y[1:] - x[1:] * y[:-1])


def motion(rate, ticks):
    """Target and measured: late at first, then early, then late again."""
    t = np.arange(ticks + 1) / rate
    late = 0.02 * np.cos(2 * np.pi * t / (ticks / rate))

    def f(s):
        return 0.03 * np.sin(2 * np.pi * 1.1 * s) + 0.01 * np.sin(2 * np.pi * 2.7 * s + 1)

    return f(t) - f(0), 0.98 * (f(t - late) - f(0))


def adaptive_inverse():
    """u_k and alpha_k; the past is 0 for ever, and so is x_0."""
    rate, ticks, start = 256.0, 700, 0.012
    dt = 1 / rate
    x, y = motion(rate, ticks)
    x0, x1 = x[:-1], x[1:]  # at t_k and t_{k+1}
    growth = area(np.concatenate([[0], x0]), np.concatenate([[0], y[:-1]]))

    # Bounds out of reach: plain running sums.
    kp, ki = 4e3, 6e3
    ti = np.cumsum(growth)
    alpha = 1 + start * rate + kp * ti + ki * np.cumsum(ti) * dt
    assert alpha.min() > 1 and alpha.max() < 1 + 0.5 * rate
    save("adaptive_inverse_free.csv", "x_next,y,u,alpha", x1, y[:-1], alpha * x1 - (alpha - 1) * x0, alpha)

    # Bounds reached on both sides: the rule, word by word.
    for name, kp, ki in ("both", 1.5e5, 4e5), ("integral", 0.0, 4e6), ("proportional", 3e5, 0.0):
        lo, hi = 1 + 0.004 * rate, 1 + 0.018 * rate
        a0 = 1 + start * rate
        ti = total = 0.0
        alpha, hits = np.empty(ticks), {1: 0, -1: 0}
        for k, d in enumerate(growth):
            new_ti = ti + d
            new_total = total + new_ti * dt
            a = a0 + kp * new_ti + ki * new_total
            if not lo <= a <= hi:
                bound, out = (hi, 1) if a > hi else (lo, -1)
                hits[out] += 1
                if out * new_ti > 0:
                    new_total = total
                a = a0 + kp * new_ti + ki * new_total
                if out * (a - bound) > 0:
                    if kp > 0:
                        new_ti -= (a - bound) / kp
                    a = bound
                if kp == 0 and out * d > 0:
                    new_ti = ti
            ti, total, alpha[k] = new_ti, new_total, a
        assert min(hits.values()) > 5, (name, hits)
        save(f"adaptive_inverse_{name}.csv", "x_next,y,u,alpha", x1, y[:-1], alpha * x1 - (alpha - 1) * x0, alpha)


def adaptive_time_series():
    """Coefficients by lstsq on the filtered rows of the window, tick by tick."""
    rate, ticks, window, cutoff, threshold = 256.0, 520, 64, 20.0, 0.004
    dt = 1 / rate
    t = (np.arange(ticks) + 1) * dt
    x = v = a = 0
    for amplitude, f, phase in (0.03, 2.3, 0.3), (0.005, 2.9, 1.0), (0.0002, 5.7, 2.0):
        w = 2 * np.pi * f
        x = x + amplitude * np.sin(w * t + phase)
        v = v + amplitude * w * np.cos(w * t + phase)
        a = a - amplitude * w * w * np.sin(w * t + phase)
    sos = butter(4, cutoff, fs=rate, output="sos")
    zy = zu = 0 * sosfilt_zi(sos)
    noise = np.random.default_rng(5).normal(scale=9e-5, size=ticks)

    c = np.array([1.0, 0.010, 0.010**2 / 2])
    u, y, coefficients = np.zeros(ticks), np.zeros(ticks), np.zeros((ticks, 3))
    Y, U = [0.0, 0.0], [0.0, 0.0]  # filtered, from two ticks before the start
    plant, pole, learned = 0.0, np.exp(-dt / 0.009), []
    for k in range(ticks):
        # The actuator: two ticks of delay, a lag of 9 ms, gain 0.93.
        plant = pole * plant + (1 - pole) * 0.93 * (u[k - 3] if k >= 3 else 0.0)
        y[k] = plant + noise[k]
        f, zy = sosfilt(sos, [y[k]], zi=zy)
        Y.append(f[0])
        f, zu = sosfilt(sos, [u[k - 1] if k else 0.0], zi=zu)
        U.append(f[0])
        Yf, Uf = np.array(Y)[-window - 2:], np.array(U)[-window - 2:]
        rows = np.column_stack([Yf[1:-1], (Yf[2:] - Yf[:-2]) / (2 * dt), (Yf[2:] - 2 * Yf[1:-1] + Yf[:-2]) / dt**2])
        if np.sqrt(np.sum((rows[:, 0] - rows[:, 0].mean()) ** 2) / window) >= threshold:
            c = np.linalg.lstsq(rows, Uf[1:-1], rcond=None)[0]
            # The plain solution is wanted: no bound and no pivot floor may act.
            r = np.linalg.qr(rows, mode="r")
            learned.append(np.min(np.diag(r)[1:] ** 2 / np.sum(rows[:, 1:] ** 2, axis=0)))
            assert learned[-1] > 2e-3, (k, learned[-1])
            assert 0.1 < c[0] < 10 and 0 < c[1] / c[0] < 0.5 and 0 < c[2] < 0.25, (k, c)
        coefficients[k] = c
        u[k] = c @ [x[k], v[k], a[k]]
    print("learned in", len(learned), "of", ticks, "ticks; pivots from", min(learned), "to", max(learned), "; last", c)
    save("adaptive_time_series.csv", "x,v,a,y,u,a0,a1,a2", x, v, a, y, u, coefficients)



def least_squares_weights():
    """Weight of the target i ticks old, by lstsq of the unit vectors."""
    rows = []
    for order, points, ahead in [
        (0, 2, 5.0), (0, 40, 28.672), (1, 2, 3.3), (1, 25, 14.0), (2, 3, 0.0), (2, 16, 28.672),
        (2, 40, 28.672), (3, 17, 8.0), (4, 16, 12.5), (5, 6, 2.0), (5, 200, 102.4), (5, 101, 1024.0),
    ]:
        half = (points - 1) / 2
        powers = np.arange(order + 1)
        t = (half - np.arange(points)) / half  # the newest first
        fit = np.linalg.lstsq(t[:, None] ** powers, np.eye(points), rcond=None)[0]
        w = ((half + ahead) / half) ** powers @ fit
        rows += [(order, points, ahead, i, wi) for i, wi in enumerate(w)]
    save("least_squares_weights.csv", "order,points,ahead,i,w", *np.array(rows).T)


def steepness(order, points, ahead, dt):
    """How far a unit of slope can move the command a second of delay more."""
    def weights(ticks):
        half, powers = (points - 1) / 2, np.arange(order + 1)
        t = (half - np.arange(points)) / half
        return ((half + ticks) / half) ** powers @ np.linalg.lstsq(t[:, None] ** powers, np.eye(points), rcond=None)[0]
    change = (weights(ahead + 1e-3) - weights(ahead - 1e-3)) / (2e-3 * dt)
    print("steepness", np.abs(np.cumsum(change)).sum() * dt)


def follow(p, e, q, floor, rate, dt, lo, hi, weight=1.0):
    """One tick of a parameter that follows the error, and whether a bound acted."""
    off = e * q / (q**2 + floor**2)
    bounded = np.clip(off, lo - hi, hi - lo)
    new = p + rate * dt * weight * bounded
    return np.clip(new, lo, hi), (bounded != off, new < lo, new > hi)


def synchronizing(name, predict, both, lo, hi, a_lo=0.7, a_hi=1.4):
    """A loop whose delay, and amplitude where both, follow the error.

    predict(times, targets, delay) is the command of amplitude 1; the past is 0.
    """
    rate, ticks, kappa, speed, displacement = 256.0, 900, 4.0, 0.02, 0.002
    dt = 1 / rate
    t = (np.arange(ticks) + 1) * dt
    x, v = np.zeros(ticks), np.zeros(ticks)
    for amplitude, f, phase in (0.02, 1.3, 0.3), (0.006, 3.1, 1.0):
        w = 2 * np.pi * f
        x += amplitude * (np.sin(w * t + phase) - np.sin(phase))
        v += amplitude * w * np.cos(w * t + phase)
    noise = np.random.default_rng(11).normal(scale=5e-5, size=ticks)
    noise[300], noise[500] = 40.0, -40.0  # a sensor's slips

    past = 1600
    times = np.arange(-past, ticks) * dt + dt
    targets = np.concatenate([np.zeros(past), x])
    delay, a, m = 0.010, 1.0, 0.0
    u, y, d_log, a_log = (np.zeros(ticks) for _ in range(4))
    plant, pole, acted = 0.0, np.exp(-dt / 0.009), np.zeros((2, 3), int)
    for k in range(ticks):
        # The actuator: two ticks of delay, a lag of 9 ms, gain 0.93.
        plant = pole * plant + (1 - pole) * 0.93 * (u[k - 3] if k >= 3 else 0.0)
        y[k] = plant + noise[k]
        xk, vk = (x[k - 1], v[k - 1]) if k else (0.0, 0.0)
        e = xk - y[k]
        delay, what = follow(delay, e, vk, speed, kappa, dt, lo, hi)
        acted[0] += what
        if both:
            m += dt / 0.25 * (vk**2 - m)
            a, what = follow(a, e, xk, displacement, kappa, dt, a_lo, a_hi, m / (m + speed**2))
            acted[1] += what
        n = past + k + 1
        u[k] = a * predict(times[:n], targets[:n], delay)
        d_log[k], a_log[k] = delay, a
    assert name.endswith("bounded") == bool(acted[:, 1:].any()), (name, acted)
    print(name, "ends at", delay, a, "; bounds of error, below, above:", acted.tolist())
    save(name + ".csv", "x,v,y,u,delay,amplitude", x, v, y, u, d_log, a_log)


def delay_seeking():
    c = {1: [2, -1], 3: [4, -6, 4, -1]}

    def polynomial(order):
        return lambda t, x, tau: sum(ci * np.interp(t[-1] - i * tau, t, x) for i, ci in enumerate(c[order]))

    synchronizing("delay_seeking_free", polynomial(3), False, 0.0, 0.05)
    synchronizing("delay_seeking_bounded", polynomial(1), False, 0.008, 0.014)


def least_squares_polynomial():
    def fit(order, points):
        # The time runs over the points from -1 to 1, as Polynomial.fit has it.
        return lambda t, x, tau: np.polynomial.Polynomial.fit(t[-points:], x[-points:], order)(t[-1] + tau)

    synchronizing("least_squares_delay", fit(2, 12), False, 0.0, 0.05)
    synchronizing("least_squares_both", fit(3, 17), True, 0.0, 0.05)
    synchronizing("least_squares_bounded", fit(1, 7), True, 0.008, 0.014, 0.98, 1.03)


adaptive_inverse()
adaptive_time_series()
least_squares_weights()
steepness(2, 40, 0.0101 * 1024, 1 / 1024)
delay_seeking()
least_squares_polynomial()
