"""Validates every file of reference cases, and recomputes the cheap closed forms.

    python check.py

* against schema.json; file name = family; names of cases unique; every value defined under `quantities`, with an
  uncertainty or spread of the same shape; quick cases and scripts present; every [Key] of the files, the
  scripts and the Rust sources in bibliography.md, every entry there used
* strips-parallel, discs, pull-in, wedge-ideal, disc-wedge, cross-capacitance, guard-gaps and closed-domains in full, with
  a second route to the wedge formulas, of strips and of discs, and to the rectangle
* discs: the harmonics against the sum over their charge; coaxial thin pairs of equal and unequal size from Love's equations, two tilted pairs and a thick pair again
* figures that two files have in common: squares with plates, the 180 degree wedge with coplanar strips, hinged strips with
  tip rise 0 with parallel strips, parallel strips with strips.json

One line per item; exit 1 if something is wrong. Takes half a minute.
"""
import os
import re
import sys
from types import SimpleNamespace

import jsonschema
import mpmath as mp
import numpy as np

import closed_domains
import cross_capacitance
import disc_wedge
import discs
import discs_thick
import discs_tilted
import guard_gaps
import pull_in
import spheroid
import store
import strips_parallel
import wedge_ideal

KEY = re.compile(r"\\?\[([A-Z][A-Za-z]*[0-9]{4})\\?\]")
failures = []


def verdict(ok, text):
    print(("ok     " if ok else "WRONG  ") + text, flush=True)
    if not ok:
        failures.append(text)


def families():
    return sorted(f[:-5] for f in os.listdir(store.FOLDER) if f.endswith(".json") and f != "schema.json")


def problems(family, doc):
    """what the schema cannot say"""
    if doc["family"] != family:
        yield f"family {doc['family']} in the file {family}.json"
    names = [c["name"] for c in doc["cases"]]
    if len(set(names)) < len(names):
        yield "two cases of one name"
    for key in doc.get("kinds", {}):
        if key not in doc["quantities"]:
            yield f"kind of an unknown quantity {key}"
    for name in doc.get("quick", []):
        if name not in names:
            yield f"quick case {name} is not there"
    for script in doc["scripts"]:
        if not os.path.exists(os.path.join(store.FOLDER, "scripts", script)):
            yield f"no script {script}"
    for case in doc["cases"]:
        bounds = case.get("uncertainty", case.get("spread"))
        if set(bounds) != set(case["value"]):
            yield f"{case['name']}: uncertainty or spread does not match the values"
            continue
        for key, value in case["value"].items():
            if key not in doc["quantities"]:
                yield f"{case['name']}: {key} is not defined"
            if np.shape(value) != np.shape(bounds[key]):
                yield f"{case['name']}: uncertainty or spread of {key} has another shape"
            elif np.min(bounds[key]) < 0:
                yield f"{case['name']}: negative uncertainty or spread of {key}"
        for key, text in case.get("digits", {}).items():
            if float(text) != case["value"][key]:
                yield f"{case['name']}: digits and value of {key} differ"


def check_files(docs):
    schema = store.load("schema")
    jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(schema)
    cited = set()
    for family, doc in docs.items():
        wrong = [f"{'/'.join(map(str, e.absolute_path))}: {e.message[:100]}" for e in validator.iter_errors(doc)]
        wrong = wrong or list(problems(family, doc))
        verdict(not wrong, f"{family}: {len(doc['cases'])} cases" + "".join("\n         " + w for w in wrong[:10]))
        cited |= set(KEY.findall(store.pretty(doc)))
    with open(os.path.join(store.FOLDER, "bibliography.md"), encoding="utf-8") as file:
        listed = set(re.findall(r"^\| \[([A-Za-z0-9]+)\]", file.read(), re.M))
    for folder, inner, names in os.walk(os.path.join(store.FOLDER, "..")):
        inner[:] = [d for d in inner if d != "target" and not d.startswith(".")]
        for name in names:
            if name.endswith((".py", ".rs")):
                with open(os.path.join(folder, name), encoding="utf-8") as file:
                    cited |= set(KEY.findall(file.read()))
    verdict(cited == listed, f"bibliography: {len(listed)} entries, missing {sorted(cited - listed)}, "
                             f"unused {sorted(listed - cited)}")


