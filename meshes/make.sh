#!/bin/sh
# Makes every STL file from its .scad source with OpenSCAD.
# Usage: sh meshes/make.sh [FOLDER]     FOLDER: where to; beside this file when left out
set -eu
here=$(cd "$(dirname "$0")" && pwd)
out=${1:-$here}
command -v openscad >/dev/null || { echo "make.sh: openscad is missing (Debian package openscad)" >&2; exit 1; }
mkdir -p "$out/fine"

# make SOURCE FILE FORMAT PART [DEFINITION]
make() {
    if ! openscad -q --export-format "$3" -D "part=\"$4\"" ${5:+-D "$5"} -o "$out/$2" "$here/$1.scad"; then
        echo "make.sh: openscad could not make $2 from $1.scad" >&2
        exit 1
    fi
}

for part in ball tap foot; do
    make three_ball_stack "$part.stl" binstl "$part" fn=50
    make three_ball_stack "fine/$part.stl" binstl "$part" fn=70
done
make guarded_plate_sensor sensor_plate.stl binstl plate
make guarded_plate_sensor sensor_guard.stl binstl guard
make guarded_plate_sensor sensor_drive.stl asciistl drive
