"""Straight thin strips in the plane, any number: Chebyshev boundary-integral method in 80-bit arithmetic; eps0 = 1.

On a strip z = c + a e^{i angle} t the charge density is sigma a = sum a_n T_n(t) / sqrt(1 - t^2). With
zeta = (u + 1/u)/2, |u| >= 1, every mode acts on every point in closed form,

    int T_n / sqrt(1 - t^2) ln|zeta - t| dt  =  pi ln|u/2| (n = 0),  -(pi/n) Re u^-n (n > 0)
    int T_n / sqrt(1 - t^2) / (zeta - t) dt  =  pi u^-n / sqrt(zeta^2 - 1)

so that there is no quadrature near a strip, however small the gap; the only approximation is the number N of modes.
Electrodes stand at given potentials plus a common offset, the total charge is zero, the potential vanishes at infinity.
The linear system is factorised in double precision and refined with 80-bit residuals.
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
import scipy.fft as sf
import scipy.linalg as sl

LD, CLD = np.longdouble, np.clongdouble
PI = LD(4) * np.arctan(LD(1))
IU = CLD(1j)


class Strip:
    """centre, length, angle in radians (counter-clockwise with x to the right and z up), number of its electrode"""

    def __init__(self, x, z, length, angle, electrode):
        self.c = CLD(1) * LD(x) + IU * LD(z)
        self.a, self.electrode = LD(length) / 2, electrode
        self.e = np.cos(LD(angle)) + IU * np.sin(LD(angle))


def nodes(N):
    return np.cos(PI * (2 * np.arange(N) + 1).astype(LD) / (2 * N))


def joukowski(strip, z):
    """u with |u| >= 1 of the points z relative to the strip, and (u - 1/u)/2 = sqrt(zeta^2 - 1)"""
    w = (z - strip.c) / (strip.a * strip.e)
    r = np.sqrt(w - 1) * np.sqrt(w + 1)
    u = w + r
    wrong = np.abs(u) < 1                                # the other branch, through a signed zero on the real axis
    u[wrong] = (w - r)[wrong]
    r[wrong] = -r[wrong]
    return u, r


def inverse_powers(u, N):
    """u^0 ... u^-(N-1), by doubling"""
    P = np.empty((len(u), N), dtype=CLD)
    P[:, 0], k = 1, 1
    while k < N:
        m = min(k, N - k)
        P[:, k:k + m] = P[:, :m] * (P[:, k - 1] / u)[:, None]
        k += m
    return P


def to_modes(f):
    c = sf.dct(f, type=2, axis=0) / f.shape[0]
    c[0] /= 2
    return c


def from_modes(c):
    g = c.copy()
    g[0] *= 2
    return sf.idct(g * c.shape[0], type=2, axis=0)


def solve(strips, N, potentials, refine=3):
    """-> modes a of every strip, offset of the potentials, points z of every strip"""
    K, M = len(strips), len(strips) * N
    block = lambda i: slice(i * N, (i + 1) * N)
    z = [s.c + s.a * s.e * nodes(N) for s in strips]
    half = 1 / (2 * np.arange(1, N).astype(LD))
    own = [np.concatenate([[np.log(2 / s.a) / 2], half]) for s in strips]
    cross = {}
    for i in range(K):
        for k in range(K):
            if i != k:
                u, _ = joukowski(strips[k], z[i])
                cross[i, k] = inverse_powers(u, N).real * np.concatenate([[LD(0)], half])
                cross[i, k][:, 0] = (np.log(2 / strips[k].a) - np.log(np.abs(u))) / 2
    scale = np.concatenate([np.concatenate([[1.0], np.sqrt(2.0 * np.arange(1, N))])] * K + [[1.0]])
    A = np.zeros((M + 1, M + 1))
    for i in range(K):
        for k in range(K):
            A[block(i), block(k)] = np.diag(own[i].astype(float)) if i == k else to_modes(cross[i, k].astype(float))
        A[i * N, M], A[M, i * N] = -1.0, 1.0
    lu = sl.lu_factor(A * scale[:, None] * scale, check_finite=False)
    x = np.zeros(M + 1, dtype=LD)
    for _ in range(refine + 1):
        r = np.zeros(M + 1, dtype=LD)
        for i in range(K):
            others = sum((cross[i, k] @ x[block(k)] for k in range(K) if k != i), np.zeros(N, dtype=LD))
            r[block(i)] = -own[i] * x[block(i)] - to_modes(others)
            r[i * N] += LD(potentials[strips[i].electrode]) + x[M]
            r[M] -= x[i * N]
        x = x + sl.lu_solve(lu, (r * scale).astype(float), check_finite=False) * scale
    return [x[block(i)] for i in range(K)], x[M], z


def charge(a):
    return PI * a[0]


def wrench(strips, a, z, k):
    """force (x, z) and counter-clockwise torque about its own centre on strip k, from the field of the others"""
    E = np.zeros(len(z[k]), dtype=CLD)                   # Ex - i Ez
    for j, s in enumerate(strips):
        if j != k:
            u, r = joukowski(s, z[k])
            E += inverse_powers(u, len(a[j])) @ a[j] / (2 * s.a * s.e * r)
    density, weight, d = from_modes(a[k]), PI / len(z[k]), z[k] - strips[k].c
    Ex, Ez = E.real, -E.imag
    return [weight * np.sum(density * f) for f in (Ex, Ez, d.real * Ez - d.imag * Ex)]


class Pair:
    """two strips at potentials 0 and 1 plus the offset; `values`: capacitance, force x, force z, counter-clockwise torque
    on the upper strip about its centre"""

    def __init__(self, lower_length, upper_length, x, z, angle, N):
        self.strips = [Strip(0, 0, lower_length, 0, 0), Strip(x, z, upper_length, angle, 1)]
        self.a, self.offset, self.z = solve(self.strips, N, [0, 1])
        self.N = N

    @property
    def values(self):
        return np.array([charge(self.a[1]), *wrench(self.strips, self.a, self.z, 1)])


SIZES = [96, 144, 216, 324, 486, 729, 1094, 1640, 2460, 3690]


def converged(*pair, tolerance=2e-16, largest=SIZES[-1]):
    """pair: arguments of Pair without N -> Pair with N raised until the values stand still, last change"""
    last = None
    for N in (n for n in SIZES if n <= largest):
        p = Pair(*pair, N)
        v = p.values
        if last is not None:
            scale = np.array([abs(v[0])] + [np.max(np.abs(v[1:]))] * 3)
            change = float(np.max(np.abs(v - last) / scale))
            if change < tolerance:
                break
        last = v
    return p, change


def by_difference(lower_length, upper_length, x, z, angle, near, N):
    """force x, force z, torque as half the derivatives of the capacitance, fourth-order differences"""
    h = LD(near) / 1000
    C = lambda *at: charge(Pair(lower_length, upper_length, *at, N).a[1])
    half_slope = lambda f: (8 * (f(h) - f(-h)) - (f(2 * h) - f(-2 * h))) / (24 * h)
    moves = (lambda s: C(x + s, z, angle), lambda s: C(x, z + s, angle), lambda s: C(x, z, angle + s))
    return [half_slope(f) for f in moves]