def check_recomputed(docs):
    for family, module in (("strips-parallel", strips_parallel), ("discs", discs), ("pull-in", pull_in),
                           ("wedge-ideal", wedge_ideal), ("disc-wedge", disc_wedge),
                           ("cross-capacitance", cross_capacitance), ("guard-gaps", guard_gaps),
                           ("closed-domains", closed_domains)):
        worst, count = 0.0, 0
        for case in docs[family]["cases"]:
            new = {k: store.plain(v) for k, v in module.compute(case, SimpleNamespace()).items()}
            count += len(new)
            worst = max(worst, *(store.worst(v, case["value"][k], case["uncertainty"][k]) for k, v in new.items()))
        verdict(worst <= 1, f"{family}: {count} values recomputed, worst difference {worst:.2g} of the uncertainty")


def check_second_routes():
    with mp.workdps(30):
        far = 0
        for beta in map(mp.mpf, ("-0.5", "0.05", "0.9")):
            a, b = wedge_ideal.lamella(beta, mp.mpf(2)), wedge_ideal.lamella_by_quadrature(beta, mp.mpf(2))
            far = max(far, *(abs(x / y - 1) for x, y in zip(a, b)))
        verdict(far < mp.mpf("1e-20"), f"lamellas against quadrature: {float(far):.0e}")
        with mp.workdps(15):
            tilted = mp.mpf("0.3"), mp.mpf("-0.2"), mp.mpf("0.5")
            far = max(abs(x / y - 1) for x, y in zip(disc_wedge.disc(*tilted), disc_wedge.disc_by_quadrature(*tilted)))
        verdict(far < 1e-13, f"tilted disc against quadrature: {float(far):.0e}")
        q, t = mp.mpf(2), mp.radians(5)
        _, force, torque = wedge_ideal.sector(mp.mpf(1), q, t)
        by_angle = -mp.diff(lambda s: wedge_ideal.sector(mp.mpf(1), q, s)[0], t) / 2
        by_load = mp.quad(lambda r: 1 / (2 * (t * r) ** 2), [1, q])
        far = max(abs(by_angle / torque - 1), abs(by_load / force - 1))
        verdict(far < mp.mpf("1e-12"), f"ideal sector against derivative and integral: {float(far):.0e}")
        far = max(abs(x / y - 1) for a in (1, 2) for x, y in
                  zip(cross_capacitance.rectangle(mp.mpf(a)), cross_capacitance.rectangle_by_series(mp.mpf(a))))
        verdict(far < mp.mpf("1e-20"), f"cross-capacitance of rectangles against the series: {float(far):.0e}")


def check_harmonics():
    """potential and field of a disc from the harmonics, and from its charge point by point"""
    axes = discs_tilted.rotation(0.7, -0.4)
    disc = discs_tilted.Disc(1.3, (0.2, -0.1, 0.4), axes, (48, 24), False)
    rng = np.random.default_rng(1)
    w = np.where(np.concatenate([spheroid.degrees(m, disc.top) for m, _ in disc.modes]) < 9,
                 rng.standard_normal(disc.start[-1]), 0.0)
    points = np.array([[1.5, 0.7, 1.9], [-0.9, 1.1, -1.2], [0.3, -2.0, 0.5]])
    apart = points[:, None] - disc.points.reshape(-1, 3)
    r, q = np.linalg.norm(apart, axis=2), disc.charge(w).ravel()
    far = max(np.max(np.abs(disc.potential(points, w) - (q / (4 * np.pi * r)).sum(axis=1))),
              np.max(np.abs(disc.field(points, w) - np.einsum("q,pqk->pk", q, apart / (4 * np.pi * r[..., None] ** 3)))))
    verdict(far < 1e-12, f"harmonics of a disc, potential and field against the sum over its charge: {far:.1e}")


