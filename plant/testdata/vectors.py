"""Reference vectors for the tests of this directory's parent.

Run with SciPy: python3 vectors.py. It writes lagdelay.json and boucwen.json
here, each with the library versions that made it.
"""
import json
import numpy as np
import scipy
from scipy.integrate import solve_ivp
from scipy.linalg import expm

MADE = f"SciPy {scipy.__version__}, NumPy {np.__version__}"


def write(name, cases):
    with open(name, "w") as f:
        json.dump({"made": MADE, "cases": cases}, f, indent=0)


# T y' + y = g u(t - tau), from rest at zero: between all instants where the
# delayed input has a knot, the state (y, u, slope) goes by a matrix exponential.
def lag_delay(hold, h, tau, T, g, u):
    knots = np.concatenate(([0.0], u))  # at t = 0, h, 2h, ...

    def piece(k):  # value at the start and slope of the command in tick k
        if k < 0:
            return 0.0, 0.0
        if hold == "step":
            return u[k], 0.0
        return knots[k], (knots[k + 1] - knots[k]) / h

    n = int(np.floor(tau / h + 1e-9))
    lead = max(tau - n * h, 0.0)  # from the tick's start to the knot
    if lead < 1e-9 * h:
        lead = 0.0
    y, ys, vs = 0.0, [], []
    for k in range(len(u)):
        for source, d, into in ((k - n - 1, lead, h - lead), (k - n, h - lead, 0.0)):
            if d == 0:
                continue
            value, slope = piece(source)
            a = value + slope * into
            b = a + slope * d
            if T == 0:
                y, v = g * b, g * slope
            else:
                A = np.array([[-1 / T, g / T, 0], [0, 0, 1], [0, 0, 0]])
                y = (expm(A * d) @ [y, a, slope])[0]
                v = (g * b - y) / T
        ys.append(y)
        vs.append(v)
    return ys, vs


h = 1 / 2048
rng = np.random.default_rng(1)
u = np.cumsum(rng.normal(0, 1e-3, 80))
cases = []
for name, tau, T, g in [
    ("lag alone", 0, 6e-3, 1),
    ("8 ms behind 6 ms", 8e-3, 6e-3, 1),
    ("half a tick", 0.5 * h, 2e-3, 1.3),
    ("whole ticks", 3 * h, 4e-3, 0.9),
    ("just behind the tick", 2 * h + 1e-6 * h, 1e-3, 1),
    ("just before the tick", 3 * h - 1e-6 * h, 1e-3, 1),
    ("no lag, 0.3 of a tick", 4.3 * h, 0, 1.1),
    ("lag a thousandth of a tick", 1.7 * h, h / 1000, 1),
    ("lag of a second", 1.25 * h, 1, 1),
    ("delay of half a second in 40 ms of motion", 0.5, 1e-2, 1),
    ("delay of 60 ticks and some", 60.4 * h, 1e-2, 1),
]:
    for hold in ("ramp", "step"):
        y, v = lag_delay(hold, h, tau, T, g, u)
        if T == 0 and hold == "step":  # mean velocity over the tick
            v = list(np.diff(np.concatenate(([0], y))) / h)
        cases.append(dict(name=name, hold=hold, tick=h, delay=tau, lag=T, gain=g, u=list(u), y=y, v=v))
write("lagdelay.json", cases)


# y_d dz/dy = 1 - |z|^n (gamma + beta sgn(dy z)), straight from each
# displacement of the path to the next, with y_d = 1; stops at z = 0, where the
# right-hand side has a kink.
def bouc_wen(n, beta, path):
    gamma = 1 - beta
    z, zs = 0.0, []
    for y0, y1 in zip(np.concatenate(([0], path[:-1])), path):
        s = np.sign(y1 - y0)
        left = abs(y1 - y0)
        while left > 0:
            coming = z * s < 0
            c = gamma - beta if coming else gamma + beta

            def zero(x, zeta):
                return zeta[0]

            zero.terminal, zero.direction = coming, 1
            r = solve_ivp(lambda x, zeta: 1 - c * abs(zeta) ** n, (0, left), [z * s],
                          method="DOP853", rtol=1e-13, atol=1e-15, events=zero if coming else None)
            z = r.y[0, -1] * s
            left -= r.t[-1]
            if coming and r.status == 1:
                z = 0.0
        zs.append(z)
    return zs


turn = np.arange(0, 2 * np.pi * 2.5, 2 * np.pi / 160)[1:]
fine = 3 * np.sin(turn) * (0.4 + turn / 15)  # moves of a tick: up to 0.17 y_d
coarse = np.array([0.4, 2.5, -1, -1.2, 6, 5.5, 5.9, -9, 300, 298.5, 298.9, -20, -19])
cases = []
for n, beta in [(1, 0.5), (1, 0.3), (1, 0.8), (1, 1), (1.2, 0.6), (2, 0.5), (2, 1), (3.5, 0.5),
                (3.5, 0.3), (8, 0.5), (20, 0.5)]:
    for name, path in (("fine", fine), ("coarse", coarse)):
        cases.append(dict(name=name, n=n, beta=beta, y=list(path), z=bouc_wen(n, beta, path)))
write("boucwen.json", cases)
