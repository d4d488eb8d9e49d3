"""Peak and resistor energy of L, C, r with a series Rs, Cs across C, integrated by SciPy's solve_ivp (DOP853).

In: a list of [L, C, r, Rs, Cs, E, I0] in SI units (Rs = Cs = 0: bare; Rs = 0: a capacitor alone).
Out: a list of objects: the peak (V), when (s; -1 where there is no overshoot), the energy in Rs and in the loop's r (J),
and what is left ringing when the integration ends (J).
"""
import json
import sys

import numpy as np
from scipy.integrate import solve_ivp


def solve(L, C, r, Rs, Cs, E, I0):
    w0, z0 = 1 / np.sqrt(L * C), np.sqrt(L / C)
    a, rho, loss, chi = Cs / C, Rs / z0, r / z0, I0 * z0
    # States: i Z0, v, u (volts), energies in units of C V^2.
    if Rs == 0:
        rhs = lambda t, x: [E - x[1] - loss * x[0], x[0] / (1 + a), 0, 0, loss * x[0] ** 2]
    else:
        def rhs(t, x):
            ir = (x[1] - x[2]) / rho
            return [E - x[1] - loss * x[0], x[0] - ir, ir / a, ir * ir * rho, loss * x[0] ** 2]
        A = np.array([[-loss, -1, 0], [1, -1 / rho, 1 / rho], [0, 1 / (rho * a), -1 / (rho * a)]])
    def top(t, x):
        return rhs(t, x)[1]
    top.direction = -1
    M = np.array([[-loss, -1], [1 / (1 + a), 0]]) if Rs == 0 else A
    slow = max(-np.linalg.eigvals(M).real.max(), 0)
    span = min(20 / slow, 400) if slow > 0 else 20
    s = solve_ivp(rhs, (0, span), [chi, 0, 0, 0, 0], method="DOP853" if Rs == 0 or rho * min(a, 1) > 0.02 else "Radau",
                  rtol=1e-12, atol=1e-13 * max(E, chi), events=top)
    peak, when = E, -1.0
    for t, y in zip(s.t_events[0], s.y_events[0]):
        if y[1] > peak:
            peak, when = y[1], t / w0
    z, v, u = s.y[:3, -1]
    left = z * z + (v - E) ** 2 + a * ((v if Rs == 0 else u) - E) ** 2
    return {"Peak": peak, "At": when, "InRs": s.y[3, -1] * C, "InLoop": s.y[4, -1] * C, "Left": left * C / 2}


json.dump([solve(*row) for row in json.load(sys.stdin)], sys.stdout)
