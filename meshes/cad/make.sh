#!/bin/sh
# Makes scad_*.stl from bodies.scad with OpenSCAD and occ_*.stl from occ_bodies.py with the OpenCascade kernel.
# Usage: sh meshes/cad/make.sh [FOLDER]     FOLDER: where to; beside this file when left out
# PYTHON names an interpreter that has cadquery-ocp; without it only the OpenSCAD files are made.
set -eu
here=$(cd "$(dirname "$0")" && pwd)
out=${1:-$here}
command -v openscad >/dev/null || { echo "make.sh: openscad is missing (Debian package openscad)" >&2; exit 1; }
mkdir -p "$out"

# make PART SUFFIX TURN STEP
make() {
    if ! openscad -q --export-format binstl -D "part=\"$1\"" -D turn="$3" -D step="$4" \
        -o "$out/scad_$1_$2.stl" "$here/bodies.scad"; then
        echo "make.sh: openscad could not make $1" >&2
        exit 1
    fi
}

for part in torus capsule cylinder plate_low plate_high spheroid dimpled dented; do
    make "$part" coarse 36 15
    make "$part" fine 64 7.5
done
make bowl coarse 36 15
make bowl fine 60 10
make block coarse 24 15
make block middle 36 10
make block fine 72 5
if [ -n "${PYTHON:-}" ]; then
    "$PYTHON" "$here/occ_bodies.py" "$out"
else
    echo "make.sh: PYTHON is not set, occ_*.stl left as they are" >&2
fi
