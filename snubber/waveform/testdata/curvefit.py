"""A damped sinusoid on a level by SciPy's curve_fit, all five numbers free, from the start given.

In: {"records": [{"v": [V, ...], "dt": s, "start": [level, amplitude, phase, rad/s, 1/s]}, ...], "repeat": n}
Out: {"fits": [{"hz": [value, u], "d": [value, u]}, ...], "seconds": time of one fit of the first record}
"""
import json
import sys
import time

import numpy as np
from scipy.optimize import curve_fit


def model(t, level, a, phi, w, d):
    return level + a * np.exp(-d * t) * np.cos(w * t + phi)


def fit(record):
    v = np.array(record["v"])
    t = np.arange(len(v)) * record["dt"]
    start = record["start"]
    p, cov = curve_fit(model, t, v, p0=start, x_scale=[1, 1, 1, start[3], start[4]], method="trf",
                       ftol=1e-12, xtol=1e-12, gtol=1e-12)
    u = np.sqrt(np.diag(cov))
    return {"hz": [p[3] / (2 * np.pi), u[3] / (2 * np.pi)], "d": [p[4], u[4]]}


def quick(record):
    v = np.array(record["v"])
    t = np.arange(len(v)) * record["dt"]
    begin = time.perf_counter()
    curve_fit(model, t, v, p0=record["start"])
    return time.perf_counter() - begin


data = json.load(sys.stdin)
out = {"fits": [fit(r) for r in data["records"]]}
if data["repeat"]:
    out["seconds"] = min(quick(data["records"][0]) for _ in range(data["repeat"]))
json.dump(out, sys.stdout)
