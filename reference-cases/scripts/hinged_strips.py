"""Recomputes hinged-strips.json: thin strips of length 1; the lower one fixed, the upper one hinged at its end above the
end of the lower one, at the height d0, and turned by the angle alpha (tip raised for alpha > 0). Free space, neutral.

    python hinged_strips.py [PART OF A NAME ...] [--update]

Method: strips_nystrom.py.
"""
import numpy as np

import store
from strips_nystrom import solve


def ideal(d0, rise):
    """capacitance and hinge torque of lamellas with the gap d0 + rise u, u from 0 to 1 along the plate"""
    if rise == 0:
        return 1 / d0, 1 / (4 * d0 ** 2)
    f = rise / d0
    return np.log1p(f) / rise, (np.log1p(f) - f / (1 + f)) / (2 * rise ** 2)


def compute(case, args):
    d0, rise = case["hinge_gap"], case["tip_rise"]
    alpha = np.arcsin(rise)
    N = int(1.2 * min(1150, max(64, 26 / min(d0, d0 + rise))))
    C, force, torque = solve(((0, d0), (np.cos(alpha), d0 + rise)), ((0, 0), (1, 0)), N, pivot=(0, d0))
    if rise == 0:
        force[0] = 0.0                                   # by symmetry
    C0, T0 = ideal(d0, rise)
    return dict(capacitance=C, force_x=force[0], force_z=force[1], torque_hinge=torque,
                capacitance_factor=C / C0, torque_factor=torque / T0)


if __name__ == "__main__":
    store.run("hinged-strips", compute)
