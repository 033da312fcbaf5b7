"""Recomputes wedge-strips.json: two equal thin strips from r1 to r2 off their common apex, an angle apart, free space.

The values come from strips_nystrom.py. With --map they are compared with an exact map instead: ln z turns the wedge into
a slit of length ln(r2/r1) at the height theta/2 between grounded lines pi apart; half of that strip is mapped from the
upper half plane by

    dw/dzeta = A / (zeta sqrt((zeta - p1)(zeta - p2)(zeta - p4)(zeta - p5))),   p1 < p2 < 0 < p4 < p5,  slit tip at infinity
    C/eps0 = K(1 - om)/K(om),   om = (p2 - p1)(p5 - p4) / ((p4 - p1)(p5 - p2))

and the torque about the apex is half the derivative of C with respect to theta, a difference quotient.

    python wedge_strips.py [PART OF A NAME ...] [--map] [--update]

The map takes 10 s at 90 degrees and minutes below 10.
"""
import mpmath as mp
import numpy as np

import store
from strips_nystrom import solve

mp.mp.dps = 30


def ideal(ratio, theta):
    """capacitance and torque about the apex of the ideal sector"""
    return np.log(ratio) / theta, np.log(ratio) / (2 * theta ** 2)


def nystrom(ratio, theta):
    """r2/r1, opening -> capacitance, torque about the apex, force towards the bisector; r1 = 1"""
    c, s = np.cos(theta / 2), np.sin(theta / 2)
    N = int(min(1633, max(68, 45 * (ratio - 1) / (2 * s) + 8)))
    C, force, torque = solve(((c, s), (ratio * c, ratio * s)), ((c, -s), (ratio * c, -ratio * s)), N)
    return C, torque, -force[1]


def proportions(u):
    """lower and upper part of the height, lower and upper side of the slit, and om"""
    p1, p2, p4 = -1 - mp.exp(u[0]), mp.mpf(-1), mp.exp(u[1])
    p5 = p4 * (1 + mp.exp(u[2]))
    A = mp.sqrt(abs(p1 * p2 * p4 * p5))

    def between(p, q, a, b):
        def f(t):
            z = p + (q - p) * mp.sin(t) ** 2
            return 2 / (abs(z) * mp.sqrt(abs((z - a) * (z - b))))
        return A * mp.quad(f, [0, mp.pi / 4, mp.pi / 2])

    def beyond(p, *others):
        """from p to infinity, zeta = p -+ s^2"""
        f = lambda s: 2 / ((s * s + abs(p)) * mp.sqrt(mp.fprod(abs(p - q) + s * s for q in others)))
        return A * mp.quad(f, [0, 1, 10, mp.inf])
    below, above = beyond(p1, p2, p4, p5), beyond(p5, p4, p2, p1)
    om = (p2 - p1) * (p5 - p4) / ((p4 - p1) * (p5 - p2))
    return between(p1, p2, p4, p5), between(p4, p5, p1, p2), below, above, om


def mapped(theta, L, u):
    """capacitance for the opening theta and L = ln(r2/r1), starting from parameters u -> capacitance, parameters"""
    def mismatch(u):
        low, _, below, above, _ = proportions(u)
        return [mp.log(low / (theta / 2)), mp.log(below / (L / 2)), mp.log(above / below)]
    h = mp.mpf("1e-10")
    for _ in range(40):
        r = mismatch(u)
        if max(abs(x) for x in r) < mp.mpf("1e-16"):     # quadrature noise is below 1e-17
            break
        J = mp.matrix(3, 3)
        for j in range(3):
            moved = mismatch([x + h * (i == j) for i, x in enumerate(u)])
            for i in range(3):
                J[i, j] = (moved[i] - r[i]) / h
        step = mp.lu_solve(J, -mp.matrix(r))
        shorten = 1 / max(1, *(abs(x) for x in step))
        u = [x + shorten * s for x, s in zip(u, step)]
    else:
        raise RuntimeError(f"no map found for the opening {theta}")
    om = proportions(u)[4]
    with mp.workdps(120):
        return mp.ellipk(1 - om) / mp.ellipk(om), u


def exact(ratio, opening_deg):
    """r2/r1, degrees -> capacitance, torque about the apex"""
    L, theta, u = mp.log(mp.mpf(repr(ratio))), mp.radians(mp.mpf(repr(opening_deg))), [mp.mpf(0)] * 3
    for k in range(6 if opening_deg < 60 else 0):
        _, u = mapped(mp.radians(60 * (mp.mpf(repr(opening_deg)) / 60) ** (mp.mpf(k) / 6)), L, u)
    C, u = mapped(theta, L, u)
    h = mp.mpf("1e-4") * theta
    at = lambda k: mapped(theta + k * h, L, u)[0]
    return C, -(8 * (at(1) - at(-1)) - (at(2) - at(-2))) / (24 * h)


def compute(case, args):
    g = case["geometry"]
    ratio, theta = g["outer_radius"] / g["inner_radius"], np.radians(g["opening_deg"])
    C0, T0 = ideal(ratio, theta)
    if args.map:
        C, T = map(float, exact(ratio, g["opening_deg"]))
        return dict(capacitance=C, capacitance_factor=C / C0, torque_apex=T, torque_factor=T / T0)
    C, T, F = nystrom(ratio, theta)
    if g["opening_deg"] == 180:
        T = 0.0                                          # by symmetry
    return dict(capacitance=C, capacitance_factor=C / C0, torque_apex=T, torque_factor=T / T0, force=F)


if __name__ == "__main__":
    store.run("wedge-strips", compute, lambda p: p.add_argument("--map", action="store_true", help="exact map"))
