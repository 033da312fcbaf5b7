"""Recomputes the computed values of isolated.json: capacitance to infinity of the cube and the square plate (galerkin.py),
in units of 4 pi eps0 times edge or radius. Published values stay as they are.

    python isolated.py [PART OF A NAME ...] [--full] [--update]

--full takes the meshes of the stored values (20 min) and compares; the default prints the difference on coarse meshes,
a few 1e-7.
"""
import numpy as np

import store
from galerkin import cube, richardson, single

FULL = {"cube": (8, 12, 16), "square": (24, 32, 44)}
QUICK = {"cube": (4, 6, 8), "square": (8, 12, 16)}


def compute(case, args):
    if case["kind"] == "closed form":
        return dict(capacitance={"disc": 2 / np.pi, "sphere": 1.0}[case["geometry"]["body"]])
    if case["kind"] != "computed independently":
        return {}
    body = case["geometry"]["body"]
    ns = (FULL if args.full else QUICK)[body]
    C = [cube(n) if body == "cube" else single(1, 1, n) for n in ns]
    value, order = richardson(ns, C)
    value /= 4 * np.pi
    print(f"   {body}: n = {ns}, observed order {order:.2f}, difference {value - case['value']['capacitance']:.1e}")
    return dict(capacitance=value) if args.full else {}


if __name__ == "__main__":
    store.run("isolated", compute, lambda p: p.add_argument("--full", action="store_true", help="the stored meshes"))
