#!/usr/bin/env python3
"""A test of 24 hours at 2048 Hz: memory as flat as that of two hours, the
energy balance closed, and gauges that have not drifted. antelag on PATH."""
import json
import os
import subprocess
import sys
import tempfile
import time

SCENARIO = """title = "a day of steady shaking"
[loop]
rate = "2048 Hz"
duration = "2 h"
[substructure]
damping_ratio = 0.03
[[substructure.storey]]
mass = "60 t"
stiffness = "4 kN/mm"
[excitation]
kind = "sine"
amplitude = "0.1 g"
frequency = "1 Hz"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "6 ms"
[[channel.specimen]]
kind = "bouc-wen"
stiffness = "1.5 kN/mm"
yield_displacement = "10 mm"
hardening = 0.1
[channel.compensator]
kind = "polynomial"
order = 2
delay = "14 ms"
"""


def run(path, duration):
    began = time.time()
    p = subprocess.Popen(["antelag", "run", path, "--json", "--set", f"loop.duration={duration}"], stdout=subprocess.PIPE)
    out = p.stdout.read()
    _, status, usage = os.wait4(p.pid, 0)
    if status:
        sys.exit(f"antelag ended with status {status}")
    lane = json.loads(out)["lanes"][0]
    print(f"{duration}: {time.time() - began:.1f} s, {usage.ru_maxrss / 1024:.0f} MiB")
    return lane, usage.ru_maxrss


def near(what, a, b, tolerance):
    error = abs(a - b) / abs(b)
    print(f"  {what}: {a:.15g}, {b:.15g}, differ by {error:.1e}")
    if not error <= tolerance:
        sys.exit(f"{what} has drifted by more than {tolerance:g}")


with tempfile.TemporaryDirectory() as tmp:
    path = os.path.join(tmp, "day.toml")
    with open(path, "w") as f:
        f.write(SCENARIO)
    short, short_memory = run(path, "2 h")
    day, day_memory = run(path, "24 h")

if day_memory > 1.25 * short_memory:
    sys.exit("memory grows with the length of the run")
c, d = day["channels"][0], short["channels"][0]
# The motion is steady after a minute: trailing figures must be the very same,
# those of the whole run differ by the start alone, 1/12 as much in a day.
near("energy margin", day["energy"]["margin_final"], short["energy"]["margin_final"], 1e-11)
near("NRMSE", c["nrmse"], d["nrmse"], 1e-3)
near("amplitude ratio", c["amplitude_ratio"], d["amplitude_ratio"], 1e-6)
near("tracking indicator per hour", c["tracking_indicator_m2"] / 24, d["tracking_indicator_m2"] / 2, 1e-3)
near("FEI delay", c["fei"]["delay_s"], d["fei"]["delay_s"], 1e-3)
if not day["energy"]["balance_error"] < 1e-6:
    sys.exit("the energy balance does not close")
print(f"  energy balance closes within {day['energy']['balance_error']:.1e}")
