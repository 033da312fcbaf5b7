"""Breaks the program in one line at a time and shows that `tiltgap validate --quick` notices.

    python tests/mutations/run.py [PART ...]     only mutations whose name contains one of the parts

Each mutation is applied to a copy of the tree, built there and validated; caught is exit code 1. Build files go to
CARGO_TARGET_DIR, or into the copy. Takes a minute or more for each; run by hand, since it builds the program anew every
time. Exits with 1 if a mutation is missed, or if the program without any does not pass.
"""
import os
import shutil
import subprocess
import sys
import tempfile
import time

ROOT = os.path.normpath(os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", ".."))

# name, file, what stands there (once), what stands there instead
MUTATIONS = [
    ("nothing changed", "meshes/src/pose.rs", "row(c, -s), row(s, c)", "row(c, -s), row(s, c)"),
    ("sign of the roll", "meshes/src/pose.rs", "row(c, -s), row(s, c)", "row(c, s), row(-s, c)"),
    ("tilt off by 1 %", "meshes/src/pose.rs", "self.tilt_rad.sin_cos()", "(1.01 * self.tilt_rad).sin_cos()"),
    ("factor 2 in the energy", "solver/src/operator.rs", "/ (8.0 * det);", "/ (4.0 * det);"),
    ("Robin weight doubled", "solver/src/operator.rs", "dot(middle, middle) / 4.0;", "dot(middle, middle) / 2.0;"),
    ("film ignored", "meshes/src/grid.rs", "permittivity: f.permittivity_ratio,", "permittivity: 1.0,"),
    ("half of the guard slot", "meshes/src/grid.rs", "grown(g.slot_m / size)", "grown(0.5 * g.slot_m / size)"),
    ("wedge factor of the force", "solver/src/wedge.rs", "(middle * middle * (1.0 - e * e))", "(middle * middle)"),
    ("hinge on the wrong side", "solver/src/assess.rs", "[-hinge.arm_m, 0.0, hinge.height_m]",
     "[hinge.arm_m, 0.0, hinge.height_m]"),
    ("no extrapolation", "solver/src/extrapolate.rs", "let value = fit(q, y, 3);", "let value = y[2];"),
    ("error bar too small", "solver/src/extrapolate.rs", "const FIT_WEIGHT: f64 = 0.5;", "const FIT_WEIGHT: f64 = 0.01;"),
    ("edge power 2", "meshes/src/axis.rs", "const EDGE_POWER: f64 = 3.0;", "const EDGE_POWER: f64 = 2.0;"),
    ("stress without its half", "solver/src/wrench.rs", "let half = 0.5 * dot(g, g);", "let half = dot(g, g);"),
    ("ideal force without its half", "solver/src/assess.rs", "self.voltage_v.powi(2) / (2.0 * gap)",
     "self.voltage_v.powi(2) / gap"),
    ("unit of the torque", "solver/src/assess.rs", "torque_nm: energy * size }", "torque_nm: energy }"),
    ("floating pair at half the voltage each", "solver/src/level.rs", "-columns[1] / total", "-0.5"),
    ("permittivity of vacuum", "solver/src/assess.rs", "8.854_187_818_8e-12", "8.854_178_818_8e-12"),
    ("shift left out", "meshes/src/pose.rs", "[self.shift_m[0], self.shift_m[1], self.gap_m]",
     "[0.0, self.shift_m[1], self.gap_m]"),
]


def run(name, file, old, new, tree):
    path = os.path.join(tree, file)
    with open(path, encoding="utf-8") as source:
        text = source.read()
    if text.count(old) != 1:
        return f"the line is there {text.count(old)} times", False
    with open(path, "w", encoding="utf-8") as source:
        source.write(text.replace(old, new))
    try:
        built = subprocess.run(["cargo", "build", "--release", "--quiet"], cwd=tree, capture_output=True, text=True)
        if built.returncode:
            return "does not build:\n" + built.stderr[-2000:], False
        target = os.environ.get("CARGO_TARGET_DIR", os.path.join(tree, "target"))
        program = os.path.join(target, "release", "tiltgap")
        done = subprocess.run([program, "validate", "--quick"], capture_output=True, text=True)
    finally:
        with open(path, "w", encoding="utf-8") as source:
            source.write(text)
    expected = 0 if old == new else 1
    said = done.stdout.split("\nVerdict\n")[-1].split("What fails")[0].replace("\n", " ").strip()
    said = said or done.stderr.strip().splitlines()[-1]
    return f"exit {done.returncode}: {said}", done.returncode == expected


def main():
    parts = sys.argv[1:]
    missed = []
    with tempfile.TemporaryDirectory() as folder:
        tree = os.path.join(folder, "tree")
        shutil.copytree(ROOT, tree, ignore=shutil.ignore_patterns("target", ".git"))
        for name, *mutation in MUTATIONS:
            if parts and not any(p in name for p in parts):
                continue
            start = time.time()
            said, good = run(name, *mutation, tree)
            print(f"{'caught' if good and name != MUTATIONS[0][0] else 'passes' if good else 'MISSED'}  "
                  f"{name} ({time.time() - start:.0f} s): {said}", flush=True)
            if not good:
                missed.append(name)
    print(f"{len(missed)} missed" + "".join("\n  " + name for name in missed))
    sys.exit(1 if missed else 0)


if __name__ == "__main__":
    main()
