# Spectra, frequency response and coherence by SciPy, for welch_test.go.
# Run: /usr/bin/python3 vectors.py   (it writes welch.json beside itself)
import json, os, sys
import numpy, scipy
from scipy import signal

rng = numpy.random.default_rng(20)
cases = []
for n, segment, tick in [(1000, 256, 1 / 512), (777, 101, 0.004), (600, 600, 1 / 2048), (513, 64, 0.01)]:
    x = numpy.cumsum(rng.standard_normal(n)) * 1e-3 + 0.02
    y = 0.9 * signal.lfilter([0.3], [1, -0.7], x) + 1e-3 * rng.standard_normal(n)
    # window, overlap and detrending as they are by default: Hann, half, constant
    o = dict(fs=1 / tick, nperseg=segment)
    f, xx = signal.welch(x, **o)
    _, yy = signal.welch(y, **o)
    _, xy = signal.csd(x, y, **o)
    _, c = signal.coherence(x, y, **o)
    h = xy / xx
    cases.append(dict(tick=tick, segment=segment, x=x.tolist(), y=y.tolist(), hz=f.tolist(), xx=xx.tolist(), yy=yy.tolist(),
                      xy_re=xy.real.tolist(), xy_im=xy.imag.tolist(), h_re=h.real.tolist(), h_im=h.imag.tolist(), coherence=c.tolist()))
here = os.path.dirname(os.path.abspath(sys.argv[0]))
with open(os.path.join(here, "welch.json"), "w") as out:
    json.dump(dict(versions=f"NumPy {numpy.__version__}, SciPy {scipy.__version__}", cases=cases), out)
