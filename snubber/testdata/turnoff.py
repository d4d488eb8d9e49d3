"""One turn-off of L, C, r with a network of any kind, integrated by SciPy's solve_ivp (DOP853), restarted where the diode switches.

In: a list of [L, C, r, R, LR, ESR, Cs, E, I0, diode (0 or 1), drop, Rd] in SI units (Cs = 0: bare).
Out: a list of objects: peak (V), energies (J), what is left ringing when the integration ends (J) and the integral of the network current squared (A^2 s).

In the integration: times in 1/w0, i Z0, v and u in volts, energies in C V^2. With LR a state of its own, the resistor's current.
"""
import json
import math
import multiprocessing
import sys

from scipy.integrate import solve_ivp


def solve(L, C, r, R, LR, ESR, Cs, E, I0, diode, drop, Rd):
    w0, z0 = 1 / math.sqrt(L * C), math.sqrt(L / C)
    r, R, ESR, Rd, lam, a = r / z0, R / z0, ESR / z0, Rd / z0, LR / L, Cs / C

    def currents(x, on):
        """Resistor and diode current (Z0 times), and the voltage across the resistor with its inductance."""
        z, v, u, y = x[:4]
        w = v - u
        if a == 0:
            return 0.0, 0.0, 0.0
        if lam == 0:
            # One node between resistor and ESR: its voltage across the resistor, from the currents' balance.
            if R == 0:
                return (w / ESR if ESR else None), 0.0, 0.0
            if not on:
                i = w / (R + ESR)
                return i, 0.0, R * i
            p = R * Rd / (R + Rd)
            i = (w - p * drop / Rd) / (p + ESR)  # Thevenin
            x = w - ESR * i
            return x / R, (x - drop) / Rd, x
        if not on:
            return y, 0.0, w - ESR * y
        d = (w - ESR * y - drop) / (ESR + Rd)
        return y, d, drop + Rd * d

    def rhs(on):
        def f(t, x):
            z, v, u, y = x[:4]
            i, d, across = currents(x, on)
            if i is None:  # a capacitor alone
                dv = z / (1 + a)
                b = a * dv
                return [E - v - r * z, dv, dv, 0, 0, 0, r * z * z, 0, b * b]
            b = i + d
            dy = (across - R * y) / lam if lam else 0
            return [E - v - r * z, z - b, b / a if a else 0, dy, R * i * i, ESR * b * b, r * z * z, d * (drop + Rd * d), b * b]
        return f

    def left(x):
        z, v, u, y = x[:4]
        return (z * z + (v - E) ** 2 + a * (u - E) ** 2 + lam * y * y) / 2

    def top_of(f):
        def top(t, x):
            return f(t, x)[1]
        top.direction = -1
        return top

    x, t, on = [I0 * z0, 0, 0, 0] + [0] * 5, 0.0, False
    whole, best = left([I0 * z0, 0, 0 if a else E, 0]), E
    if a == 0:
        x[2] = E
    while left(x) > 1e-6 * whole and t < 3000:
        f = rhs(on)
        events = [top_of(f)]
        if diode:
            def switch(t, x):
                i, d, across = currents(x, on)
                return d if on else across - drop
            switch.terminal, switch.direction = True, -1 if on else 1
            events.append(switch)
        scale = max(E, I0 * z0)
        s = solve_ivp(f, (t, 8 if t < 8 else t + 40), x, method="DOP853", rtol=1e-10,
                      max_step=0.15 if t < 8 else 0.35 if diode else math.inf,  # an event is seen where a step ends on its other side
                      atol=[1e-11 * scale] * 4 + [1e-9 * whole] * 4 + [1e-9 * scale**2], events=events)
        if not s.success:
            raise RuntimeError(s.message)
        for y in list(s.y_events[0]) + [s.y[:, -1]]:
            best = max(best, y[1])
        x, t = s.y[:, -1].tolist(), s.t[-1]
        if diode and s.status == 1:
            on = not on
    return {"Peak": best, "Resistor": x[4] * C, "ESR": x[5] * C, "Loop": x[6] * C, "Diode": x[7] * C,
            "I2T": x[8] / z0**2 / w0, "Left": left(x) * C}


if __name__ == "__main__":
    with multiprocessing.Pool(2) as pool:
        json.dump(pool.starmap(solve, json.load(sys.stdin), chunksize=5), sys.stdout)