def check_discs(docs):
    far, count = 0.0, 0
    for case in docs["discs-tilted"]["cases"]:
        g, value, bound = case["geometry"], case["value"], case["uncertainty"]
        if g["tilt_deg"] == g["roll_deg"] == 0 and g["shift"] == [0, 0]:
            matrix, slope = discs.unequal(g["lower"]["diameter"] / 2, g["upper"]["diameter"] / 2, g["gap"])
            far = max(far, store.worst(matrix, value["matrix"], bound["matrix"]),
                      store.worst([0, 0, slope[1, 1] / 2], value["force_grounded"], bound["force_grounded"]))
            count += 1
    verdict(far <= 1, f"discs-tilted: {count} coaxial pairs against Love's equations, "
                      f"worst difference {far:.2g} of the uncertainty")
    far = 0.0
    for case in docs["discs-tilted"]["cases"]:
        if case["name"] in ("gap 0.1 tilt 2", "gap 2 upper 1.5 shift 0.5 -1 tilt 40 roll 20"):
            new = discs_tilted.compute(case, SimpleNamespace(order=None, check=False))
            far = max(far, *(store.worst(v, case["value"][k], case["uncertainty"][k]) for k, v in new.items()))
    verdict(far <= 1, f"discs-tilted: two tilted pairs recomputed, worst difference {far:.2g} of the uncertainty")
    case = docs["discs-thick"]["cases"][0]
    new = discs_thick.values(case["geometry"], 18)
    far = max(store.worst(v, case["value"][k], case["uncertainty"][k]) for k, v in new.items())
    verdict(far <= 1, f"discs-thick: {case['name']} with fewer panels, difference {far:.2g} of the uncertainty")


def check_between_files(docs):
    values = {f: {c["name"]: c["value"] for c in d["cases"]} for f, d in docs.items()}
    far = 0
    for gap in (0.1, 0.2):
        plate, square = values["plates"][f"gap {gap:g}"], values["squares"][f"gap {gap:g}"]
        scale = 2 * gap ** 2
        far = max(far, abs(plate["capacitance_neutral"] * gap / square["capacitance_factor"] - 1),
                  abs(plate["matrix"][1][1] * gap / square["capacitance_factor_grounded"] - 1),
                  abs(-plate["force_neutral"][2] * scale / square["force_factor"] - 1),
                  abs(-plate["force_grounded"][2] * scale / square["force_factor_grounded"] - 1))
    verdict(far < 8e-6, f"squares against plates: {far:.1e}")
    far = max(abs(v["capacitance"] / values["wedge-strips"]["opening 180 ratio " + name.split()[-1]]["capacitance"] - 1)
              for name, v in values["closed-domains"].items() if name.startswith("coplanar"))
    verdict(far < 1e-13, f"wedge strips at 180 degrees against coplanar strips: {far:.1e}")
    far = max(abs(values["hinged-strips"][f"hinge gap {d:g} tip rise 0"]["capacitance_factor"]
                  / values["strips-parallel"][f"gap {d:g}"]["capacitance_factor"] - 1) for d in (0.02, 0.05, 0.1, 0.2))
    verdict(far < 1e-13, f"hinged strips with tip rise 0 against parallel strips: {far:.1e}")
    far = 0
    for d in (0.02, 0.05, 0.1, 0.2, 0.5):
        a, b = values["strips"][f"tilted gap {d:g} tilt 0"], values["strips-parallel"][f"gap {d:g}"]
        far = max(far, abs(a["capacitance"] / b["capacitance"] - 1), abs(-a["force_z"] * 2 * d * d / b["force_factor"] - 1))
    verdict(far < 1e-14, f"strips against parallel strips: {far:.1e}")


def main():
    docs = {f: store.load(f) for f in families()}
    check_files(docs)
    check_recomputed(docs)
    check_second_routes()
    check_harmonics()
    check_discs(docs)
    check_between_files(docs)
    count = sum(len(c["value"]) for d in docs.values() for c in d["cases"])
    print(f"{count} values in {len(docs)} files, {len(failures)} failure(s)")
    sys.exit(1 if failures else 0)


if __name__ == "__main__":
    main()
