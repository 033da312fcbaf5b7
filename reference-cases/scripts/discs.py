"""Recomputes discs.json: two equal coaxial thin discs, radius a = 1, a distance kappa apart, from Love's equation [Love1949]

    f(x) -+ (1/pi) integral over t in [-1, 1] of kappa / (kappa^2 + (x - t)^2) f(t) = 1

upper sign: potentials +-1/2, capacitance 2 int f; lower sign: both discs at 1 V, total charge 8 int f. f is even and
analytic on [-1, 1], so panels of Gauss points about kappa wide converge fast. The derivative with respect to kappa, and
with it the force, comes from the differentiated equation.

Discs of unequal radii a1, a2: the pair of equations f1(x) + K12 f2 = V1, f2(x) + K21 f1 = V2, the same kernel with |t| < a2
in the first and |t| < a1 in the second, charges 4 int f1 and 4 int f2 [Cooke1958] (`unequal`; discs-tilted.json is checked
against it).

    python discs.py [PART OF A NAME ...] [--update]
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
from numpy.polynomial.legendre import leggauss
from scipy.linalg import lu_factor, lu_solve

import store

POINTS = 16                                              # Gauss points per panel


def panel_points(panels):
    """Gauss points and weights over [0, 1], panels narrower towards 1"""
    xg, wg = leggauss(POINTS)
    e = np.sin(np.pi / 2 * np.linspace(0, 1, panels + 1))
    return (np.concatenate([0.5 * (b - a) * xg + 0.5 * (a + b) for a, b in zip(e[:-1], e[1:])]),
            np.concatenate([0.5 * (b - a) * wg for a, b in zip(e[:-1], e[1:])]))


def kernel(kappa, x, t):
    """kernel for an even function of which t > 0 is left, and its derivative with respect to kappa"""
    D, S = x[:, None] - t[None, :], x[:, None] + t[None, :]
    K = kappa / np.pi * (1 / (kappa ** 2 + D ** 2) + 1 / (kappa ** 2 + S ** 2))
    dK = ((D ** 2 - kappa ** 2) / (kappa ** 2 + D ** 2) ** 2 + (S ** 2 - kappa ** 2) / (kappa ** 2 + S ** 2) ** 2) / np.pi
    return K, dK


def integral(kappa, sign, panels):
    """-> int f over [-1, 1] and its derivative with respect to kappa; sign -1: neutral pair, +1: both at one potential"""
    x, w = panel_points(panels)
    K, dK = kernel(kappa, x, x)
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


def unequal(a1, a2, gap, panels=24):
    """-> capacitance matrix of two coaxial discs and its derivative with respect to the gap"""
    x, w = panel_points(panels)
    x1, w1, x2, w2 = a1 * x, a1 * w, a2 * x, a2 * w
    (K12, d12), (K21, d21) = kernel(gap, x1, x2), kernel(gap, x2, x1)
    zero = np.zeros_like(K12)
    A = np.eye(2 * len(x)) + np.block([[zero, K12 * w2], [K21 * w1, zero]])
    dA = np.block([[zero, d12 * w2], [d21 * w1, zero]])
    plates = np.kron(np.eye(2), np.ones((len(x), 1)))                        # 1 V on one of them
    f = np.linalg.solve(A, plates)
    sums = 8 * plates.T * np.concatenate([w1, w2])
    return sums @ f, sums @ np.linalg.solve(A, -dA @ f)


def compute(case, args):
    return factors(case["geometry"]["gap"]) if case["geometry"]["thickness"] == 0 else {}


if __name__ == "__main__":
    store.run("discs", compute)
