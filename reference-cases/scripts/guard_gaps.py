"""Recomputes guard-gaps.json: the gap between a guarded plate and its guard, straight, width g, in air.

The effective edge of the guarded plate lies g/2 - s beyond its own edge; the file holds the shift 2 s / g against g/d,
d the distance of the opposite plate.

* thin plates, free space behind them: z = (2d / pi(b - 1)) (u + (b - 1) artanh u), so that
  g/2d = (2/pi)(sqrt(b)/(b - 1) + arcoth sqrt(b)) and s = 2d / (pi (b - 1)); for g << d, 2 s / g = pi g / 16 d
* deep gap, plates much thicker than g: s = (g/pi) atan(g/2d) - (d/pi) ln(1 + (g/2d)^2); for g << d, 2 s / g = g / 2 pi d
* specimen of high permittivity, no flux through the gap [Amey1949]: s = (2d/pi) ln cosh(pi g / 4d)
* bound for small gaps [Maxwell1873]: s <= (g/2) a / (d + a), a = g ln2 / pi

    python guard_gaps.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 30


def thin(x):
    """x = g/d -> 2 s / g"""
    width = lambda q: 2 / mp.pi * (mp.sqrt(1 + mp.exp(q)) / mp.exp(q) + mp.acoth(mp.sqrt(1 + mp.exp(q)))) - x / 2
    q = mp.findroot(width, (mp.mpf(-5), mp.mpf(30)), solver="anderson", tol=mp.mpf("1e-40"), maxsteps=500)
    return 2 / mp.pi / mp.exp(q) * 2 / x


def deep(x):
    return (x / mp.pi * mp.atan(x / 2) - mp.log(1 + (x / 2) ** 2) / mp.pi) * 2 / x


def no_flux(x):
    return 2 / mp.pi * mp.log(mp.cosh(mp.pi * x / 4)) * 2 / x


def small_gap_bound(x):
    a = x * mp.log(2) / mp.pi
    return a / (1 + a)


def compute(case, args):
    x = mp.mpf(repr(case["geometry"]["guard_gap"]))
    return dict(shift_thin=thin(x), shift_deep=deep(x), shift_no_flux=no_flux(x), shift_bound=small_gap_bound(x))


if __name__ == "__main__":
    store.run("guard-gaps", compute)
