"""Recomputes pull-in.json: where the pull of ideal plates, no fringe, outruns a linear spring.

Parallel plates, spring k: d/3 and V^2 = (8/27) k d^3 / (eps0 A).
Plate hinged at one end, length L, width b, gap d at the hinge, spring constant K per radian, electrode from g1 L to
g2 L: with a = theta / theta_max, theta_max = d/L,

    C = (eps0 b L / d) h(a),   h(a) = ln((1 - g1 a)/(1 - g2 a)) / a,   V^2 = (2 K d^3 / (eps0 b L^3)) a / h'(a)

and pull-in where a / h'(a) is largest.

    python pull_in.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 40


def hinged(g1, g2):
    """-> theta / theta_max at pull-in, coefficient of K d^3 / (eps0 b L^3) in V^2"""
    slope = lambda a: (g2 / (1 - g2 * a) - g1 / (1 - g1 * a)) / a - mp.log((1 - g1 * a) / (1 - g2 * a)) / a ** 2
    a = mp.findroot(lambda a: mp.diff(lambda x: x / slope(x), a), mp.mpf("0.43") / g2)
    return a, 2 * a / slope(a)


def compute(case, args):
    if case["group"] == "parallel":
        return dict(travel=mp.mpf(1) / 3, voltage_squared=mp.mpf(8) / 27)
    g = case["geometry"]
    travel, voltage_squared = hinged(mp.mpf(repr(g["electrode_from"])), mp.mpf(repr(g["electrode_to"])))
    return dict(travel=travel, voltage_squared=voltage_squared)


if __name__ == "__main__":
    store.run("pull-in", compute)
