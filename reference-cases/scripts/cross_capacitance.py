"""Recomputes cross-capacitance.json: closed cylinders cut into four electrodes by hair-fine gaps [Thompson1956].

The two cross-capacitances per unit width (between opposite electrodes, the other two grounded) of any such cylinder
satisfy exp(-pi C1/eps0) + exp(-pi C2/eps0) = 1; with C1 = C2 both are eps0 ln2/pi.

A rectangle whose four sides are the electrodes, width w and height h: with 2 K(k)/K'(k) = w/h the sides lie at
[-1, 1], [1, 1/k], ... on the real axis, and the charge on one interval due to 1 V on another is (1/pi) ln of a cross
ratio: C between bottom and top = (2/pi) ln((1 + k)/(1 - k)), between left and right = (1/pi) ln((1 + k)^2 / 4k).

    python cross_capacitance.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 30


def rectangle(aspect):
    """width / height -> cross-capacitance bottom-top, left-right, in eps0 per unit width"""
    k = mp.findroot(lambda q: 2 * mp.ellipk(q ** 2) / mp.ellipk(1 - q ** 2) - aspect, (mp.mpf("1e-9"), 1 - mp.mpf("1e-15")),
                    solver="anderson", tol=mp.mpf("1e-50"))
    return 2 / mp.pi * mp.log((1 + k) / (1 - k)), mp.log((1 + k) ** 2 / (4 * k)) / mp.pi


def rectangle_by_series(aspect, terms=60):
    """the same from the Fourier series of the potential: (8/pi) sum over odd n of 1 / (n sinh(n pi height / width))"""
    total = lambda r: 8 / mp.pi * mp.nsum(lambda j: 1 / ((2 * j + 1) * mp.sinh((2 * j + 1) * mp.pi * r)), [0, terms])
    return total(1 / aspect), total(aspect)


def compute(case, args):
    if case["group"] == "rectangle":
        bottom_top, left_right = rectangle(mp.mpf(repr(case["geometry"]["width"])))
        return dict(bottom_top=bottom_top, left_right=left_right)
    c = mp.log(2) / mp.pi
    return dict(cross_capacitance=c * mp.mpf(repr(case["geometry"].get("permittivity", 1.0))))


if __name__ == "__main__":
    store.run("cross-capacitance", compute)
