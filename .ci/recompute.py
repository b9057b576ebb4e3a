#!/usr/bin/env python3
"""Recompute a log with other code: measured and force from command (lag-delay
actuator; spring, viscous and bouc-wen specimens), command from target (none,
polynomial, inverse), and target from force and ground (CR; storeys, hysteretic
ones too, or matrices), each by itself from the logged columns, and print the
largest difference over the peak.

usage: recompute.py LOG.csv     (LOG.csv.toml, its provenance, beside it)

The scenario must have perfect sensors; fails above 1e-9. Needs NumPy.
"""
import sys
import tomllib

import numpy as np
from math import comb


def si(text):
    """The number of a provenance file is in SI: '0.008 s'."""
    return float(str(text).split()[0])


def actuator(c, u, dt):
    """T·y' + y = g·u(t − τ), u straight between ticks, solved from knot to knot."""
    T, tau, g = si(c["lag"]), si(c["delay"]), c["gain"]
    n = len(u)
    t = np.arange(n) * dt
    # Every instant at which the delayed input has a corner, or a value is wanted.
    knots = np.unique(np.concatenate([t, t + (tau - dt * np.floor(tau / dt))]))
    knots = knots[knots <= t[-1]]
    w = np.interp(knots - tau, t, u)  # before the start: the first value
    if T == 0:
        y = g * w
    else:
        y = np.empty(len(knots))
        y[0] = g * w[0]
        for i in range(len(knots) - 1):
            d = knots[i + 1] - knots[i]
            s = (w[i + 1] - w[i]) / d
            y[i + 1] = g * (w[i + 1] - s * T) + (y[i] - g * (w[i] - s * T)) * np.exp(-d / T)
    at = np.searchsorted(knots, t)
    v = (g * w[at] - y[at]) / T if T else np.gradient(y[at], dt)
    return y[at], v


class Hysteresis:
    """Bouc-Wen, n = 1, β = γ = ½: z relaxes towards ±1 while loading and moves
    straight back while unloading."""

    def __init__(self, q):
        self.k, self.yd, self.h = si(q["stiffness"]), si(q["yield_displacement"]), q["hardening"]
        assert q.get("n", 1) == 1 and q.get("beta", 0.5) == 0.5
        self.d = self.z = 0.0

    def force(self, d):
        s, sign = abs(d - self.d) / self.yd, np.sign(d - self.d)
        z = self.z * sign
        if z < 0:
            back = min(s, -z)
            z, s = z + back, s - back
        if s > 0:
            z = 1 - (1 - z) * np.exp(-s)
        self.d, self.z = d, z * sign
        return self.k * (self.h * d + (1 - self.h) * self.yd * self.z)


def specimens(elements, y, v):
    f = np.zeros(len(y))
    for e in elements:
        if e["kind"] == "spring":
            f += si(e["stiffness"]) * y
        elif e["kind"] == "viscous":
            c = si(e["damping"]) if "damping" in e else si(e["force"]) / si(e["speed"]) ** e["exponent"]
            f += c * np.abs(v) ** e.get("exponent", 1) * np.sign(v)
        elif e["kind"] == "bouc-wen":
            h = Hysteresis(e)
            f += np.array([h.force(d) for d in y])
        else:
            sys.exit(f"{e['kind']}: not recomputed here")
    return f


def compensator(c, x, dt):
    t = np.arange(len(x)) * dt
    if c["kind"] == "none":
        return x
    tau = si(c["delay"])
    if c["kind"] == "polynomial":
        n = c["order"]
        return sum((-1) ** i * comb(n + 1, i + 1) * np.interp(t - i * tau, t, x) for i in range(n + 1))
    if c["kind"] == "inverse":
        a = 1 + tau / dt
        return a * x - (a - 1) * np.concatenate([x[:1], x[:-1]])
    sys.exit(f"{c['kind']}: not recomputed here")


