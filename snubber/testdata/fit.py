"""The global fit by SciPy's least_squares, and the substitution line by scipy.odr, on trials with nothing or a capacitor
alone fitted.

In: {"trials": [[c, u_c, probe, ring, u, decay, u, peak, u], ...], "bus": V, "start": [L, C, r, I0],
     "line": [[x, ux, y, uy], ...], "repeat": n}
Out: {"fit": {"L": [value, u], "C": ..., "r": ..., "I0": ..., "chi2": ...}, "seconds": time of one fit,
      "line": [intercept, slope, u(intercept), u(slope)]}

The second-order response is written out here from its textbook closed form: v(t) of a series L, r with C to ground.
"""
import json
import sys
import time

import numpy as np
from scipy import odr
from scipy.optimize import least_squares

q = json.load(sys.stdin)
t = np.array(q["trials"])
E = q["bus"]
c, uc, probe, ring, uring, decay, udecay, peak, upeak = t.T
fitted = np.flatnonzero(c > 0)


def residuals(p):
    L, C, r = np.exp(p[:3])
    I0, delta = p[3], np.zeros(len(c))
    delta[fitted] = p[4:]
    total = C + probe + c + uc * delta
    w0, d, z = 1 / np.sqrt(L * total), r / (2 * L), np.sqrt(L / total)
    wd = np.sqrt(w0**2 - d**2)
    zeta, chi = d / w0, I0 * z / E
    w = wd / w0
    theta = np.pi - np.arctan2(w * chi, 1 - zeta * chi)
    top = E * (1 + np.sqrt(1 - 2 * zeta * chi + chi**2) * np.exp(-zeta * theta / w))
    return np.concatenate([(wd / (2 * np.pi) - ring) / uring, (1 / d - decay) / udecay, (top - peak) / upeak, p[4:]])


start = np.concatenate([np.log(q["start"][:3]), [q["start"][3]], np.zeros(len(fitted))])
fit = least_squares(residuals, start, method="lm", x_scale="jac", xtol=1e-14, ftol=1e-14, gtol=1e-14)
cov = np.linalg.inv(fit.jac.T @ fit.jac)
u = np.sqrt(np.diag(cov))
out = {"fit": {"chi2": 2 * fit.cost, "I0": [fit.x[3], u[3]]}}
for i, name in enumerate(["L", "C", "r"]):
    v = float(np.exp(fit.x[i]))
    out["fit"][name] = [v, v * u[i]]
began = time.perf_counter()
for _ in range(q["repeat"]):
    least_squares(residuals, start, method="lm", x_scale="jac")
out["seconds"] = (time.perf_counter() - began) / max(1, q["repeat"])
x, ux, y, uy = np.array(q["line"]).T
sx, sy = 1e12, 1e18  # odr's steps want numbers of ordinary size
o = odr.ODR(odr.RealData(x * sx, y * sy, np.maximum(ux, 1e-18) * sx, uy * sy), odr.unilinear, beta0=[(y[-1] - y[0]) / (x[-1] - x[0]) * sy / sx, y[0] * sy],
            sstol=1e-15, partol=1e-15, maxit=1000)
o.set_job(fit_type=0, deriv=0)
r = o.run()
s = np.sqrt(np.diag(r.cov_beta))
out["line"] = [r.beta[1] / sy, r.beta[0] * sx / sy, s[1] / sy, s[0] * sx / sy]
json.dump(out, sys.stdout)
