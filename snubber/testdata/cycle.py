"""Energies of one repeating cycle of L, C, r with a series Rs, Cs across C, integrated by SciPy's solve_ivp (DOP853).

In: a list of [L, C, r, Rs, Cs, E, I0, Ron, ton, toff] in SI units (Rs = Cs = 0: bare; Rs = 0: a capacitor alone).
Out: a list of objects, J: in Rs, r and the switch at turn-off and turn-on, what the source gave, what the loop's current
lost; and by how much the cycle's end misses its start (relative). The repeating state comes from SciPy's matrix
exponential and the cycle is then integrated from it.
"""
import json
import sys

import numpy as np
from scipy.integrate import solve_ivp
from scipy.linalg import expm


def solve(L, C, r, Rs, Cs, E, I0, Ron, ton, toff):
    w0, z0 = 1 / np.sqrt(L * C), np.sqrt(L / C)
    a, rho, loss, chi, ron = Cs / C, Rs / z0, r / z0, I0 * z0 / E, Ron / z0
    n, f = ton * w0, toff * w0
    # States i Z0/E, v/E, u/E; energies in units of C E^2; the last of each: the source's.
    if rho == 0:
        Off = np.array([[-loss, -1, 0], [1 / (1 + a), 0, 0], [1 / (1 + a), 0, 0]])
        On = np.eye(2) * -1 / (ron * (1 + a))
        y = lambda v, u: 0.0
    else:
        Off = np.array([[-loss, -1, 0], [1, -1 / rho, 1 / rho], [0, 1 / (rho * a), -1 / (rho * a)]])
        On = np.array([[-1 / ron - 1 / rho, 1 / rho], [1 / (rho * a), -1 / (rho * a)]])
        y = lambda v, u: (v - u) / rho
    def off(t, x):
        d = Off @ x[:3] + [1, 0, 0]
        s = y(x[1], x[2])
        return [*d, s * s * rho, loss * x[0] ** 2, x[0]]
    def on(t, x):
        s = y(x[0], x[1])
        return [*(On @ x[:2]), s * s * rho, x[0] ** 2 / ron]
    rest = np.array([0, 1, 1])
    F, N = expm(Off * f), expm(On * n)
    # w = N (rest + F ((chi, w) - rest)), the voltages alone.
    G = N @ F[1:, 1:]
    c = N @ (rest + F @ (np.array([chi, 0, 0]) - rest))[1:]
    w = np.linalg.solve(np.eye(2) - G, c)
    def run(rhs, span, x):
        return solve_ivp(rhs, (0, span), x, method="DOP853", rtol=1e-12, atol=1e-14).y[:, -1]
    x = run(off, f, [chi, *w, 0, 0, 0])
    z = run(on, n, [*x[1:3], 0, 0])
    J = C * E * E
    return {"OffRs": x[3] * J, "OffLoop": x[4] * J, "OnRs": z[2] * J, "OnSwitch": z[3] * J,
            "Source": x[5] * J, "Current": (chi ** 2 - x[0] ** 2) / 2 * J, "Miss": float(np.abs(z[:2] - w).max())}


json.dump([solve(*row) for row in json.load(sys.stdin)], sys.stdout)
