"""Recomputes strips-parallel.json: two equal, aligned, parallel thin strips in free space, in closed form.

The map z = -Z(u|k), Z Jacobi's zeta function, takes the rectangle |Re u| < K, 0 < Im u < K' onto half of the plane
outside the strips. The slit half-length is the largest Z, at sn^2 = (1 - E/K)/k^2; the distance to the plane of
symmetry is pi/(2K). With sin^2 phi = (K - E)/(k^2 K), length w and gap d,

    w/d     = (2/pi) (K E(phi,k) - E F(phi,k))
    C/eps0  = K/K'                                       per unit width
    C d/(eps0 w) = capacitance_factor
    dC/d(w/d) / eps0 = (pi^2 / 4 K'^2) sqrt(K / (E (K - E) (E - k'^2 K))) = force_factor

The complementary modulus k' ~ 4 exp(-pi w / 2d - ...) is the parameter: k itself is 1 to many digits.

    python strips_parallel.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

DIGITS = 22                                              # stored in the field `digits`


def at(m1):
    """w/d, C/eps0, force factor at k'^2 = m1"""
    m = 1 - m1
    K, E, K1 = mp.ellipk(m), mp.ellipe(m), mp.ellipk(m1)
    phi = mp.asin(mp.sqrt((K - E) / (m * K)))
    ratio = 2 / mp.pi * (K * mp.ellipe(phi, m) - E * mp.ellipf(phi, m))
    return ratio, K / K1, mp.pi ** 2 / (4 * K1 ** 2) * mp.sqrt(K / (E * (K - E) * (E - m1 * K)))


def factors(gap):
    """gap: d/w, as text for full digits -> C/eps0, capacitance_factor, force_factor (mpmath numbers)"""
    with mp.workdps(30):
        target = 1 / mp.mpf(gap)
        digits = int(mp.mpf("0.87") * (target * mp.pi / 2 + 8)) + 60          # 1 - k^2 must keep 60 digits
    with mp.workdps(digits):
        target = 1 / mp.mpf(gap)
        f = lambda y: at(mp.exp(-2 * y))[0] - target
        low, high = mp.mpf("1e-6"), mp.pi * target / 2 + 12
        for _ in range(40):
            middle = (low + high) / 2
            low, high = (low, middle) if f(middle) > 0 else (middle, high)
        y = mp.findroot(f, (low, high), solver="secant", tol=mp.mpf(10) ** -90, maxsteps=60)
        ratio, C, force = at(mp.exp(-2 * y))
        return C, C / ratio, force


def compute(case, args):
    C, capacitance, force = factors(repr(case["geometry"]["gap"]))
    value = dict(capacitance=C, capacitance_factor=capacitance, force_factor=force)
    assert {k: mp.nstr(v, DIGITS) for k, v in value.items()} == case["digits"], value
    return value


if __name__ == "__main__":
    store.run("strips-parallel", compute)
