"""Reading, writing and comparing the files of reference cases.

A generator recomputes the cases of one file from the geometry stored there. `run` does the rest: it prints, per case,
the largest difference from the stored value in units of the stored uncertainty, and exits with 1 if one is above 1.
With `--update` the new values replace the stored ones; names, sources and remarks stay as they are.
"""
import argparse
import json
import os
import sys
import time

import numpy as np

FOLDER = os.path.normpath(os.path.join(os.path.dirname(os.path.abspath(__file__)), ".."))
LINE_WIDTH = 118


def path(family):
    return os.path.join(FOLDER, family + ".json")


def load(family):
    with open(path(family), encoding="utf-8") as file:
        return json.load(file)


def save(doc):
    with open(path(doc["family"]), "w", encoding="utf-8") as file:
        file.write(pretty(doc) + "\n")


def pretty(item, indent=0, used=0):
    """JSON with everything that fits in a line on one line; `used` is the width of the key in front."""
    flat = json.dumps(item, ensure_ascii=False, allow_nan=False)
    if not isinstance(item, (dict, list)) or (indent > 0 and indent + used + len(flat) < LINE_WIDTH):
        return flat
    inner = " " * (indent + 1)
    if isinstance(item, dict):
        keys = [json.dumps(k, ensure_ascii=False) + ": " for k in item]
        lines = [inner + k + pretty(v, indent + 1, len(k)) for k, v in zip(keys, item.values())]
        return "{\n" + ",\n".join(lines) + "\n" + " " * indent + "}"
    return "[\n" + ",\n".join(inner + pretty(v, indent + 1) for v in item) + "\n" + " " * indent + "]"


def plain(value):
    """numpy and mpmath numbers to floats, arrays to lists, -0.0 to 0.0"""
    if np.ndim(value) > 0:
        return [plain(v) for v in value]
    return float(value) + 0.0


def worst(value, stored, uncertainty):
    """largest |value - stored| / uncertainty of a number, vector or matrix; an exact value has uncertainty 0"""
    d, u = np.abs(np.subtract(value, stored)).ravel(), np.ravel(uncertainty).astype(float)
    return float(np.max(np.where(d == 0, 0.0, d / np.maximum(u, 1e-300))))


def run(family, compute, options=None):
    """compute(case, args) -> {quantity: number, vector or matrix} (a subset of the case's values; empty: skipped)"""
    parser = argparse.ArgumentParser(description=sys.modules["__main__"].__doc__,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("part", nargs="*", help="only cases whose name contains one of these; default: all")
    parser.add_argument("--update", action="store_true", help="write the new values into the file")
    if options:
        options(parser)
    args = parser.parse_args()
    doc = load(family)
    count, largest = 0, 0.0
    for case in doc["cases"]:
        if args.part and not any(p in case["name"] for p in args.part):
            continue
        start = time.time()
        new = {k: plain(v) for k, v in compute(case, args).items()}
        if not new:
            continue
        scale = case.get("uncertainty", case.get("spread"))
        ratio = {k: worst(v, case["value"][k], scale[k]) for k, v in new.items()}
        key = max(ratio, key=ratio.get)
        count, largest = count + 1, max(largest, ratio[key])
        print(f"{case['name']:44s} {len(new):2d} values, worst {key} {ratio[key]:.2g} of its uncertainty, "
              f"{time.time() - start:.1f} s", flush=True)
        if args.update:
            case["value"].update(new)
    print(f"{family}: {count} cases recomputed, worst difference {largest:.2g} of the uncertainty")
    if args.update:
        save(doc)
    sys.exit(0 if largest <= 1 else 1)
