"""Galerkin boundary elements for equal rectangular plates with mirror symmetry, and for the cube; free space, eps0 = 1.

The charge is constant on rectangular panels graded towards edges and corners. Panels that lie in parallel planes and
close together are integrated against each other in closed form (80-bit arithmetic, needed for its cancellation); all
other pairs take the closed-form potential of one panel at Gauss points of the other. Capacitances converge from below,
nearly as n^-3 in the number n of panels per half side, and are extrapolated by `richardson`.
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
from numpy.polynomial.legendre import leggauss
from scipy.linalg import cho_factor, cho_solve
from scipy.optimize import brentq

LD = np.longdouble
TINY = LD("1e-4000")                                     # keeps the logarithms finite where their factor vanishes
BLOCK_OF_PAIRS = 20000


def graded_both(a, b, n, power):
    """n + 1 panel boundaries on [a, b], graded towards both ends; n even"""
    m = n // 2
    s = (np.arange(m + 1) / m) ** power * 0.5
    return a + (b - a) * np.concatenate([s, 1 - s[::-1][1:]])


def graded_right(a, b, n, power):
    """n + 1 panel boundaries on [a, b], graded towards b"""
    return a + (b - a) * (1 - ((np.arange(n + 1) / n) ** power)[::-1])


def log_sum(p, R, square, tiny):
    """ln(p + R) with R = sqrt(p^2 + square), without cancellation for p < 0"""
    far = np.log(np.maximum(np.abs(p) + R, tiny))
    return np.where(p >= 0, far, np.log(np.maximum(square, tiny)) - far)


def twofold(u, v, z):
    """F with d2F/dudv = 1/R"""
    R = np.sqrt(u * u + v * v + z * z)
    F = u * log_sum(v, R, u * u + z * z, 1e-300) + v * log_sum(u, R, v * v + z * z, 1e-300)
    zz = np.where(z == 0, 1.0, z)
    return F - np.where(z == 0, 0.0, z * np.arctan(u * v / (zz * np.where(R == 0, 1, R))))


def rectangle_potential(px, py, pz, x0, x1, y0, y1):
    """integral of 1/R over a rectangle in z = 0 at points (px, py, pz)"""
    return (twofold(px - x0, py - y0, pz) - twofold(px - x1, py - y0, pz)
            - twofold(px - x0, py - y1, pz) + twofold(px - x1, py - y1, pz))


def fourfold(u, v, z):
    """G with d4G/du2dv2 = 1/R"""
    R = np.sqrt(u * u + v * v + z * z)
    G = ((u * u - z * z) / 2 * v * log_sum(v, R, u * u + z * z, TINY)
         + (v * v - z * z) / 2 * u * log_sum(u, R, v * v + z * z, TINY) - (u * u + v * v - 2 * z * z) / 6 * R)
    if np.any(z != 0):
        zz = np.where(z == 0, LD(1), z)
        G = G - np.where(z == 0, LD(0), u * v * z * np.arctan(u * v / (zz * np.where(R == 0, LD(1), R))))
    return G


def parallel_pair(a, b, c, d, e, f, g, h, z):
    """integral of 1/R over [a,b] x [e,f] and [c,d] x [g,h], a height z apart"""
    total = LD(0)
    for u, su in ((b - c, 1), (a - c, -1), (b - d, -1), (a - d, 1)):
        for v, sv in ((f - g, 1), (e - g, -1), (f - h, -1), (e - h, 1)):
            total = total + su * sv * fourfold(u, v, z)
    return total


class Mesh:
    def __init__(self, xe, ye):
        X0, Y0 = np.meshgrid(xe[:-1], ye[:-1], indexing="ij")
        X1, Y1 = np.meshgrid(xe[1:], ye[1:], indexing="ij")
        self.x0, self.x1, self.y0, self.y1 = (v.ravel() for v in (X0, X1, Y0, Y1))
        self.area = (self.x1 - self.x0) * (self.y1 - self.y0)
        self.n = len(self.area)
        self.side = np.maximum(self.x1 - self.x0, self.y1 - self.y0)

    def mirrored(self, sx, sy):
        """panel sides (x0, x1, y0, y1) after reflection in x = 0 (sx = -1) and in y = 0 (sy = -1)"""
        x = (self.x0, self.x1) if sx > 0 else (-self.x1, -self.x0)
        y = (self.y0, self.y1) if sy > 0 else (-self.y1, -self.y0)
        return (*x, *y)

    def gauss(self, m):
        xg, wg = leggauss(m)
        px = 0.5 * (self.x0 + self.x1)[:, None] + 0.5 * (self.x1 - self.x0)[:, None] * xg
        py = 0.5 * (self.y0 + self.y1)[:, None] + 0.5 * (self.y1 - self.y0)[:, None] * xg
        return px, py, (wg[:, None] * wg[None, :]).ravel() / 4


def interaction(M, image, m, place=None, height=None, near=1.5, near_height=None, chunk=40):
    """integral of 1 / 4 pi R over every panel of M and every panel of `image` = (x0, x1, y0, y1).
    place(X, Y): coordinates of points of M in the frame of the image; height: the two lie in parallel planes this far
    apart (then pairs closer than `near` panel sides, judged at near_height, are integrated exactly)."""
    if place is None:
        place = lambda X, Y: (X, Y, np.full_like(X, height))
    ix0, ix1, iy0, iy1 = image
    px, py, W = M.gauss(m)
    B = np.zeros((M.n, M.n))
    for i0 in range(0, M.n, chunk):
        i1 = min(M.n, i0 + chunk)
        X = np.repeat(px[i0:i1], m, axis=1).reshape(-1, 1)
        Y = np.tile(py[i0:i1], (1, m)).reshape(-1, 1)
        P = rectangle_potential(*place(X, Y), ix0[None], ix1[None], iy0[None], iy1[None])
        B[i0:i1] = np.tensordot(P.reshape(i1 - i0, m * m, M.n), W, axes=([1], [0])) * M.area[i0:i1, None]
    B = np.where(M.side[:, None] <= M.side[None, :], B, B.T)          # Gauss points on the smaller of the two panels
    if height is not None:
        gx = np.maximum(0, np.maximum(M.x0[:, None] - ix1[None], ix0[None] - M.x1[:, None]))
        gy = np.maximum(0, np.maximum(M.y0[:, None] - iy1[None], iy0[None] - M.y1[:, None]))
        apart = height if near_height is None else near_height
        distance = np.sqrt(gx * gx + gy * gy + apart * apart)
        I, J = np.nonzero(distance < near * np.minimum(M.side[:, None], M.side[None, :]))
        for k in range(0, len(I), BLOCK_OF_PAIRS):
            i, j = I[k:k + BLOCK_OF_PAIRS], J[k:k + BLOCK_OF_PAIRS]
            own = [v[i].astype(LD) for v in (M.x0, M.x1)], [v[i].astype(LD) for v in (M.y0, M.y1)]
            other = [v[j].astype(LD) for v in (ix0, ix1)], [v[j].astype(LD) for v in (iy0, iy1)]
            z = LD(height) * np.ones(len(i), LD)
            B[i, j] = parallel_pair(*own[0], *other[0], *own[1], *other[1], z).astype(float)
    return 0.5 * (B + B.T) / (4 * np.pi)


def charge(A, area):
    """charge of the meshed part of a conductor at 1 V, and the panel densities"""
    density = cho_solve(cho_factor(A), area)
    return np.dot(density, area), density


def slope(f, h):
    """df/dx at x = 0, fourth order"""
    return (8 * (f(h) - f(-h)) - (f(2 * h) - f(-2 * h))) / (12 * h)


FOUR = [(sx, sy) for sx in (1, -1) for sy in (1, -1)]
STEP = 0.01                                              # of the difference quotients, relative


def quarter(lx, ly, n, power):
    return Mesh(graded_right(0, lx / 2, n, power), graded_right(0, ly / 2, n, power))


def single(lx, ly, n, power=4.0, m=5, near=2.5):
    """capacitance of one rectangle lx x ly to infinity"""
    M = quarter(lx, ly, n, power)
    return 4 * charge(sum(interaction(M, M.mirrored(*s), m, height=0.0, near=near) for s in FOUR), M.area)[0]


def facing_pair(lx, ly, gap, n, power=4.0, m=4, near=1.5):
    """two rectangles lx x ly a gap apart -> capacitance of the neutral pair, total charge of both plates at 1 V, and
    the derivatives of these two with respect to the gap (from the matrix at fixed charge, the exact derivative)"""
    M = quarter(lx, ly, n, power)
    at = lambda z: sum(interaction(M, M.mirrored(*s), m, height=z, near=near, near_height=gap) for s in FOUR)
    own = sum(interaction(M, M.mirrored(*s), m, height=0.0, near=near) for s in FOUR)
    other, change = at(gap), slope(lambda e: at(gap + e), STEP * gap)
    q, s = charge(own - other, M.area)
    q_even, s_even = charge(own + other, M.area)
    return 2 * q, 8 * q_even, 2 * s @ change @ s, -8 * s_even @ change @ s_even


def wedge_pair(r1, r2, width, opening, n, power=4.0, m=5):
    """Two rectangles from r1 to r2 off their common apex line, `opening` (radians) apart -> capacitance of the neutral
    pair, its derivative with respect to the opening, and with respect to the distance of the two at fixed opening,
    moved at right angles to the bisector."""
    M = Mesh(graded_both(r1, r2, 2 * n, power), graded_right(0, width / 2, n, power))

    def other(opening, lift):
        """image at angle 0, mesh at angle `opening`, moved by `lift` at right angles to the bisector"""
        c, s = np.cos(opening), np.sin(opening)
        lx, lz = -lift * np.sin(opening / 2), lift * np.cos(opening / 2)
        place = lambda X, Y: (X * c + lx, Y, X * s + lz + 0 * Y)
        return sum(interaction(M, M.mirrored(1, sy), m, place=place) for sy in (1, -1))
    own = sum(interaction(M, M.mirrored(1, sy), m, height=0.0) for sy in (1, -1))
    q, density = charge(own - other(opening, 0.0), M.area)
    by_opening = slope(lambda e: other(opening + e, 0.0), STEP * opening)
    by_distance = slope(lambda e: other(opening, e), STEP * 2 * r1 * np.sin(opening / 2))
    return q, density @ by_opening @ density, density @ by_distance @ density


def cube(n, power=3.0, m=4, side_points=10):
    """capacitance of the unit cube: a quarter of one face is meshed, all six faces carry it by symmetry"""
    M = quarter(1, 1, n, power)
    A = sum(interaction(M, M.mirrored(*s), m, height=z) for s in FOUR for z in (0.0, 1.0))
    px, py, W = M.gauss(side_points)
    B = np.zeros((M.n, M.n))
    for i0 in range(0, M.n, 20):
        i1 = min(M.n, i0 + 20)
        X = np.repeat(px[i0:i1], side_points, axis=1).reshape(-1, 1)
        Y = np.tile(py[i0:i1], (1, side_points)).reshape(-1, 1)
        P = 0
        for s in FOUR:
            x0, x1, y0, y1 = (v[None] for v in M.mirrored(*s))
            for U, Z in ((Y, X - 0.5), (Y, X + 0.5), (X, Y - 0.5), (X, Y + 0.5)):
                half = np.full_like(U, 0.5)              # the mean of the two ways round keeps a face symmetric in x, y
                P = P + 0.5 * rectangle_potential(U, half, Z, x0, x1, y0, y1)
                P = P + 0.5 * rectangle_potential(U, half, Z, y0, y1, x0, x1)
        B[i0:i1] = np.tensordot(P.reshape(i1 - i0, side_points ** 2, M.n), W, axes=([1], [0])) * M.area[i0:i1, None]
    return 24 * charge(A + 0.5 * (B + B.T) / (4 * np.pi), M.area)[0]


def richardson(ns, values):
    """a of a + b n^-p through the last three values -> a, p"""
    n1, n2, n3 = ns[-3:]
    v1, v2, v3 = values[-3:]
    p = brentq(lambda p: (v2 - v1) / (v3 - v2) - (n1 ** -p - n2 ** -p) / (n2 ** -p - n3 ** -p), 0.5, 8)
    return v3 - (v3 - v2) / (n3 ** -p - n2 ** -p) * n3 ** -p, p
