# Writes impulse responses of SciPy's digital Butterworth band-pass and the
# autocovariance of white noise behind it. Run as: /usr/bin/python3 bandpass.py
import json, sys
import numpy as np, scipy
from scipy.signal import butter, sosfilt

def case(low, high, rate, memory):
    sos = butter(8, [low, high], "bandpass", fs=rate, output="sos")
    impulse = np.zeros(memory)
    impulse[0] = 1
    h = sosfilt(sos, impulse)
    r = [float(np.dot(h[: memory - k], h[k:])) for k in range(6)]
    return {"low": low, "high": high, "rate": rate, "impulse": h[:300].tolist(), "covariance": r,
            "left": float(np.abs(h[-memory // 10 :]).max() / np.abs(h).max())}

cases = [case(0.5, 8, 128, 20000), case(5, 6, 96, 20000), case(2, 2.1, 33.6, 100000), case(0.05, 50, 800, 2000000)]
json.dump({"numpy": np.__version__, "scipy": scipy.__version__, "python": sys.version.split()[0], "cases": cases},
          open("bandpass.json", "w"), indent=0)
