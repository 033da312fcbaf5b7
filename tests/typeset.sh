#!/usr/bin/env bash
# Typesets handouts with pdflatex, a hostile title among them: no error, no line that sticks out of the page.
#   bash tests/typeset.sh PROGRAM
set -euo pipefail
program="$(realpath "$1")"
folder="$(mktemp -d)"
trap 'rm -rf "$folder"' EXIT
cd "$folder"
cat > bench.json <<'END'
{
  "title": "\\input{/etc/passwd} \\write18{id} $ # % _ ^^5c ~ { } & \" ' ` | <b> 標題 žluťoučký ä",
  "lower_plate": { "length": "110 mm", "width": "90 mm" },
  "upper_plate": { "length": "110 mm", "width": "90 mm" },
  "pose": { "gap": "6 mm", "tilt": "0 deg" },
  "hinge": { "arm": "150 mm" },
  "drive": { "voltage": "400 V", "connection": "floating" }
}
END
"$program" tabulate bench.json --per-metre --accuracy 1e-3 --gaps 4mm..12mm/9 --tilts -0.3deg..0.9deg/7 -o free.json &>/dev/null
"$program" tabulate bench.json --per-metre --accuracy 1e-3 --along-hinge --angles -10mrad..10mrad -o along.json &>/dev/null
for name in free along; do
    "$program" handout "$name.json" -o "$name.tex"
    if ! pdflatex -interaction=nonstopmode -halt-on-error -no-shell-escape "$name.tex" >"$name.out" 2>&1; then
        grep -A5 '^!' "$name.out"
        exit 1
    fi
    if grep '^Overfull' "$name.out"; then
        echo "$name.tex: something sticks out of the page" >&2
        exit 1
    fi
    echo "$name.tex: $(grep -o '([0-9]* pages\?' "$name.out" | tr -d '(')"
done
