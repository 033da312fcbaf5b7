"""Recomputes wedge-squares.json: two equal thin square plates, side 1, tilted symmetrically about their bisector plane.

    python wedge_squares.py [PART OF A NAME ...] [--panels 8 12 16] [--collocation 24 36 48] [--update]

Galerkin panels (galerkin.py), n per half side, extrapolated: 2 min a case. With --collocation the values come from the
collocation panels of plates.json (panels.py) in our placement instead, an independent check: 25 s a case.
"""
import numpy as np

import panels
import store
from galerkin import richardson, wedge_pair


def quantities(d, beta, C, normal_force, torque_centre):
    """capacitance, force towards the bisector, torque about the upper plate's centre -> the quantities of the file"""
    centre = 1 / (2 * beta)                              # distance of the plates' centres from the apex; side and V are 1
    opening = 2 * np.arcsin(d / (2 * centre))
    log, F0 = np.log((centre + 0.5) / (centre - 0.5)), 1 / (2 * d * d)
    torque_apex = torque_centre + normal_force * centre * np.cos(opening / 2)
    torque_edge = torque_centre + normal_force * np.cos(opening / 2) / 2
    return dict(capacitance=C, capacitance_factor=C * opening / log, capacitance_factor_parallel=C * d,
                force=normal_force, force_factor=normal_force / F0, torque_apex=torque_apex,
                torque_factor=torque_apex * 2 * opening ** 2 / log, torque_centre_factor=torque_centre / F0,
                torque_near_edge_factor=torque_edge / F0)


def compute(case, args):
    d, beta = case["mid_gap"], case["beta"]
    centre = 1 / (2 * beta)
    opening = 2 * np.arcsin(d / (2 * centre))
    if args.collocation:
        value, _ = panels.reference(case["geometry"], args.collocation)
        s, c = np.sin(opening / 2), np.cos(opening / 2)
        force = value["force_neutral"]
        return quantities(d, beta, value["capacitance_neutral"], force[0] * s - force[2] * c, value["torque_neutral"][1])
    runs = np.array([wedge_pair(centre - 0.5, centre + 0.5, 1, opening, n) for n in args.panels])
    C, by_distance = runs[:, 0], runs[:, 2]
    by_turn = runs[:, 1] - by_distance * centre * np.cos(opening / 2)          # about the centre: no large difference left
    C, turn, distance = (richardson(args.panels, v)[0] for v in (C, by_turn, by_distance))
    return quantities(d, beta, C, -distance / 2, -turn / 2)


def options(parser):
    parser.add_argument("--panels", nargs="+", type=int, default=[8, 12, 16], metavar="N")
    parser.add_argument("--collocation", nargs=3, type=int, metavar="N")


if __name__ == "__main__":
    store.run("wedge-squares", compute, options)
