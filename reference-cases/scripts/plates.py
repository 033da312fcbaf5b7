"""Recomputes plates.json: two rectangular plates in free space by boundary elements (panels.py).

    python plates.py [PART OF A NAME ...] [--panels 32 48 64] [--update]

Three numbers of panels along an edge; the defaults are those of the stored values: 32 48 64 (80 s a case, 1 GB), and
24 36 48 without a plane of symmetry or with thick plates. Fewer panels: a quick check to a few times the spread.
"""
import numpy as np

import store
from panels import reference


def options(parser):
    parser.add_argument("--panels", nargs=3, type=int, metavar="N")


def compute(case, args):
    g = case["geometry"]
    simple = g["roll_deg"] == 0 and g["shift"][1] == 0 and g["lower"]["thickness"] == g["upper"]["thickness"] == 0
    value, _ = reference(g, args.panels or ((32, 48, 64) if simple else (24, 36, 48)))
    for key in value:
        value[key] = np.where(np.array(case["spread"][key]) == 0, 0.0, value[key])      # zero by symmetry
    return value


store.run("plates", compute, options)
