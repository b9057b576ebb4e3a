# Reference vectors for the integrators. Written with Python 3.11, NumPy 1.24.2,
# SciPy 1.10.1:  python3 vectors.py
#
# Three storeys with a spring specimen at the lowest, Rayleigh damping of 2 %
# in mode 1 and 5 % in mode 3, under a random ground acceleration that is
# linear between knots 1/64 s apart.
import numpy as np
from scipy.integrate import solve_ivp
from scipy.linalg import eigh
from scipy.signal import lsim

m, k, ke = np.array([60e3, 50e3, 40e3]), np.array([18e6, 15e6, 12e6]), 6e6
M = np.diag(m)
T = np.eye(3) - np.eye(3, k=-1)  # levels to drifts
K = T.T @ np.diag(k) @ T
b = np.array([1.0, 0, 0])
Kt = K + ke * np.outer(b, b)
w = np.sqrt(eigh(Kt, M, eigvals_only=True))
a0, a1 = np.linalg.solve([[0.5 / w[0], w[0] / 2], [0.5 / w[2], w[2] / 2]], [0.02, 0.05])
C = a0 * M + a1 * Kt

H, SUB, N = 1 / 64, 4, 129
ag = np.round(np.random.default_rng(20).normal(0, 2, N), 6)
ag[0] = 0.7  # the load at t = 0 must count
t = np.arange(N) * H


def save(name, header, *columns):
    np.savetxt(name, np.column_stack(columns), "%.17g", ",", header=header, comments="")


# Exact for a load that is linear between knots.
A = np.block([[np.zeros((3, 3)), np.eye(3)], [-np.linalg.solve(M, Kt), -np.linalg.solve(M, C)]])
B = np.concatenate([np.zeros(3), -np.ones(3)])[:, None]
quiet = np.r_[0, ag[1:]]  # the same, but with no load at t = 0
exact, begun = (lsim((A, B, np.eye(6), np.zeros((6, 1))), u, t, interp=True)[2] for u in (ag, quiet))

# The textbook recurrences, four steps to a knot.
dt = H / SUB
fine = np.interp(np.arange((N - 1) * SUB + 1) * dt, t, ag)


def load(ug, x):
    return -M @ np.ones(3) * ug - b * ke * (b @ x)


def newmark():
    x, v = np.zeros(3), np.zeros(3)
    a = np.linalg.solve(M, load(fine[0], x))
    out = [np.r_[x, v, a]]
    for ug in fine[1:]:
        x = x + dt * v + dt**2 / 2 * a
        an = np.linalg.solve(M + dt / 2 * C, load(ug, x) - K @ x - C @ (v + dt / 2 * a))
        v, a = v + dt / 2 * (a + an), an
        out.append(np.r_[x, v, a])
    return np.array(out)[::SUB]


def chen_ricles():
    alpha = 4 * np.linalg.solve(4 * M + 2 * dt * C + dt**2 * Kt, M)
    x, v = np.zeros(3), np.zeros(3)
    a = np.linalg.solve(M, load(fine[0], x))
    out = [np.r_[x, v, a]]
    for ug in fine[1:]:
        x, v = x + dt * v + dt**2 * alpha @ a, v + dt * alpha @ a
        a = np.linalg.solve(M, load(ug, x) - C @ v - K @ x)
        out.append(np.r_[x, v, a])
    return np.array(out)[::SUB]


names = lambda p: [f"{p}.{q}{i}" for q in "xva" for i in (1, 2, 3)]
header = ["ground_m_s2"] + names("exact")[:3] + names("quiet")[:3] + names("newmark") + names("cr")
save("three_storeys.csv", ",".join(header), ag, exact[:, :3], begun[:, :3], newmark(), chen_ricles())

# Two storeys, the lower yields: Bouc-Wen with exponent 1 and beta = gamma = 1/2,
#   force k (h d + (1-h) yd z),  dz/dt = (dd/dt) (1 - |z| (sgn(z dd/dt)/2 + 1/2)) / yd,
# and dissipated energy (1-h) k yd * integral of (z dd - yd z dz), the work of the
# hysteretic part less what its spring k (1-h) yd^2 z^2 / 2 holds. Dashpots in both.
m, k, c, yd, h = np.array([60e3, 50e3]), np.array([18e6, 15e6]), np.array([100e3, 80e3]), 0.006, 0.05


def rate(s, time):
    d, dv = np.array([s[0], s[1] - s[0]]), np.array([s[2], s[3] - s[2]])
    z = s[4]
    dz = dv[0] * (1 - abs(z) * (0.5 * np.sign(z * dv[0]) + 0.5)) / yd
    q = np.array([k[0] * (h * d[0] + (1 - h) * yd * z), k[1] * d[1]]) + c * dv
    f = np.array([q[0] - q[1], q[1]])
    return np.r_[s[2:4], -f / m - np.interp(time, t, quiet), dz, (1 - h) * k[0] * yd * z * (dv[0] - yd * dz)]


s, rows = np.zeros(6), [np.zeros(6)]
for i in range(N - 1):  # knot by knot, so that the solver never steps over one
    s = solve_ivp(lambda u, s: rate(s, u), (t[i], t[i + 1]), s, "DOP853", rtol=1e-11, atol=1e-14, max_step=H / 64).y[:, -1]
    rows.append(s)
rows = np.array(rows)
save("yielding.csv", "ground_m_s2,x1,x2,v1,v2,z,dissipated_J", quiet, rows)
