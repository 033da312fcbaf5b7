"""Recomputes guarded-strips.json: a thin strip between two thin guard strips in its plane, over a wider counter strip.

The counter strip lies in z = 0, centred at the origin. The plane of strip and guards is turned by the tilt about the
centre of the strip, which stands gap above the origin; positive tilt raises the +x end. Strip and guards share a potential,
one volt above the counter strip, and the total charge is zero. Method: strips_spectral.py, with the modes raised until the
values stand still.

    python guarded_strips.py [PART OF A NAME ...] [--update]
"""
import numpy as np

import store
from strips_spectral import Strip, charge, solve, wrench

SIZES = [144, 216, 324, 486]


def at(geometry, N):
    g = geometry
    angle = np.deg2rad(np.longdouble(g["tilt_deg"]))
    offset = (np.longdouble(g["length"]) + g["rim"]) / 2 + g["slot"]
    strips = [Strip(0, 0, g["counter_length"], 0, 0), Strip(0, g["gap"], g["length"], angle, 1)]
    for side in (-1, 1):
        x, z = side * offset * np.cos(angle), np.longdouble(g["gap"]) + side * offset * np.sin(angle)
        strips.append(Strip(x, z, g["rim"], angle, 1))
    a, _, z = solve(strips, N, [0, 1])
    force_x, force_z, torque = wrench(strips, a, z, 1)
    guards = charge(a[2]) + charge(a[3])
    # Positive torque about y turns z towards x: clockwise as seen here.
    return np.array([charge(a[1]), guards, force_x, force_z, -torque])


def compute(case, args):
    last = at(case["geometry"], SIZES[0])
    for N in SIZES[1:]:
        values = at(case["geometry"], N)
        change = np.max(np.abs(values - last))
        if change < 1e-13 * abs(values[3]):
            break
        last = values
    return dict(zip(("capacitance", "guard_capacitance", "force_x", "force_z", "torque_y"), values))


if __name__ == "__main__":
    store.run("guarded-strips", compute)
