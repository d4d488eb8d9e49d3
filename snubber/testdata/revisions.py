"""The joint fit of several board revisions by SciPy's least_squares: each with its own L, C, r and I0, and one error for
each capacitor wherever it served. Trials with nothing or a capacitor alone fitted.

In: {"bus": V, "start": [L, C, r, I0], "parts": number of capacitors,
     "trials": [[revision, part or -1, c, u_c, probe, ring, u, decay, u, peak, u], ...]}
Out: {"chi2": ..., "values": [[L, C, Z0, r, f0, I0, bare peak] by revision],
      "differences": [[of each from revision 0, its standard uncertainty] by revision and quantity]}

The differences' uncertainties are from the inverse of the Jacobian's square and numerical gradients.
"""
import json
import sys

import numpy as np
from scipy.optimize import least_squares

q = json.load(sys.stdin)
E = q["bus"]
t = np.array(q["trials"])
rev, part = t[:, 0].astype(int), t[:, 1].astype(int)
c, uc, probe, ring, uring, decay, udecay, peak, upeak = t[:, 2:].T
n, m = rev.max() + 1, q["parts"]


def signs(L, C, r, I0):
    w0, d, z = 1 / np.sqrt(L * C), r / (2 * L), np.sqrt(L / C)
    wd = np.sqrt(w0**2 - d**2)
    zeta, chi = d / w0, I0 * z / E
    w = wd / w0
    theta = np.pi - np.arctan2(w * chi, 1 - zeta * chi)
    return wd / (2 * np.pi), 1 / d, E * (1 + np.sqrt(1 - 2 * zeta * chi + chi**2) * np.exp(-zeta * theta / w))


def residuals(p):
    own, delta = p[: 4 * n].reshape(n, 4), np.append(p[4 * n :], 0.0)
    L, C, r = np.exp(own[rev, :3]).T
    hz, tau, top = signs(L, C + probe + c + uc * delta[part], r, own[rev, 3])
    return np.concatenate([(hz - ring) / uring, (tau - decay) / udecay, (top - peak) / upeak, p[4 * n :]])


def values(p):
    L, C, r = np.exp(p[: 4 * n].reshape(n, 4)[:, :3]).T
    I0 = p[: 4 * n].reshape(n, 4)[:, 3]
    return np.array([L, C, np.sqrt(L / C), r, 1 / (2 * np.pi * np.sqrt(L * C)), I0, signs(L, C, r, I0)[2]]).T


s = q["start"]
start = np.concatenate([np.tile([np.log(s[0]), np.log(s[1]), np.log(s[2]), s[3]], n), np.zeros(m)])
fit = least_squares(residuals, start, method="lm", x_scale="jac", xtol=1e-14, ftol=1e-14, gtol=1e-14)
cov = np.linalg.inv(fit.jac.T @ fit.jac)
at = values(fit.x)
gradient = np.empty(at.shape + (len(fit.x),))
for i in range(len(fit.x)):
    h = np.zeros(len(fit.x))
    h[i] = 1e-5
    gradient[..., i] = (values(fit.x + h) - values(fit.x - h)) / 2e-5
differences = []
for k in range(1, n):
    g = gradient[k] - gradient[0]
    differences.append(np.array([at[k] - at[0], np.sqrt(np.einsum("ij,jk,ik->i", g, cov, g))]).T.tolist())
json.dump({"chi2": 2 * fit.cost, "values": at.tolist(), "differences": differences}, sys.stdout)
