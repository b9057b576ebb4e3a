# Writes the made-up record shake.txt, with an offset and a drift, and the
# displacements that SciPy makes of it. Run as: /usr/bin/python3 displacement.py
import json, sys
import numpy as np, scipy
from scipy.integrate import cumulative_trapezoid
from scipy.interpolate import PPoly
from scipy.signal import butter, detrend, sosfilt, sosfiltfilt

rng = np.random.default_rng(3)
dt, n = 0.02, 700
t = np.arange(n) * dt
a = sosfilt(butter(2, [0.3, 9], "bandpass", fs=1 / dt, output="sos"), rng.standard_normal(n))
a *= 4 * (t / 3) ** 2 * np.exp(-t / 1.5) + 0.3
a += 0.05 - 0.012 * t
a = np.round(a, 5)
open("shake.txt", "w").write("".join("%.5f\n" % x for x in a))

def twice(a, h):
    """v by the trapezoid rule; x exact for an acceleration linear between samples."""
    v = cumulative_trapezoid(a, dx=h, initial=0)
    return cumulative_trapezoid(v, dx=h, initial=0) - h * h * (a - a[0]) / 12, v

def take_up(seg, h, dv, dx):
    """Adds p·f + q·g so that velocity and displacement at the end grow by dv, dx."""
    tau = np.linspace(0, 1, len(seg))
    f, g = tau * (1 - tau), tau * (1 - tau) * (1 - 2 * tau)
    (xf, vf), (xg, vg) = twice(f, h), twice(g, h)
    p, q = np.linalg.solve([[vf[-1], vg[-1]], [xf[-1], xg[-1]]], [dv, dx])
    return seg + p * f + q * g

def corrected(a, h, corner):
    pad = int(np.ceil(1.5 * 4 / (corner * h)))
    b = np.pad(detrend(a, type="linear"), pad)
    # From rest: the padding is of zeros, so no start-up values are needed.
    b = sosfiltfilt(butter(4, corner, "highpass", fs=1 / h, output="sos"), b, padtype=None)
    x, v = twice(b[: pad + 1], h)
    a = b[pad:-pad].copy()
    m = min((len(a) - 1) // 2, int(1 / (corner * h)))
    a[: m + 1] = take_up(a[: m + 1], h, v[-1], x[-1] + v[-1] * h * m)
    x, v = twice(a, h)
    a[-1 - m :] = take_up(a[-1 - m :], h, -v[-1], -x[-1])
    return a

def case(corner, first, last, factor, step, count):
    c = corrected(a[first : last + 1], dt, corner)
    h = dt * np.sqrt(factor)
    knots = np.arange(len(c)) * h
    x = PPoly(np.array([np.diff(c) / h, c[:-1]]), knots).antiderivative(2)
    at = np.arange(count) * step
    return {"corner": corner, "start": first * dt, "end": last * dt, "factor": factor, "step": step,
            "acceleration": c[::7].tolist(), "want": np.where(at < knots[-1], x(at), 0).tolist()}

cases = [
    case(0.1, 0, n - 1, 1, 0.031, 460),
    case(0.25, 0, n - 1, 1, 0.0107, 1320),
    case(0.5, 60, 410, 0.25, 0.0107, 350),
    case(0.1, 17, 600, 0.1, 0.009, 430),
    case(2.5, 100, 115, 1, 0.003, 120),
]
json.dump({"numpy": np.__version__, "scipy": scipy.__version__, "python": sys.version.split()[0], "cases": cases},
          open("displacement.json", "w"), indent=0)
