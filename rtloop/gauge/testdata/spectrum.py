"""Response spectra of an analytic base motion, 5 % damping, for spectrum.json.

The base moves by s(t) = sin²(πt/8)·(10 mm·sin 2π·1.3t + 2 mm·sin 2π·4.1t) for
8 s; its acceleration is exact, the
oscillators are integrated by scipy.signal.lsim at 1/16384 s.
"""
import json

import numpy as np
import scipy
from scipy.signal import lsim


def acceleration(t):
    w, p = np.pi / 8, [(0.010, 2 * np.pi * 1.3), (0.002, 2 * np.pi * 4.1)]
    e, e1, e2 = np.sin(w * t) ** 2, w * np.sin(2 * w * t), 2 * w * w * np.cos(2 * w * t)
    g = sum(a * np.sin(q * t) for a, q in p)
    g1 = sum(a * q * np.cos(q * t) for a, q in p)
    g2 = sum(-a * q * q * np.sin(q * t) for a, q in p)
    return e2 * g + 2 * e1 * g1 + e * g2


t = np.arange(0, 8, 1 / 16384)
a = acceleration(t)
periods = [0.1 * 30 ** (i / 30) for i in range(31)]
sa = []
for period in periods:
    w = 2 * np.pi / period
    _, z, _ = lsim(([[0, 1], [-w * w, -0.1 * w]], [[0], [-1]], [[1, 0]], [[0]]), a, t)
    sa.append(w * w * np.max(np.abs(z)))

with open("spectrum.json", "w") as f:
    json.dump({"made_by": f"spectrum.py, scipy {scipy.__version__}, numpy {np.__version__}", "period": periods, "sa": sa}, f, indent=1)
