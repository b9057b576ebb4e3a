"""Reference gauges of broadband signals, by NumPy and SciPy.

python3 vectors.py > vectors.json        (NumPy 1.24.2, SciPy 1.10.1)

Each case: a target of band-limited noise and drift; measured is the target
through a first-order lag, late or early by a fractional number of ticks (a phase
ramp on the spectrum), with a gain, an offset and sensor noise. Sample 0 is the
start; the record is what follows.
"""
import json

import numpy as np
from scipy import signal


def make(n, rate, band, delay, gain, lag, noise, seed):
    rng = np.random.default_rng(seed)
    white = rng.standard_normal(n + 1)
    sos = signal.butter(4, band, "bandpass", fs=rate, output="sos")
    x = signal.sosfilt(sos, white)
    x = 0.05 * x / np.max(np.abs(x)) + 0.004 * np.linspace(0, 1, n + 1)
    m = 2 * len(x)
    f = np.fft.rfftfreq(m, 1 / rate)
    g = gain * np.exp(-2j * np.pi * f * delay) / (1 + 2j * np.pi * f * lag)
    y = np.fft.irfft(g * np.fft.rfft(x, m), m)[: len(x)]
    y += 0.0007 + noise * rng.standard_normal(len(x))
    return x.round(9), y.round(9)


def correlation_delay(x, y, rate):
    x, y, n = x - x.mean(), y - y.mean(), len(x)
    most = int(min(0.5 * rate, n // 4))
    lags = signal.correlation_lags(n, n)
    raw = signal.correlate(y, x, mode="full", method="direct")
    raw = dict(zip(lags, raw))
    start = max(range(-most, most + 1), key=lambda l: raw[l])

    def rho(l):
        a, b = (x[: n - l], y[l:]) if l >= 0 else (x[-l:], y[: n + l])
        return np.corrcoef(a, b)[0, 1]

    l = max(range(start - 60, start + 61), key=rho)
    a, b, c = rho(l - 1), rho(l), rho(l + 1)
    return (l + (a - c) / (2 * (a - 2 * b + c))) / rate


def fei(x, y, n, rate):
    X, Y = np.fft.rfft(x[-n:])[1:], np.fft.rfft(y[-n:])[1:]
    f = np.fft.rfftfreq(n, 1 / rate)[1:]
    power = np.sum(np.abs(X) ** 2)
    index = np.sum(Y * np.conj(X)) / power
    feq = np.sum(f * np.abs(X) ** 2) / power
    return abs(index), -np.angle(index) / (2 * np.pi * feq), feq


def case(name, n, rate, band, delay, gain, lag, noise, seed, smooth, window):
    x, y = make(n, rate, band, delay, gain, lag, noise, seed)
    amplitude, fei_delay, feq = fei(x[1:], y[1:], smooth, rate)
    value, vector = np.linalg.eigh(np.cov(x[-window:], y[-window:], bias=True))
    tilt = np.arctan2(vector[1, 1], vector[0, 1])
    tilt = (tilt + np.pi / 2) % np.pi - np.pi / 2
    return {
        "name": name, "rate": rate, "window": window,
        "x": x.tolist(), "y": y.tolist(),
        "nrmse": np.sqrt(np.mean((x - y) ** 2) / np.mean(x**2)),
        "amplitude_ratio": np.sqrt(np.mean(y**2) / np.mean(x**2)),
        "peak_error": np.max(np.abs(x - y)), "peak_target": np.max(np.abs(x)),
        "indicator": 0.5 * np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]),
        "center": [x[-window:].mean(), y[-window:].mean()],
        "axes": np.sqrt(2 * value[::-1]).tolist(), "tilt": tilt,
        "window_ratio": np.std(y[-window:]) / np.std(x[-window:]),
        "delay": correlation_delay(x[1:], y[1:], rate),
        "fei": [amplitude, fei_delay, feq],
    }


print(json.dumps([
    case("late", 2048, 1024.0, [0.5, 12], 0.0137, 0.96, 0.006, 1e-5, 1, 2048, 700),
    case("early", 2000, 1000.0, [0.5, 8], -0.0063, 1.05, 0.0, 2e-5, 2, 2000, 512),
    case("prime length", 1999, 1024.0, [0.5, 30], 0.0041, 1.0, 0.003, 1e-5, 3, 1980, 999),
    case("fast motion", 1500, 256.0, [5, 60], 0.0211, 0.9, 0.001, 1e-4, 4, 1500, 300),
    case("slow motion, noisy", 2400, 512.0, [0.2, 1.5], 0.0333, 1.0, 0.01, 5e-4, 5, 2400, 1200),
]))
