"""Harmonic functions of one thin disc: oblate spheroidal harmonics, and the charges that belong to them.

A disc of radius a lies in z = 0 of its own frame; rho = a sqrt((1 + xi^2)(1 - eta^2)), z = a xi eta; on the disc xi = 0
and eta = sqrt(1 - rho^2/a^2). For l - m even

    U = T_lm(xi) P_lm(eta) cos(m phi) or sin(m phi),     T_lm(xi) = Q_l^m(i xi) / Q_l^m(i 0)

is harmonic off the disc, falls off at infinity and is P_lm cos(m phi) on the disc. Its charge density (both faces
together) is (2 lambda_lm / (a eta)) times the same function, lambda_lm = -T_lm'(0): the functions P_lm(eta)/eta are
eigenfunctions of the potential of a layer on the disc [Copson1947], [AbramowitzStegun1964] (chapters 8 and 21). With
Q_l^m(i xi) = (-i)^l q_l the recurrences

    (l-m+1) q_(l+1) = (l+m) q_(l-1) - (2l+1) xi q_l,     (1+xi^2) q_l' = -(l+1) xi q_l - (l-m+1) q_(l+1)

run backwards, as q is the solution that decays; with q_m ~ (1+xi^2)^(m/2) int_xi^oo dt/(1+t^2)^(m+1) every term is positive.

Y_lm = sqrt(2) P_lm(eta) cos(m phi)/sqrt(pi or, m = 0, 2 pi) is orthonormal over 0 < eta < 1, 0 <= phi < 2 pi, in which
the element of area is a^2 eta d eta d phi. P_lm is normalised to 1 over -1 < eta < 1.
"""
import numpy as np
from scipy.special import betainc, gammaln

DECAY = 40.0                                             # exp(-DECAY): what is left of the start of a backward recurrence


def degrees(m, top):
    """l = m, m + 2, ... up to top"""
    return np.arange(m, top + 1, 2)


def strength(m, top):
    """lambda_lm of degrees(m, top)"""
    l = degrees(m, top)
    up, down = (l + m) / 2, (l - m) / 2
    return 2 * np.exp(gammaln(up + 1) + gammaln(down + 1) - gammaln(up + 0.5) - gammaln(down + 0.5))


def legendre(m, top, eta):
    """-> P_lm(eta) and (1 - eta^2) P_lm'(eta) of degrees(m, top), shape (degrees, points)"""
    P = np.empty((top - m + 2,) + eta.shape)
    log_norm = 0.5 * (np.log(m + 0.5) + gammaln(2 * m + 1) - 2 * m * np.log(2.0)) - gammaln(m + 1)
    P[0] = np.exp(log_norm) * np.sqrt((1 - eta) * (1 + eta)) ** m
    before = np.zeros_like(eta)
    for k in range(top - m + 1):
        l = m + k
        up = np.sqrt((2 * l + 3) / (2 * l + 1) / ((l + 1) ** 2 - m * m))
        down = np.sqrt((l * l - m * m) / (2 * l - 1)) * np.sqrt(2 * l + 1) if k else 0.0
        P[k + 1] = up * ((2 * l + 1) * eta * P[k] - down * before)
        before = P[k]
    l = degrees(m, top)[:, None]
    slope = (l + 1) * eta * P[:-1:2] - np.sqrt((2 * l + 1) / (2 * l + 3) * ((l + 1) ** 2 - m * m)) * P[1::2][:len(l)]
    return P[:-1:2], slope


def decay(m, top, xi):
    """-> T_lm(xi) and its derivative for degrees(m, top), shape (degrees, points); xi > 0"""
    ratio = np.sqrt(1 + xi * xi) - xi                                        # q_(l+1)/q_l for large l
    far = top + 1 + int(np.ceil(DECAY / (2 * np.arcsinh(np.min(xi)))))
    ratios = np.empty((top - m + 2,) + xi.shape)
    for l in range(far, m, -1):
        ratio = (l + m) / ((2 * l + 1) * xi + (l - m + 1) * ratio)           # q_l/q_(l-1)
        if l <= top + 2:
            ratios[l - 1 - m] = ratio
    l = degrees(m, top)
    T = np.empty((len(l),) + xi.shape)
    T[0] = (1 + xi * xi) ** (m / 2) * betainc(m + 0.5, 0.5, 1 / (1 + xi * xi))
    for k in range(len(l) - 1):
        T[k + 1] = T[k] * ratios[2 * k] * ratios[2 * k + 1] * (l[k] - m + 2) / (l[k] + m + 1)
    slope = -T * ((l[:, None] + 1) * xi + (l[:, None] - m + 1) * ratios[::2][:len(l)]) / (1 + xi * xi)
    return T, slope


def spheroidal(radius, points):
    """points (..., 3) in the frame of the disc -> xi, eta, azimuth; eta has the sign of z"""
    x, y, z = np.moveaxis(points, -1, 0) / radius
    s = x * x + y * y + z * z - 1
    root = np.hypot(s, 2 * z)
    xi = np.sqrt(np.where(s > 0, (root + s) / 2, 2 * z * z / np.where(s > 0, 1.0, root - s)))
    return xi, z / xi, np.arctan2(y, x)


def angular(m, parity, phi):
    """normalised cos(m phi) (parity 0) or sin(m phi) (parity 1), and the derivative"""
    norm = np.sqrt((2 if m == 0 else 1) * np.pi)
    c, s = np.cos(m * phi) / norm, np.sin(m * phi) / norm
    return (s, m * c) if parity else (c, -m * s)


def gradient(radius, points, modes, top, weights):
    """gradient (..., 3) at `points` of the potential sum weights T Y of the disc

    modes: list of (m, parity); weights: one array of degrees(m, top) for each of them."""
    flat = points.reshape(-1, 3)
    xi, eta, phi = spheroidal(radius, flat)
    by_xi, by_eta, by_phi = np.zeros((3, len(flat)))
    for (m, parity), w in zip(modes, weights):
        (P, P_slope), (T, T_slope), (c, c_slope) = legendre(m, top, eta), decay(m, top, xi), angular(m, parity, phi)
        by_xi += np.sqrt(2) * c * np.einsum("l,lp,lp->p", w, T_slope, P)
        by_eta += np.sqrt(2) * c * np.einsum("l,lp,lp->p", w, T, P_slope)    # times 1 - eta^2
        by_phi += np.sqrt(2) * c_slope * np.einsum("l,lp,lp->p", w, T, P)
    outer, inner = np.sqrt(1 + xi * xi), np.sqrt((1 - eta) * (1 + eta))
    scale = 1 / (radius * (xi * xi + eta * eta))
    along = scale * (outer * inner * xi * by_xi - eta * outer * by_eta / inner)
    up = scale * (outer ** 2 * eta * by_xi + xi * by_eta)
    around = by_phi / (radius * outer * inner)
    cos, sin = np.cos(phi), np.sin(phi)
    return np.stack([along * cos - around * sin, along * sin + around * cos, up], -1).reshape(points.shape)
