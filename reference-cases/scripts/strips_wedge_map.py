"""Symmetric wedge of two equal thin strips by a separate Schwarz-Christoffel map, 50 digits (mpmath).

g = ln z turns mirror image in the bisector and inversion |z| -> r1 r2 / |z| into straight symmetry lines; a quarter is the
half strip 0 < Im g < pi, Re g > 0 minus the slit Im g = theta/2, 0 < Re g < L, L = ln(r2/r1)/2, mapped by

    dg/dzeta = (zeta - p) / sqrt(zeta (zeta - b)(zeta - 1)(zeta - 1 - delta))
    int_0^b = i theta/2,  int_b^1 = 0 (fixes p),  int_b^p = L,  int_1^{1+delta} = i (pi - theta/2) (a check)

Two quarters in parallel and two halves in series: C/eps0 = int_b^1 |dzeta / sqrt| / int_0^b |dzeta / sqrt|.
"""
import mpmath as mm
import numpy as np
from mpmath import mp, mpf


class Doubles:
    """functions and quadrature in double precision, to find the start of the iteration"""
    exp, cosh, sinh, sin, sqrt = np.exp, np.cosh, np.sinh, np.sin, np.sqrt
    acosh, asinh, pi = np.arccosh, np.arcsinh, np.pi
    x, w = np.polynomial.legendre.leggauss(40)

    @classmethod
    def quad(cls, f, b):
        n = int(b / 3) + 1
        t = (np.arange(n)[:, None] + (cls.x + 1) / 2) * b / n
        return float(np.sum(f(t) * cls.w) * b / n / 2)


class Digits:
    """the same with mpmath"""
    exp, cosh, sinh, sin, sqrt = mp.exp, mp.cosh, mp.sinh, mp.sin, mp.sqrt
    acosh, asinh, pi = mp.acosh, mp.asinh, mp.pi

    @staticmethod
    def quad(f, b):
        n = int(b / 3) + 1
        return mm.quad(f, [b * mpf(k) / n for k in range(n + 1)], method="gauss-legendre")


def forward(x, o):
    """x = (ln b, ln delta), arithmetic o -> theta, L, C/eps0, error of the check"""
    b, de = o.exp(x[0]), o.exp(x[1])
    m = 0.5 if b < 0.5 else (1 + b) / 2
    v1, v2 = o.acosh(o.sqrt(m / b)), o.asinh(o.sqrt((1 - m) / de))

    def left(v):                                         # [b, m]
        z = b * o.cosh(v) ** 2
        return z, 2 / o.sqrt((1 - z) * (1 + de - z))

    def right(v):                                        # [m, 1]
        z = 1 - de * o.sinh(v) ** 2
        return z, 2 / o.sqrt(z * (z - b))

    def low(t):                                          # [0, b]
        z = b * o.sin(t) ** 2
        return z, 2 / o.sqrt((1 - z) * (1 + de - z))

    def high(t):                                         # [1, 1 + delta]
        z = 1 + de * o.sin(t) ** 2
        return z, 2 / o.sqrt(z * (z - b))
    plain = lambda g: (lambda v: g(v)[1])
    times_zeta = lambda g: (lambda v: g(v)[0] * g(v)[1])
    J = o.quad(plain(left), v1) + o.quad(plain(right), v2)
    p = (o.quad(times_zeta(left), v1) + o.quad(times_zeta(right), v2)) / J
    J_low = o.quad(plain(low), o.pi / 2)
    half = p * J_low - o.quad(times_zeta(low), o.pi / 2)
    rest = o.quad(times_zeta(high), o.pi / 2) - p * o.quad(plain(high), o.pi / 2)
    if p <= m:
        v = o.acosh(o.sqrt(p / b))
        L = p * o.quad(plain(left), v) - o.quad(times_zeta(left), v)
    else:
        v = o.asinh(o.sqrt((1 - p) / de))
        L = o.quad(times_zeta(right), v) - p * o.quad(plain(right), v)
    return 2 * half, L, J / J_low, half + rest - o.pi


def start(theta, L):
    """(ln b, ln delta) in double precision, by damped Newton steps"""
    target, x = np.log([float(theta), float(L)]), np.array([-1.0, -1.0])
    G = lambda q: np.log(forward(q, Doubles)[:2])
    e = 1e-5 * np.eye(2)
    for _ in range(500):
        r = target - G(x)
        worst = np.max(np.abs(r))
        if worst < 1e-10:
            return x
        J = np.array([(G(x + d) - G(x - d)) / 2e-5 for d in e]).T
        dx = np.linalg.solve(J, r * min(1, 0.4 / worst))
        x = x + dx * min(1, 3 / np.max(np.abs(dx)))
        x[0] = min(x[0], -1e-3)
    raise RuntimeError("no start found for the wedge map")


def wedge(distance, theta, length=1, digits=50):
    """distance of the centres at right angles to the bisector, opening in radians -> capacitance, force on the upper strip
    at right angles to the bisector (negative: towards it), counter-clockwise torque about its centre, error of the check"""
    with mp.workdps(digits):
        d, theta, w = mpf(distance), mpf(theta), mpf(length)
        R = d / (2 * mp.sin(theta / 2))
        assert R > w / 2, "the strips touch"
        L = mp.log((R + w / 2) / (R - w / 2)) / 2
        x = [mpf(float(q)) for q in start(theta, L)]
        h = mpf(10) ** (-mp.dps // 3)
        for _ in range(4):
            y = forward(x, Digits)
            r = [mp.log(theta) - mp.log(y[0]), mp.log(L) - mp.log(y[1])]
            J, g = mm.matrix(2, 2), mm.matrix(2, 1)
            for j in range(2):
                more, less = (forward([q + s * h * (i == j) for i, q in enumerate(x)], Digits) for s in (1, -1))
                for i in range(2):
                    J[i, j] = (mp.log(more[i]) - mp.log(less[i])) / (2 * h)
                g[j] = (more[2] - less[2]) / (2 * h)
            if max(abs(q) for q in r) < mpf(10) ** (-mp.dps * 2 // 3):
                break
            x = [p + q for p, q in zip(x, mm.lu_solve(J, mm.matrix(r)))]
        by_log = mm.lu_solve(J.T, g)
        by_theta, by_L = by_log[0] / theta, by_log[1] / L
        L_by_R = (1 / (R + w / 2) - 1 / (R - w / 2)) / 2
        force = by_L * L_by_R / (2 * mp.sin(theta / 2)) / 2
        torque = (by_theta - by_L * L_by_R * d * mp.cos(theta / 2) / (4 * mp.sin(theta / 2) ** 2)) / 2
        return y[2], force, torque, y[3]
