# Reference vectors for the integrators that weight the equation of motion
# between two ticks. Written with Python 3.11, NumPy 1.24.2, SciPy 1.10.1:
#   python3 weighted.py
import csv
import numpy as np
from scipy.linalg import eigh, eigvals

# The three storeys of vectors.py and their motion, four steps to a knot.
m, k, ke = np.array([60e3, 50e3, 40e3]), np.array([18e6, 15e6, 12e6]), 6e6
M = np.diag(m)
T = np.eye(3) - np.eye(3, k=-1)
K = T.T @ np.diag(k) @ T
b = np.array([1.0, 0, 0])
Kt = K + ke * np.outer(b, b)
w = np.sqrt(eigh(Kt, M, eigvals_only=True))
a0, a1 = np.linalg.solve([[0.5 / w[0], w[0] / 2], [0.5 / w[2], w[2] / 2]], [0.02, 0.05])
C = a0 * M + a1 * Kt
ag = np.array([float(r["ground_m_s2"]) for r in csv.DictReader(open("three_storeys.csv"))])
SUB, dt = 4, 1 / 256
fine = np.interp(np.arange((len(ag) - 1) * SUB + 1) / SUB, np.arange(len(ag)), ag)
ground = -M @ np.ones(3)


def kolay_ricles(rho):  # as printed: matrices alpha1, alpha2, alpha3, weighted vectors
    am, af = (2 * rho - 1) / (rho + 1), rho / (rho + 1)
    g = 0.5 - am + af
    be = (0.5 + g) ** 2 / 4
    D = M + g * dt * C + be * dt**2 * Kt
    A1 = np.linalg.solve(D, M)
    A2 = (0.5 + g) * A1
    A3 = np.linalg.solve(D, am * M + af * g * dt * C + af * be * dt**2 * Kt)
    x, v, a = np.zeros(3), np.zeros(3), ground * fine[0] / m
    out, r = [np.r_[x, v, a]], ke * b * (b @ x)
    for u, un in zip(fine, fine[1:]):
        xn, vn = x + dt * v + dt**2 * A2 @ a, v + dt * A1 @ a
        rn = ke * b * (b @ xn)
        mix = lambda new, old: (1 - af) * new + af * old
        f = ground * mix(un, u) - mix(rn, r) - C @ mix(vn, v) - K @ mix(xn, x)
        a = np.linalg.solve(M @ (np.eye(3) - A3), f - M @ A3 @ a)
        x, v, r = xn, vn, rn
        out.append(np.r_[x, v, a])
    return np.array(out)[::SUB]


def combescure_pegon(al):  # with the effective mass and force of the paper
    g, be = (1 - 2 * al) / 2, (1 - al) ** 2 / 4
    eff = M + g * dt * (1 + al) * C + be * dt**2 * (1 + al) * Kt
    x, v, a = np.zeros(3), np.zeros(3), ground * fine[0] / m
    out = [np.r_[x, v, a, x]]
    rt, vt = np.zeros(3), v - g * dt * a  # as if a step had led to the start:
    rt = Kt @ (x - be * dt**2 * a)  # its predictors
    for u, un in zip(fine, fine[1:]):
        xt = x + dt * v + dt**2 / 2 * (1 - 2 * be) * a
        vtn = v + (1 - g) * dt * a
        rtn = K @ xt + ke * b * (b @ xt)
        f = (1 + al) * ground * un - al * ground * u + al * rt - (1 + al) * rtn + al * C @ vt - (1 + al) * C @ vtn
        an = np.linalg.solve(eff, f + al * (g * dt * C + be * dt**2 * Kt) @ a)
        x, v, a, rt, vt = xt + be * dt**2 * an, vtn + g * dt * an, an, rtn, vtn
        out.append(np.r_[x, v, a, xt])
    return np.array(out)[::SUB]


header, columns = [], []
for name, rows, letters in [
    ("kr50", kolay_ricles(0.5), "xva"), ("kr100", kolay_ricles(1.0), "xva"),
    ("os05", combescure_pegon(-0.05), "xvat"), ("os33", combescure_pegon(-1 / 3), "xvat"),
]:
    header += [f"{name}.{q}{i}" for q in letters for i in (1, 2, 3)]
    columns.append(rows)
np.savetxt("three_storeys_weighted.csv", np.column_stack(columns), "%.17g", ",", header=",".join(header), comments="")


# Spectra of the implicit generalized-alpha method (Chung & Hulbert 1993) of one
# mode, from its own amplification matrix of (x, dt v, dt^2 a): both methods must
# have them, alpha-OS with am = 0, af = -alpha (Hilber, Hughes & Taylor 1977).
def spectrum(am, af, Om, z):
    g = 0.5 - am + af
    be = (0.5 + g) ** 2 / 4
    new = np.array([[1, 0, -be], [0, 1, -g], [(1 - af) * Om**2, (1 - af) * 2 * z * Om, 1 - am]])
    old = np.array([[1, 1, 0.5 - be], [0, 1, 1 - g], [-af * Om**2, -af * 2 * z * Om, -am]])
    lam = eigvals(np.linalg.solve(new, old))
    p = lam[np.argmax(np.where(lam.imag > 1e-3, np.abs(lam), -1))]  # the mode itself
    s = np.log(p)
    return [np.abs(lam).max(), s.imag, -s.real / abs(s)] if p.imag > 1e-3 else [np.abs(lam).max(), 0, 0]


rows = []
for Om in (0.01, 0.03, 0.1, 0.3, 1, 3, 10, 30, 100):
    for z in (0, 0.05):
        for rho in (0, 0.25, 0.5, 0.75, 0.9, 1):
            rows.append([0, rho, Om, z] + spectrum((2 * rho - 1) / (rho + 1), rho / (rho + 1), Om, z))
        for al in (0, -0.05, -0.1, -0.3, -1 / 3):
            rows.append([1, al, Om, z] + spectrum(0, -al, Om, z))
np.savetxt("spectra.csv", rows, "%.17g", ",", comments="",
           header="split,setting,omega_dt,damping_ratio,radius,turn_rad,numerical_damping_ratio")
