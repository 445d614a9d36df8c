"""Holds freshly made STL files against the ones kept: facets, volume, overall box.

    python mesh_check.py KEPT FRESH
"""

import pathlib
import sys

import meshio
import numpy as np

VOLUME_REL_TOL = 1e-6  # single precision rounds corners of these parts to 1e-7 of their size


def measures(path):
    """Number of facets, volume in mm^3, lower and upper corner of the box in mm."""
    with np.errstate(over="ignore"):  # meshio tries the size law of binary files on ASCII ones
        mesh = meshio.read(path)
    corners = np.asarray(mesh.points, dtype=float)[mesh.cells_dict["triangle"]]
    # About the middle of the part: far from the origin the sum would cancel.
    a, b, c = np.moveaxis(corners - corners.mean(axis=(0, 1)), 1, 0)
    volume = np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6
    return len(corners), volume, corners.min(axis=(0, 1)), corners.max(axis=(0, 1))


def main(kept, fresh):
    kept, fresh = pathlib.Path(kept), pathlib.Path(fresh)
    names = sorted(str(p.relative_to(kept)) for p in kept.rglob("*.stl"))
    again = sorted(str(p.relative_to(fresh)) for p in fresh.rglob("*.stl"))
    if not names or names != again:
        sys.exit(f"mesh_check: kept {names}, made again {again}")
    for name in names:
        n, volume, lower, upper = measures(kept / name)
        n2, volume2, lower2, upper2 = measures(fresh / name)
        off = abs(volume2 / volume - 1)
        box = max(np.abs(lower2 - lower).max(), np.abs(upper2 - upper).max())
        if n != n2 or not off <= VOLUME_REL_TOL or not box <= VOLUME_REL_TOL * np.abs(upper - lower).max():
            sys.exit(f"mesh_check: {name}: {n} facets, {volume} mm3 kept; {n2}, {volume2} made again; box off {box}")
    print(f"OpenSCAD makes {len(names)} STL files again: same facets, volumes and boxes")


if __name__ == "__main__":
    main(*sys.argv[1:])
