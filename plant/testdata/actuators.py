"""Reference vectors for the actuators with an inertia of their own.

Run with SciPy: python3 actuators.py. It writes secondorder.json and
servohydraulic.json here, each with the library versions that made it.
"""
import json
import numpy as np
import scipy
from scipy.integrate import solve_ivp
from scipy.signal import lsim

MADE = f"SciPy {scipy.__version__}, NumPy {np.__version__}"


def write(name, cases):
    with open(name, "w") as f:
        json.dump({"made": MADE, "cases": cases}, f, indent=0)


def pieces(hold, h, tau, u):
    """The delayed command, tick by tick: (duration, from, to) up to the knot and behind it."""
    n = int(np.floor(tau / h + 1e-9))
    lead = max(tau - n * h, 0.0)
    if lead < 1e-9 * h:
        lead = 0.0
    knots = np.concatenate(([0.0], u))  # at t = 0, h, 2h, ...

    def at(k, s):  # the command at the fraction s of tick k
        if k < 0:
            return 0.0
        return u[k] if hold == "step" else knots[k] + (knots[k + 1] - knots[k]) * s

    cut = 1 - lead / h
    for k in range(len(u)):
        yield [(d, at(j, s0), at(j, s1)) for d, j, s0, s1 in
               ((lead, k - n - 1, cut, 1), (h - lead, k - n, 0, cut)) if d > 0]


# y'' + 2 zeta w y' + w^2 y = w^2 g u(t - tau), from rest at zero.
def second_order(hold, h, tau, hz, zeta, g, u):
    w = 2 * np.pi * hz
    system = ([[0, 1], [-w * w, -2 * zeta * w]], [[0], [g * w * w]], np.eye(2), np.zeros((2, 1)))
    x, ys, vs = np.zeros(2), [], []
    for tick in pieces(hold, h, tau, u):
        for d, a, b in tick:
            x = lsim(system, U=[a, b], T=[0, d], X0=x)[2][-1]
        ys.append(x[0])
        vs.append(x[1])
    return ys, vs


h = 1 / 2048
rng = np.random.default_rng(2)
u = np.cumsum(rng.normal(0, 1e-3, 60))
cases = []
for name, tau, hz, zeta, g in [
    ("25 Hz", 0, 25, 0.7, 1),
    ("ringing, 8.3 ms", 8.3e-3, 40, 0.1, 1.2),
    ("critically damped, half a tick", 0.5 * h, 30, 1, 0.9),
    ("creeping", 3 * h, 10, 5, 1),
    ("just before the tick", 3 * h - 1e-6 * h, 60, 0.5, 1),
    ("faster than the ticks", 1.3 * h, 5000, 0.6, 1),
    ("slower than the record", 2.7 * h, 0.5, 0.8, 1),
]:
    for hold in ("ramp", "step"):
        y, v = second_order(hold, h, tau, hz, zeta, g, u)
        cases.append(dict(name=name, hold=hold, tick=h, delay=tau, frequency=hz, damping_ratio=zeta, gain=g,
                          u=list(u), y=y, v=v))
write("secondorder.json", cases)

# The servo-hydraulic actuator, with a spring k, a dashpot c and a mass m_e as
# specimen. State: x, x'/w_v, p/MPa, y, v, integral.
DEFAULT = dict(supply_pressure=21e6, rated_flow=250e-3 / 60, piston_area=12.5e-3, chamber_volume=4e-3,
               bulk_modulus=1e9, leakage=1e-11, piston_mass=100.0, friction=1e3, valve_frequency=80.0,
               valve_damping=0.8, kp=175.0, ki=200.0, kd=0.0, kdp=1e-9, delay=1e-3)


def servo(h, u, k, c, m_e, given):
    s = DEFAULT | given
    w = 2 * np.pi * s["valve_frequency"]
    mass = s["piston_mass"] + m_e
    supply, area = s["supply_pressure"], s["piston_area"]

    def slope(t, z, a, rate):
        x, xd, p, y, v, i = z
        p *= 1e6
        error = a + rate * t - y
        want = s["kp"] * error + i - s["kd"] * v - s["kdp"] * p
        e = min(1, max(-1, want))
        wound = want > 1 and error > 0 or want < -1 and error < 0
        q = s["rated_flow"] * x * np.sqrt(max(0, supply - np.sign(x) * p) / 7e6)
        dp = 4 * s["bulk_modulus"] / s["chamber_volume"] * (q - area * v - s["leakage"] * p)
        seal = s["friction"] * max(-1, min(1, v / 1e-3))
        return [w * xd, w * (e - x) - 2 * s["valve_damping"] * w * xd, dp / 1e6, v,
                (area * p - k * y - c * v - seal) / mass, 0 if wound else s["ki"] * error]

    z, rows = np.zeros(6), []
    for tick in pieces("ramp", h, s["delay"], u):
        for d, a, b in tick:
            r = solve_ivp(slope, (0, d), z, method="DOP853", rtol=1e-10, atol=1e-13, args=(a, (b - a) / d))
            assert r.success
            z = r.y[:, -1]
        rows.append([z[3], z[4], z[2] * 1e6, z[0]])
    return np.array(rows)


ticks = 256
t = h * np.arange(1, ticks + 1)
sine = 0.01 * np.sin(2 * np.pi * 4 * t)
step = np.full(ticks, 0.002)
EVERY = 4
cases = []
for name, u, k, c, m_e, given in [
    ("sine, free", sine, 0, 0, 0, {}),
    ("sine, spring", sine, 1e7, 0, 0, {}),
    ("sine, spring, dashpot and mass", sine, 5e6, 1e5, 300, {}),
    ("step, free", step, 0, 0, 0, {}),
    ("step, spring", step, 1e7, 0, 0, {}),
    ("step, every gain, no friction", step, 5e6, 0, 0, dict(kd=0.05, kdp=3e-9, friction=0.0, ki=500.0, delay=0.0)),
    ("long step, valve saturates", 10 * step, 5e6, 0, 0, dict(valve_damping=1.0, friction=0.0)),
]:
    rows = servo(h, u, k, c, m_e, given)[EVERY - 1::EVERY]
    cases.append(dict(name=name, tick=h, stiffness=k, damping=c, mass=m_e, given=given, every=EVERY, u=list(u),
                      y=list(rows[:, 0]), v=list(rows[:, 1]), p=list(rows[:, 2]), x=list(rows[:, 3])))
write("servohydraulic.json", cases)
