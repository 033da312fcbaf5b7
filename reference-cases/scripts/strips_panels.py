"""Charges of straight thin strips by panels of Legendre polynomials, graded geometrically to both ends of a strip.

Knows nothing of the singularity at the edges; a check of strips_spectral.py to 1e-11. Collocation at Gauss points; the
logarithmic moments of the polynomials are Legendre functions of the second kind near a panel, Gauss quadrature far away.
"""
import numpy as np

from strips_spectral import CLD, IU, LD, PI


def gauss(n):
    """Gauss-Legendre points and weights in 80-bit arithmetic"""
    x = np.polynomial.legendre.leggauss(n)[0].astype(LD)
    for _ in range(4):
        p0, p1 = np.ones(n, LD), x.copy()
        for k in range(1, n):
            p0, p1 = p1, ((2 * k + 1) * x * p1 - k * p0) / (k + 1)
        slope = n * (x * p1 - p0) / (x * x - 1)
        x = x - p1 / slope
    return x, 2 / ((1 - x * x) * slope * slope)


def moments(z, degree, x, w):
    """int over [-1, 1] of P_k(t) ln|z - t| dt, k = 0 ... degree"""
    z = z.copy()
    z.imag[z.imag == 0] = 0
    out = np.empty((len(z), degree + 1), dtype=LD)
    near = np.abs(z + np.sqrt(z - 1) * np.sqrt(z + 1)) < 2
    if near.any():
        q = z[near]
        log_p, log_m, arg_p, arg_m = np.log(np.abs(q + 1)), np.log(np.abs(q - 1)), np.angle(q + 1), np.angle(q - 1)
        on_panel = (q.imag == 0) & (np.abs(q.real) < 1)
        Q = np.empty((degree + 2, len(q)), dtype=CLD)
        Q[0] = (log_p - log_m + IU * np.where(on_panel, 0, arg_p - arg_m)) / 2
        Q[1] = q * Q[0] - 1
        for k in range(1, degree + 1):
            Q[k + 1] = ((2 * k + 1) * q * Q[k] - k * Q[k - 1]) / (k + 1)
        m = np.empty((len(q), degree + 1), dtype=LD)
        m[:, 0] = (q + 1).real * log_p - q.imag * arg_p - (q - 1).real * log_m + q.imag * arg_m - 2
        for k in range(1, degree + 1):
            m[:, k] = (2 * (Q[k + 1] - Q[k - 1]) / (2 * k + 1)).real
        out[near] = m
    if (~near).any():
        P = np.empty((degree + 1, len(x)), dtype=LD)
        P[0], P[1] = 1, x
        for k in range(1, degree):
            P[k + 1] = ((2 * k + 1) * x * P[k] - k * P[k - 1]) / (k + 1)
        out[~near] = np.log(np.abs(z[~near][:, None] - x[None])) @ (P * w).T
    return out


def charges(strips, potentials, layers=18, ratio=0.15, degree=15, longest=0.25):
    """charge of every strip (strips_spectral.Strip); zero total charge"""
    X, W = gauss(60)
    panels = []
    for i, s in enumerate(strips):
        marks = [LD(0)] + [s.a * LD(ratio) ** k for k in range(layers, -1, -1)]      # distances from an end
        for end in (-1, 1):
            for a, b in zip(marks[:-1], marks[1:]):
                n = max(1, int(np.ceil(float((b - a) / LD(longest)))))
                panels += [(i, end, a + (b - a) * j / n, a + (b - a) * (j + 1) / n) for j in range(n)]
    n, count = degree + 1, len(panels)
    x, _ = gauss(n)
    S = np.array([(a + b) / 2 + (b - a) / 2 * x for _, _, a, b in panels])
    strip, end = np.array([p[0] for p in panels]), np.array([p[1] for p in panels])
    Z = np.array([strips[i].c + e * (strips[i].a - s) * strips[i].e for i, e, s in zip(strip, end, S)])
    A, rhs = np.zeros((count * n + 1, count * n + 1)), np.zeros(count * n + 1)
    A[:-1, -1] = -1
    for j, (i, e, a, b) in enumerate(panels):
        s, middle, half = strips[i], (a + b) / 2, (b - a) / 2
        zeta = (Z - (s.c + e * (s.a - middle) * s.e)) / (-e * s.e * half)
        for k in np.nonzero(strip == i)[0]:
            zeta[k] = (S[k] - middle) / half if end[k] == e else (2 * s.a - S[k] - middle) / half
        M = moments(zeta.reshape(-1), degree, X, W)
        M[:, 0] += 2 * np.log(half)
        A[:-1, j * n:(j + 1) * n] = -M / (2 * PI)
        A[-1, j * n] = 2                                 # unknown: density times half the panel length
    for k in range(count):
        rhs[k * n:(k + 1) * n] = potentials[strips[strip[k]].electrode]
    q = np.linalg.solve(A, rhs)
    return np.array([2 * sum(q[j * n] for j in range(count) if strip[j] == i) for i in range(len(strips))])
