"""Recomputes discs.json: two equal coaxial thin discs, radius a = 1, a distance kappa apart, from Love's equation [Love1949]

    f(x) -+ (1/pi) integral over t in [-1, 1] of kappa / (kappa^2 + (x - t)^2) f(t) = 1

upper sign: potentials +-1/2, capacitance 2 int f; lower sign: both discs at 1 V, total charge 8 int f. f is even and
analytic on [-1, 1], so panels of Gauss points about kappa wide converge fast. The derivative with respect to kappa, and
with it the force, comes from the differentiated equation.

    python discs.py [PART OF A NAME ...] [--update]
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
from numpy.polynomial.legendre import leggauss
from scipy.linalg import lu_factor, lu_solve

import store

POINTS = 16                                              # Gauss points per panel


def integral(kappa, sign, panels):
    """-> int f over [-1, 1] and its derivative with respect to kappa; sign -1: neutral pair, +1: both at one potential"""
    xg, wg = leggauss(POINTS)
    e = np.sin(np.pi / 2 * np.linspace(0, 1, panels + 1))
    x = np.concatenate([0.5 * (b - a) * xg + 0.5 * (a + b) for a, b in zip(e[:-1], e[1:])])
    w = np.concatenate([0.5 * (b - a) * wg for a, b in zip(e[:-1], e[1:])])
    D, S = x[:, None] - x[None, :], x[:, None] + x[None, :]
    K = kappa / np.pi * (1 / (kappa ** 2 + D ** 2) + 1 / (kappa ** 2 + S ** 2))
    dK = ((D ** 2 - kappa ** 2) / (kappa ** 2 + D ** 2) ** 2 + (S ** 2 - kappa ** 2) / (kappa ** 2 + S ** 2) ** 2) / np.pi
    A = np.eye(len(x)) + sign * K * w
    lu, long_A = lu_factor(A), A.astype(np.longdouble)

    def solve(b):
        y = lu_solve(lu, b)
        for _ in range(3):
            y = y + lu_solve(lu, (b - long_A @ y).astype(float))
        return y
    f = solve(np.ones(len(x)))
    return 2 * np.sum(w * f), 2 * np.sum(w * solve(-sign * (dK @ (w * f))))


def factors(kappa, finer=1.0):
    """the quantities of discs.json"""
    panels = min(int(finer * (max(8, int(round(1 / kappa)) + 4))), 140)
    pair, d_pair = integral(kappa, -1, panels)
    even, d_even = integral(kappa, +1, panels)
    capacitance, force = 2 * kappa / np.pi * pair, -2 * kappa ** 2 / np.pi * d_pair
    return dict(capacitance=2 * pair, capacitance_factor=capacitance, force_factor=force, even_capacitance=8 * even,
                capacitance_factor_grounded=capacitance + kappa / np.pi * 2 * even,
                force_factor_grounded=force - 2 * kappa ** 2 / np.pi * d_even)


def compute(case, args):
    return factors(case["geometry"]["gap"]) if case["geometry"]["thickness"] == 0 else {}


if __name__ == "__main__":
    store.run("discs", compute)
