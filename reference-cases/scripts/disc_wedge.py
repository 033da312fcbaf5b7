"""Recomputes disc-wedge.json: the tilted disc without fringe, local parallel capacitors over the overlap of two discs.

The gap over the spot (x, y) from the centre of the upper disc is h = d + sx x + sy y. With s = sqrt(1 - beta^2),
beta = a |(sx, sy)| / d, over a disc of radius a (weight (2/pi) sqrt(1 - u^2) du along the slope)

    mean of d/h        = 2 (1 - s) / beta^2       = 2 / (1 + s)
    mean of (d/h)^2    = 2 (1/s - 1) / beta^2     = 2 / (s (1 + s))          (minus its derivative with respect to d)
    mean of u (d/h)^2  = (k_C - k_F) / beta       = -2 beta / (s (1 + s)^2)  (as u beta = h/d - 1)

the right-hand forms without cancellation. About a hinge line along y at an arm R from the centre of the upper disc,
T/(F0 R) = mean of (1 + x/R) (d/h)^2 = k_F - (a/R) 2 beta_x / (s (1 + s)^2), beta_x = a sx / d.

Where neither disc covers the other the overlap is a lens: closed forms along x, quadrature along y.

    python disc_wedge.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 30


def disc(beta_x, beta_y, radius_over_arm):
    """-> C/C0, F/F0, T/(F0 R) over a whole disc"""
    s = mp.sqrt(1 - beta_x ** 2 - beta_y ** 2)
    return 2 / (1 + s), 2 / (s * (1 + s)), 2 / (s * (1 + s)) - radius_over_arm * 2 * beta_x / (s * (1 + s) ** 2)


def disc_by_quadrature(beta_x, beta_y, radius_over_arm):
    """the same by integration over the disc, polar"""
    def mean(f):
        at = lambda r, p: r * f(r * mp.cos(p), 1 + r * (beta_x * mp.cos(p) + beta_y * mp.sin(p)))
        return mp.quad(lambda r: mp.quad(lambda p: at(r, p), [0, mp.pi, 2 * mp.pi]), [0, 1]) / mp.pi
    return mean(lambda x, h: 1 / h), mean(lambda x, h: h ** -2), mean(lambda x, h: (1 + radius_over_arm * x) / h ** 2)


def lens(a1, a2, shift, gap, slope, arm):
    """-> area of the overlap, C/C0, F/F0, T/(F0 R); C0 and F0 with that area and the gap under the upper disc's centre"""
    (cx, cy), (sx, sy) = shift, slope
    low, high = max(-a1, cy - a2), min(a1, cy + a2)
    chord = lambda a, y: mp.sqrt(max(a * a - y * y, mp.mpf(0)))

    def row(y):
        left, right = max(-chord(a1, y), cx - chord(a2, y - cy)), min(chord(a1, y), cx + chord(a2, y - cy))
        if left >= right:
            return mp.matrix([0, 0, 0, 0])
        x0, x1, h = left - cx, right - cx, gap + sy * (y - cy)
        if sx == 0:
            return mp.matrix([x1 - x0, (x1 - x0) / h, (x1 - x0) / h ** 2, (x1 * x1 - x0 * x0) / (2 * h * h)])
        h0, h1 = h + sx * x0, h + sx * x1
        log, square = mp.log(h1 / h0) / sx, (x1 - x0) / (h0 * h1)
        return mp.matrix([x1 - x0, log, square, (log - h * square) / sx])
    d2 = cx * cx + cy * cy
    edges = [low, high]
    if d2 > 0 and abs(a1 - a2) ** 2 < d2 < (a1 + a2) ** 2:                   # the rims cross
        along = (d2 + a1 * a1 - a2 * a2) / (2 * d2)
        across = mp.sqrt(a1 * a1 / d2 - along ** 2)
        edges += [along * cy + across * cx, along * cy - across * cx]
    edges = sorted(e for e in set(edges) if low <= e <= high)
    area, C, F, M = mp.matrix([mp.quad(lambda y: row(y)[k], edges) for k in range(4)])
    return area, C * gap / area, F * gap ** 2 / area, (F + M / arm) * gap ** 2 / area


def compute(case, args):
    g = {k: mp.mpf(repr(v)) if not isinstance(v, list) else [mp.mpf(repr(x)) for x in v]
         for k, v in case["geometry"].items()}
    if case["group"] == "disc":
        C, F, T = disc(g["beta_x"], g["beta_y"], g["radius_over_arm"])
        return dict(capacitance_factor=C, force_factor=F, torque_factor=T)
    area, C, F, T = lens(g["lower_radius"], g["upper_radius"], g["shift"], g["gap"], g["slope"], g["arm"])
    return dict(area=area, capacitance_factor=C, force_factor=F, torque_factor=T)


if __name__ == "__main__":
    store.run("disc-wedge", compute)
