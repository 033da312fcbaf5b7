"""Recomputes strips.json: two thin strips in the plane, from the exact map (strips_map.py), started from the spectral
method (strips_spectral.py), which also gives the potentials.

    python strips.py [PART OF A NAME ...] [--method map|spectral|panels] [--check] [--update]

--method spectral: compare with the values of that method instead; panels: print the difference in capacitance, 1e-11.
--check: also print the largest differences between the methods, relative to the capacitance and to the largest force or
torque: spectral against the map, against difference quotients, against the map of the symmetric wedge, and force on the
upper against force on the lower strip. A case takes 1 to 60 s; near contact up to 3 min.
"""
import mpmath as mm
import numpy as np
from mpmath import mp, mpf

import store
import strips_panels
import strips_wedge_map
from strips_map import exact
from strips_spectral import LD, PI, SIZES, Pair, by_difference, charge, converged, wrench

DIGITS = 60
PUSH = mpf("1e-5")                                       # the start of the map is moved off the spectral solution
NAMES = ("capacitance", "force_x", "force_z", "torque_y")


def placement(g):
    """exact decimals of the geometry -> lengths, centre and tilt as 80-bit numbers, and the same as mpmath numbers"""
    text = {k: repr(v) for k, v in g.items()}
    angle, mp_angle = LD(text["tilt_deg"]) * PI / 180, mpf(text["tilt_deg"]) * mp.pi / 180
    if "centre_distance" in g:
        d, mp_d = LD(text["centre_distance"]), mpf(text["centre_distance"])
        centre = -d * np.sin(angle / 2), d * np.cos(angle / 2)
        mp_centre = -mp_d * mp.sin(mp_angle / 2), mp_d * mp.cos(mp_angle / 2)
    else:
        centre = LD(text["shift_x"]), LD(text["gap"])
        mp_centre = mpf(text["shift_x"]), mpf(text["gap"])
    lengths = text["lower_length"], text["upper_length"]
    return (*map(LD, lengths), *centre, angle), (*map(mpf, lengths), *mp_centre, mp_angle)


def map_start(pair, push=mpf(0)):
    """h, b, Re A, Im A implied by a spectral solution: capacitance, potential at infinity, dipole"""
    h = 1 / charge(pair.a[1])
    dipole = sum(PI * (s.c * a[0] + s.a * s.e * a[1] / 2) for s, a in zip(pair.strips, pair.a))
    A = 1j * h * dipole / (2 * PI)
    return [mpf(str(q)) * (1 + push * k) for q, k in zip((h, -pair.offset * h, A.real, A.imag), (1, -1, 1, 1))]


def exact_values(pair, arguments, mp_arguments):
    with mp.workdps(DIGITS):
        if mp_arguments[4] != 0:
            try:
                return exact(*mp_arguments, map_start(pair, PUSH))
            except (RuntimeError, AssertionError, ValueError, ZeroDivisionError):
                return exact(*mp_arguments, map_start(pair))
        values = exact(*mp_arguments, map_start(pair, PUSH))
    torque = {}                                          # parallel: limit of small tilts, error of fourth order
    with mp.workdps(80):
        for k in (1, -1, 2, -2):
            p = Pair(*arguments[:4], k * LD("1e-9"), pair.N)
            torque[k] = exact(*mp_arguments[:4], k * mpf(10) ** -9, map_start(p))[3]
        return values + [(4 * (torque[1] + torque[-1]) - (torque[2] + torque[-2])) / 6]


def compute(case, args):
    with mp.workdps(DIGITS):
        arguments, mp_arguments = placement(case["geometry"])
    if args.method == "panels":
        C = strips_panels.charges(Pair(*arguments, SIZES[0]).strips, [0, 1])[1]
        print(f"   {case['name']}: panels, capacitance off by {C / case['value']['capacitance'] - 1:.1e}, relative")
        return {}
    pair, change = converged(*arguments)
    spectral = [mpf(str(v)) for v in pair.values]
    values = spectral if args.method == "spectral" else exact_values(pair, arguments, mp_arguments)
    if args.check:
        F = max(abs(v) for v in spectral[1:])
        far = lambda a, b: float(max(abs(a[0] - b[0]) / abs(a[0]), *(abs(p - q) / F for p, q in zip(a[1:], b[1:]))))
        print(f"   N {pair.N}, last change {change:.1e}, method against spectral {far(values, spectral):.1e}")
        if pair.N <= 1094:
            q = by_difference(*arguments, case["near_edge_gap"], min(pair.N, 729))
            print(f"   difference quotients {float(max(abs(mpf(str(a)) - b) for a, b in zip(q, spectral[1:])) / F):.1e}")
        on_lower = wrench(pair.strips, pair.a, pair.z, 0)
        balance = max(abs(mpf(str(a)) + b) for a, b in zip(on_lower[:2], spectral[1:3])) / F
        print(f"   force on upper plus force on lower strip {float(balance):.1e}")
        if "centre_distance" in case["geometry"]:
            with mp.workdps(DIGITS):
                C, normal, turn, error = strips_wedge_map.wedge(repr(case["geometry"]["centre_distance"]), mp_arguments[4])
                s, c = mp.sin(mp_arguments[4] / 2), mp.cos(mp_arguments[4] / 2)
                print(f"   map of the symmetric wedge {far(values, [C, -normal * s, normal * c, turn]):.1e}, "
                      f"its check {float(abs(error)):.1e}")
    value = dict(zip(NAMES, values[:3] + [-values[3]]), potential_lower=pair.offset, potential_upper=pair.offset + 1)
    return {k: 0.0 if case["uncertainty"][k] == 0 else v for k, v in value.items()}


def options(parser):
    parser.add_argument("--method", choices=("map", "spectral", "panels"), default="map")
    parser.add_argument("--check", action="store_true", help="print how well the methods agree")


if __name__ == "__main__":
    mm.mp.dps = DIGITS
    store.run("strips", compute, options)
