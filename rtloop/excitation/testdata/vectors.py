# Writes the made-up record in every form that is read, and the vectors that
# resampling is compared with. Run as: python3 vectors.py
import json, sys
import numpy as np

acc = [0.0, 0.0063, -0.0021, 0.0177, 0.0412, -0.0338, -0.1015, 0.0754, 0.1623, -0.2107,
       0.0889, 0.3188, -0.2745, -0.1411, 0.2052, 0.0967, -0.1834, 0.0526, 0.0733, -0.0619,
       0.0148, 0.0291, -0.0105]
dt = 0.02
t = [round(k * dt, 2) for k in range(len(acc))]
n = len(acc)

def rows(values, per, form):
    return "".join("".join(form % v for v in values[i:i + per]) + "\n" for i in range(0, len(values), per))

def write(name, text):
    open(name, "w", newline="").write(text)

titles = "MADE-UP STRONG MOTION RECORD\nINVENTED, 1900-01-01, NOWHERE, 180\nACCELERATION TIME SERIES IN UNITS OF G\n"
write("new.at2", titles + "NPTS=  %d, DT=   .0200 SEC,\n" % n + rows(acc, 5, "  %.7E"))
write("old.at2", titles + "  %d    0.0200    NPTS, DT\r\n" % n + rows(acc, 8, "%10.4f").replace("\n", "\r\n"))
write("tight.at2", titles.replace(" IN UNITS OF G", "") + "npts=%d dt=.02\n" % n + rows(acc, 5, " %.7E").replace("E", "D"))
write("blanks.txt", "# made up\n\n" + "".join("  %.2f   %.4f\n" % p for p in zip(t, acc)))
write("tabs.txt", "% made up\nTime\tAcceleration\n" + "".join("%.2f\t%.4f\n" % p for p in zip(t, acc)))
write("commas.csv", "\ufeff\"Time (s)\",\"Acceleration (g)\"\r\n" + "".join("%.2f,%.4f\r\n" % p for p in zip(t, acc)))
write("semicolons.csv", "// made up\nZeit;Beschleunigung\n" + "".join(("%.2f;%.4f;\n" % p).replace(".", ",") for p in zip(t, acc)))
write("cr.txt", "! made up\r" + "".join("%g %g\r" % p for p in zip(t, acc)))
write("columns8.txt", "Acceleration in g, eight in a row\n" + rows(acc, 8, "%10.4f"))
write("column1.txt", rows(acc, 1, "%.4f"))
uneven = [0.5, 0.51, 0.55, 0.8, 0.80001, 1.3, 2.0]
height = [1.0, -2.0, 4.0, 3.0, -5.0, 2.5, 0.75]
write("uneven.txt", "".join("%r %r\n" % p for p in zip(uneven, height)))

def interp(file, step, x, y, h, count, start=None, end=None, hold=False):
    first = x[0] if start is None else start
    last = x[-1] if end is None else min(end, x[-1])
    at = first + np.arange(count) * h
    out = np.interp(at, x, y)
    after = np.interp(last, x, y) if hold else 0.0
    out[at > last + 1e-9] = after
    v = {"file": file, "record_step": step, "step": h, "hold": hold, "want": out.tolist()}
    if start is not None: v["start"] = start
    if end is not None: v["end"] = end
    return v

cases = [
    interp("column1.txt", dt, t, acc, 1 / 1024, 500),
    interp("column1.txt", dt, t, acc, 0.0073, 70, start=0.05, end=0.33),
    interp("column1.txt", dt, t, acc, 0.0031, 90, start=0.125, end=0.1275, hold=True),
    interp("blanks.txt", 0, t, acc, 0.0031, 160),
    interp("uneven.txt", 0, uneven, height, 1 / 512, 900),
    interp("uneven.txt", 0, uneven, height, 0.0123, 150, start=0.52, end=1.7, hold=True),
    interp("uneven.txt", 0, uneven, height, 0.5, 8, start=0.52, end=9.0, hold=True),
]
json.dump({"numpy": np.__version__, "python": sys.version.split()[0], "cases": cases}, open("interp.json", "w"), indent=0)
