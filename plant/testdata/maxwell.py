"""Reference vectors for the Maxwell element with a power-law damper.

Run with SciPy: python3 maxwell.py. It writes maxwell.json here, with the
library versions that made it.
"""
import json
import numpy as np
import scipy
from scipy.integrate import solve_ivp

# f' = k (w - u), u = (|f|/c)^(1/alpha) sgn f, w constant in a tick, from rest;
# c = 1. For alpha > 1 the right-hand side has an infinite slope at f = 0, which
# an implicit solver passes.
def maxwell(alpha, k, tick, path):
    f, fs = 0.0, []
    for y0, y1 in zip(np.concatenate(([0], path[:-1])), path):
        w = (y1 - y0) / tick
        r = solve_ivp(lambda t, g: k * (w - abs(g) ** (1 / alpha) * np.sign(g)), (0, tick), [f],
                      method="Radau" if alpha > 1 else "DOP853", rtol=1e-9, atol=1e-12)
        assert r.success
        f = r.y[0, -1]
        fs.append(f)
    return fs


cases = []
for alpha in (0.1, 0.3, 0.5, 0.8, 1.0, 1.4, 2.0):
    for k in (3.0, 30.0):  # at 1 rad/s: resolved, and stiff against the damper
        for count in (100, 200, 400):
            t = 2 * np.pi * np.arange(1, 2 * count + 1) / count
            path = np.sin(t) * (1 - np.exp(-t))
            force = maxwell(alpha, k, 2 * np.pi / count, path)
            cases.append(dict(alpha=alpha, k=k, count=count, f=force[count // 20 - 1::count // 20]))
with open("maxwell.json", "w") as f:
    json.dump({"made": f"SciPy {scipy.__version__}, NumPy {np.__version__}", "cases": cases}, f, indent=0)