def structure(s, channels):
    """M, C, K of the numerical part, K of the whole, and the b of each channel."""
    sub = s["substructure"]
    if "storey" in sub:
        m = np.diag([si(q["mass"]) for q in sub["storey"]])
        n = len(m)
        k = np.zeros((n, n))
        for i, q in enumerate(sub["storey"]):
            b = np.zeros(n)
            b[i] = 1
            if i:
                b[i - 1] = -1
            k += si(q["stiffness"]) * np.outer(b, b)
    else:
        m = np.array([[si(v) for v in row] for row in sub["mass_matrix"]])
        k = np.array([[si(v) for v in row] for row in sub["stiffness_matrix"]])
        n = len(m)
    total, bs, yielding = k.copy(), [], []
    for i, q in enumerate(sub.get("storey", [])):
        if "yield_displacement" in q:
            b = np.zeros(n)
            b[i] = 1
            if i:
                b[i - 1] = -1
            k -= si(q["stiffness"]) * np.outer(b, b)
            yielding.append((b, Hysteresis(q)))
    for c in channels:
        b = np.zeros(n)
        for level, sign in zip(c["between"], (-1, 1)):
            if level:
                b[level - 1] += sign
        bs.append(b)
        for e in c["specimen"]:
            if "stiffness" in e:
                total += si(e["stiffness"]) * np.outer(b, b)
    ratios = sub["damping_ratio"]
    w = np.sqrt(np.sort(np.linalg.eigvals(np.linalg.solve(m, total)).real))
    if n == 1:
        cd = 2 * ratios[0] * w[0] * m
    else:
        a = np.linalg.solve([[1 / (2 * w[0]), w[0] / 2], [1 / (2 * w[-1]), w[-1] / 2]], [ratios[0], ratios[-1]])
        cd = a[0] * m + a[1] * total
    return m, cd, k, total, bs, yielding


def targets(s, channels, ground, forces, dt):
    m, c, k, total, bs, yielding = structure(s, channels)
    assert s["substructure"]["integrator"] == "CR"
    alpha = 4 * np.linalg.solve(4 * m + 2 * dt * c + dt * dt * total, m)
    n, out = len(m), []
    x, v = np.zeros(n), np.zeros(n)
    iota = np.ones(n)
    for q in range(len(ground)):
        out.append([b @ x for b in bs])
        load = -m @ iota * ground[q] - sum(b * f[q] for b, f in zip(bs, forces)) - c @ v - k @ x
        for b, h in yielding:
            load -= b * h.force(b @ x)
        a = np.linalg.solve(m, load)
        x = x + dt * v + dt * dt * alpha @ a
        v = v + dt * alpha @ a
    return np.array(out).T


def main(path):
    with open(path + ".toml", "rb") as f:
        s = tomllib.load(f)
    log = np.genfromtxt(path, delimiter=",", names=True, deletechars="", replace_space=" ")
    dt = 1 / si(s["loop"]["rate"])
    assert s["loop"]["slowdown"] == 1 and s["loop"]["hold"] == "ramp"
    channels = s["channel"]
    col = lambda c, what: log[f"{c['name']}.{what}"]
    worst = 0.0
    x = targets(s, channels, log["ground_m_s2"], [col(c, "force_N") for c in channels], dt)
    for j, c in enumerate(channels):
        y, v = actuator(c["actuator"], col(c, "command_m"), dt)
        for what, got in [
            ("measured from command", (col(c, "measured_m"), y)),
            ("force from command", (col(c, "force_N"), specimens(c["specimen"], y, v))),
            ("command from target", (col(c, "command_m"), compensator(c["compensator"], col(c, "target_m"), dt))),
            ("target from force and ground", (col(c, "target_m"), x[j])),
        ]:
            diff = np.max(np.abs(got[0] - got[1])) / np.max(np.abs(got[0]))
            worst = max(worst, diff)
            print(f"{c['name']}: {what}: {diff:.2e} of the peak, {len(x[j])} rows")
    if not worst <= 1e-9:
        sys.exit(f"{path}: {worst:.3g} of the peak is more than 1e-9")


main(sys.argv[1])
