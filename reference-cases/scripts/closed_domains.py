"""Recomputes closed-domains.json: plane problems whose domain fits a rectangular grid, without a far boundary.

* Concentric squares, by Schwarz-Christoffel: an eighth is a trapezoid with angles 3/4, 1/4, 1/2, 1/2 pi at the inner
  corner, the outer corner and the two midpoints, dz/dzeta = zeta^(-1/4) (1 - zeta)^(-3/4) (s - zeta)^(-1/2); s follows
  from the ratio of two sides, the outer conductor is [1, s], the inner one (-inf, 0], C/eps0 = 8 K(1 - 1/s)/K(1/s).
* Thin strip, width w, midway between grounded planes b apart: C/eps0 = 4 K(k)/K(k'), k = tanh(pi w / 2b).
* Right-angled corner of a channel between two conductors, equal widths on both sides of the bend: the corner square
  counts as 1 - (2/pi) ln 2 squares of the straight channel.
* Two coplanar thin strips from r1 to r2 and from -r2 to -r1: C/eps0 = K(k')/K(k), k = r1/r2.

    python closed_domains.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 30


def concentric_squares(r):
    """C/eps0 per unit width for the side ratio r = inner / outer"""
    quarter, half = mp.mpf(1) / 4, mp.mpf(1) / 2

    def ratio(s):
        """length of the diagonal side / half of the outer side, roots taken out by substitution"""
        diagonal = mp.quad(lambda v: mp.mpf(4) / 3 * (1 - v ** (mp.mpf(4) / 3)) ** (-3 * quarter)
                           * (s - v ** (mp.mpf(4) / 3)) ** -half, [0, half ** (3 * quarter)])
        diagonal += mp.quad(lambda u: 4 * (1 - u ** 4) ** -quarter * (s - 1 + u ** 4) ** -half, [0, half ** quarter])
        m = (s - 1) / 2
        outer = mp.quad(lambda u: 4 * (1 + u ** 4) ** -quarter * (s - 1 - u ** 4) ** -half, [0, m ** quarter])
        outer += mp.quad(lambda v: 2 * (s - v * v) ** -quarter * (s - v * v - 1) ** (-3 * quarter), [0, mp.sqrt(m)])
        return diagonal / outer
    s = mp.findroot(lambda s: ratio(s) - (1 - r) * mp.sqrt(2), (mp.mpf("1.001"), mp.mpf(50)), solver="anderson",
                    tol=mp.mpf("1e-50"), maxsteps=300)
    return 8 * mp.ellipk(1 - 1 / s) / mp.ellipk(1 / s)


def stripline(w):
    """w/b -> C/eps0"""
    return 4 * mp.ellipk(mp.tanh(mp.pi * w / 2) ** 2) / mp.ellipk(1 / mp.cosh(mp.pi * w / 2) ** 2)


def corner_squares():
    return 1 - 2 * mp.log(2) / mp.pi


def coplanar(ratio):
    """r2/r1 -> C/eps0"""
    return mp.ellipk(1 - 1 / ratio ** 2) / mp.ellipk(1 / ratio ** 2)


def compute(case, args):
    g = {k: mp.mpf(repr(v)) for k, v in case["geometry"].items()}
    if case["group"] == "corner":
        return dict(squares=corner_squares())
    return dict(capacitance={"concentric squares": lambda: concentric_squares(g["side_ratio"]),
                             "stripline": lambda: stripline(g["width"]),
                             "coplanar strips": lambda: coplanar(g["outer"] / g["inner"])}[case["group"]]())


if __name__ == "__main__":
    store.run("closed-domains", compute)
