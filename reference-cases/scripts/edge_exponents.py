"""Recomputes edge-exponents.json: potential ~ r^alpha, charge ~ r^(alpha - 1) at the corner of a flat plate.

Sphero-conal coordinates separate the Laplace equation outside of a flat sector of half-angle arcsin k'. With
k^2 + k'^2 = 1 and n(n+1) the separation constant of r^n,

    (1 - k^2 cos^2 s) Y'' + k^2 sin s cos s Y' + (n(n+1) k^2 sin^2 s + m) Y = 0      Y(0) = 0, Y'(pi) = 0
    the same with k' and -m                                                         Y'(0) = Y'(pi/2) = 0

Both are solved by Chebyshev collocation for their lowest m; alpha is the n at which these agree.

    python edge_exponents.py [PART OF A NAME ...] [--update]
"""
import numpy as np
from scipy.linalg import eig
from scipy.optimize import brentq

import store

N = 40                                                   # order of the collocation


def chebyshev(N):
    x = np.cos(np.pi * np.arange(N + 1) / N)
    c = np.r_[2, np.ones(N - 1), 2] * (-1.0) ** np.arange(N + 1)
    X = np.tile(x, (N + 1, 1)).T
    D = np.outer(c, 1 / c) / (X - X.T + np.eye(N + 1))
    return D - np.diag(D.sum(1)), x


def lowest(k2, n, end, fixed_at_zero):
    """lowest m on [0, end]; natural ends, Y = 0 at 0 if fixed_at_zero"""
    D, x = chebyshev(N)
    s, D = end / 2 * (1 + x), D * 2 / end
    A = (np.diag(1 - k2 * np.cos(s) ** 2) @ D @ D + np.diag(k2 * np.sin(s) * np.cos(s)) @ D
         + np.diag(n * (n + 1) * k2 * np.sin(s) ** 2))
    B = -np.eye(N + 1)
    B[0] = B[N] = 0
    A[0] = D[0]                                          # x = 1 is s = end
    A[N] = np.eye(N + 1)[N] if fixed_at_zero else D[N]
    m = eig(A, B, right=False)
    m = m[np.isfinite(m)]
    m = m[(np.abs(m) < 1e5) & (np.abs(m.imag) < 1e-7 * (1 + np.abs(m)))]
    return np.min(m.real)


def corner(angle_deg):
    """exponent alpha at the corner of a flat sector of the given opening angle, below 180 degrees"""
    k2 = np.sin(np.radians(angle_deg / 2)) ** 2
    return brentq(lambda n: lowest(1 - k2, n, np.pi, True) + lowest(k2, n, np.pi / 2, False), 1e-4, 0.75, xtol=1e-13)


def compute(case, args):
    if case["group"] == "corner":
        return dict(exponent=corner(case["geometry"]["angle_deg"]))
    if case["group"] == "edge":
        return dict(exponent=180 / case["geometry"]["air_deg"])
    return {}


if __name__ == "__main__":
    store.run("edge-exponents", compute)
