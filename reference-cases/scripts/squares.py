"""Recomputes squares.json: two equal thin square plates, side 1, in free space, by Galerkin panels (galerkin.py).

    python squares.py [PART OF A NAME ...] [--panels 8 12 16] [--update]

Numbers of panels per half side; the values are extrapolated from the last three. Stored: 12 16 24 for the neutral pair
(80 s a case), 8 12 16 for both plates at one potential (15 s).
"""
import numpy as np

import store
from galerkin import facing_pair, richardson


def compute(case, args):
    d = case["geometry"]["gap"]
    runs = np.array([facing_pair(1, 1, d, n) for n in args.panels])
    pair, even, pair_slope, even_slope = (richardson(args.panels, runs[:, k])[0] for k in range(4))
    capacitance, force = pair * d, -pair_slope * d ** 2
    return dict(capacitance_factor=capacitance, force_factor=force, even_capacitance=even,
                capacitance_factor_grounded=capacitance + even * d / 4,
                force_factor_grounded=force - even_slope * d ** 2 / 4)


def options(parser):
    parser.add_argument("--panels", nargs="+", type=int, default=[8, 12, 16], metavar="N")


if __name__ == "__main__":
    store.run("squares", compute, options)
