"""Recomputes strips-thick.json: two equal rectangular bars, width w, thickness t, gap d, facing each other in free space.

Quarter of the outside, x > 0 and z > 0, with z = 0 the plane of antisymmetry and x = 0 one of symmetry, is mapped from
the upper half plane by Schwarz-Christoffel:

    dz/dzeta = A sqrt((zeta - b)(zeta - c)) / sqrt(zeta (zeta - a)(zeta - e)),   0 < a < b < c < e

    zeta = 0, a, b, c, e  ->  (0, 0), (0, d/2), (w/2, d/2), (w/2, d/2 + t), (0, d/2 + t)

The bar is [a, e], the plane of antisymmetry (-inf, 0], so that C/eps0 = K(1 - a/e)/K(a/e) (two quarters side by side,
two halves in series). The lengths are hyperelliptic integrals; Newton's method in the logarithms of b - a, c - b, e - c
finds the map of given w/d and t/d. The force is half the derivative of C with respect to d, a five-point difference.

    python strips_thick.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 26
STEP = mp.mpf("2e-3")                                    # relative step of the difference; quadrature noise ~1e-9 in k_F
ROUGH = mp.mpf("1e-6")                                   # tolerance along the way to the wanted proportions
STEPS = 8


def prevertices(u):
    b = 1 + mp.exp(u[0])
    c = b + mp.exp(u[1])
    return mp.mpf(1), b, c, c + mp.exp(u[2])


def lengths(u):
    """d/2, w/2 below, t, w/2 above, in a common unit; zeta = p + (q - p) sin^2 removes the roots at both ends"""
    a, b, c, e = prevertices(u)
    sin, cos, sqrt = mp.sin, mp.cos, mp.sqrt

    def gap(th):
        z = a * sin(th) ** 2
        return 2 * sqrt((b - z) * (c - z)) / sqrt(e - z)

    def below(th):
        z = a + (b - a) * sin(th) ** 2
        return 2 * (b - a) * cos(th) ** 2 * sqrt(c - z) / sqrt(z * (e - z))

    def side(th):
        z = b + (c - b) * sin(th) ** 2
        return 2 * (c - b) ** 2 * (sin(th) * cos(th)) ** 2 / sqrt(z * (z - a) * (e - z))

    def above(th):
        z = c + (e - c) * sin(th) ** 2
        return 2 * (e - c) * sin(th) ** 2 * sqrt(z - b) / sqrt(z * (z - a))
    half = mp.pi / 2
    return (mp.quad(gap, [0, half / 2, half]), mp.quad(below, [0, half / 2, mp.mpf("0.9") * half, half]),
            mp.quad(side, [0, half / 2, half]), mp.quad(above, [0, mp.mpf("0.1") * half, half / 2, half]))


def mismatch(u, w, t):
    h, below, side, above = lengths(u)
    return [mp.log(below / h) - mp.log(w), mp.log(side / h) - mp.log(2 * t), mp.log(above / below)]


def newton(u, w, t, tolerance=None):
    """parameters of the map with w/d = w, t/d = t, from a neighbouring one"""
    tolerance = tolerance or mp.mpf(10) ** (6 - mp.mp.dps)
    w, t, h = mp.mpf(w), mp.mpf(t), mp.mpf(10) ** (-mp.mp.dps // 3)
    for _ in range(60):
        r = mismatch(u, w, t)
        if max(abs(x) for x in r) < tolerance:
            return u
        J = mp.matrix(3, 3)
        for j in range(3):
            moved = mismatch([x + h * (i == j) for i, x in enumerate(u)], w, t)
            for i in range(3):
                J[i, j] = (moved[i] - r[i]) / h
        step = mp.lu_solve(J, -mp.matrix(r))
        shorten = 1 / max(1, *(abs(x) for x in step))
        u = [x + shorten * s for x, s in zip(u, step)]
    raise RuntimeError(f"no map found for w/d = {w}, t/d = {t}")


def capacitance(u):
    a, _, _, e = prevertices(u)
    with mp.workdps(160):                                # a/e may be 1e-60, and 1 - a/e must not round to 1
        return mp.ellipk(1 - a / e) / mp.ellipk(a / e)


found = {}                                               # (w/d, t/d) -> parameters


def map_of(w, t):
    if (w, t) not in found:
        if not found:
            found[1.0, 0.5] = newton([mp.mpf(0), mp.mpf(0), mp.mpf(1)], 1, 0.5)
        w0, t0 = min(found, key=lambda p: abs(mp.log(p[0] / w)) + abs(mp.log(p[1] / t)))
        u = found[w0, t0]
        for k in range(1, STEPS + 1):
            u = newton(u, w0 * (w / w0) ** (k / STEPS), t0 * (t / t0) ** (k / STEPS), ROUGH)
        found[w, t] = newton(u, repr(w), repr(t))
    return found[w, t]


def factors(w, t):
    """w/d, t/d -> C/eps0, capacitance_factor, force_factor"""
    u = map_of(float(w), float(t))
    s, tau = mp.mpf(repr(w)), mp.mpf(repr(t))
    C = {k: capacitance(newton(u, s / (1 + k * STEP), tau / (1 + k * STEP))) for k in (-2, -1, 1, 2)}
    slope = (8 * (C[1] - C[-1]) - (C[2] - C[-2])) / (12 * STEP)      # d dC/dd
    C0 = capacitance(u)
    return C0, C0 / s, -slope / s


def compute(case, args):
    g = case["geometry"]
    C, capacitance_factor, force_factor = factors(g["length"], g["thickness"])
    return dict(capacitance=C, capacitance_factor=capacitance_factor, force_factor=force_factor)


if __name__ == "__main__":
    store.run("strips-thick", compute)
