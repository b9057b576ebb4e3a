#!/usr/bin/python3
"""Vectors for the tests of package study: run in this directory.

Quantiles of the two laws, the discrepancy of Latin hypercubes, and limits of
confidence for a share.
"""
import json
import sys

import numpy as np
import scipy
from scipy import stats
from scipy.stats import qmc

u = np.array([1e-6, 0.001, 0.025, 0.1, 0.25, 0.5, 0.6, 0.8413, 0.975, 0.999, 1 - 1e-6])
low, high = 6.4e-3, 9.6e-3
mid, sigma = (low + high) / 2, (high - low) / 6

n, d = 256, 3
rng = np.random.default_rng(1)
sample = rng.random((16, d))
latin = [qmc.discrepancy(qmc.LatinHypercube(d, seed=s).random(n)) for s in range(300)]
loose = [qmc.discrepancy(np.random.default_rng(s).random((n, d))) for s in range(300)]

shares = [(1, 1), (10, 10), (0, 10), (5, 10), (998, 1000), (164, 300), (99999, 100000)]

json.dump({
    "versions": {"python": sys.version.split()[0], "numpy": np.__version__, "scipy": scipy.__version__},
    "low": low, "high": high, "u": u.tolist(),
    "uniform": stats.uniform(low, high - low).ppf(u).tolist(),
    "normal": stats.truncnorm(-3, 3, mid, sigma).ppf(u).tolist(),
    "sample": sample.tolist(), "sample_discrepancy": qmc.discrepancy(sample),
    "n": n, "d": d,
    "latin": [min(latin), float(np.mean(latin)), max(latin)],
    "independent": [min(loose), float(np.mean(loose)), max(loose)],
    "shares": [[k, m, 0.0 if k == 0 else stats.beta.ppf(0.05, k, m - k + 1)] for k, m in shares],
}, open("vectors.json", "w"), indent=1)
