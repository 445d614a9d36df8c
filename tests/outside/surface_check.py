"""Opens the surface file of a solved case with meshio and with VTK and holds it against its record.

    python surface_check.py FOLDER      FOLDER holds record.json and the surface file it names

Both readers must find the same panels and arrays.  The unit charges summed over the panels of a row
give the matrix before its corrections, so they agree with the record within 1 %; the field of a voltage
case is the superposition of the unit charges over the permittivity.
"""

import hashlib
import json
import pathlib
import sys

import meshio
import numpy as np
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridReader

EPS0 = 8.8541878188e-12  # F/m, CODATA 2022
CORRECTION_REL_TOL = 1e-2  # flat panels and residuals move an entry by less than this
FLOOR = 1e-3  # of sqrt(C_ii C_jj), for small entries
FIELD_REL_TOL = 1e-9


def by_vtk(path):
    """Points, triangles and cell arrays as VTK reads them."""
    reader = vtkXMLUnstructuredGridReader()
    reader.SetFileName(str(path))
    reader.Update()
    grid = reader.GetOutput()
    if reader.GetErrorCode() or not grid.GetNumberOfCells():
        sys.exit(f"surface_check: VTK reads nothing from {path}")
    data = grid.GetCellData()
    arrays = {data.GetArrayName(k): vtk_to_numpy(data.GetArray(k)) for k in range(data.GetNumberOfArrays())}
    triangles = vtk_to_numpy(grid.GetCells().GetConnectivityArray()).reshape(-1, 3)
    return vtk_to_numpy(grid.GetPoints().GetData()), triangles, arrays


def by_meshio(path):
    """The same as meshio reads them."""
    mesh = meshio.read(path)
    arrays = {name: np.asarray(blocks[0]) for name, blocks in mesh.cell_data.items()}
    return mesh.points, mesh.cells_dict["triangle"], arrays


def expect(holds, what):
    if not holds:
        sys.exit(f"surface_check: {what}")


def main(folder):
    folder = pathlib.Path(folder)
    record = json.loads((folder / "record.json").read_text())
    path = folder / record["surface_file"]["path"]
    expect(hashlib.sha256(path.read_bytes()).hexdigest() == record["surface_file"]["sha256"], "hash of the file")
    points, triangles, arrays = by_vtk(path)
    points2, triangles2, arrays2 = by_meshio(path)
    expect(np.array_equal(points, points2) and np.array_equal(triangles, triangles2), "VTK and meshio: corners")
    expect(sorted(arrays) == sorted(arrays2), f"VTK finds {sorted(arrays)}, meshio {sorted(arrays2)}")
    for name, values in arrays.items():
        expect(np.array_equal(values.ravel(), arrays2[name].ravel()), f"VTK and meshio: {name}")
        expect(np.isfinite(values).all(), f"{name} holds a number that is not finite")

    rows = record["electrodes"]
    panels = len(triangles)
    expect(panels == record["effort"]["panels"], f"{panels} panels, the record says {record['effort']['panels']}")
    a, b, c = np.moveaxis(points[triangles], 1, 0)
    areas = 0.5 * np.linalg.norm(np.cross(b - a, c - a), axis=1)
    density = [arrays[f"unit_charge_{name}_C_per_m2_per_V"] for name in rows]
    expect(all(arrays[f"residual_{name}"].size == 6 * panels for name in rows), "six residuals a panel")

    stored = np.array(record["capacitance_farad"])
    raw = np.array([[(d * areas)[arrays["row"] == i].sum() for d in density] for i in range(len(rows))])
    scale = np.sqrt(np.outer(stored.diagonal(), stored.diagonal()))
    off = np.abs(raw - stored) / (np.abs(stored) + FLOOR / CORRECTION_REL_TOL * scale)
    expect((off <= CORRECTION_REL_TOL).all(), f"charges summed over panels give\n{raw}\nthe record says\n{stored}")

    eps_r = float(record["case"]["resolved"].get("surroundings.relative_permittivity", "1"))
    for case in record["voltage_cases"]:
        field = arrays[f"field_{case['name']}_V_per_m"]
        volts = [case["potentials_volt"][name] for name in rows]
        summed = sum(v * d for v, d in zip(volts, density)) / (EPS0 * eps_r)
        worst = np.abs(field - summed).max() / np.abs(summed).max()
        expect(worst <= FIELD_REL_TOL, f"{case['name']}: field and unit charges differ by {worst:.1e}")
    print(
        f"meshio and VTK: {panels} panels, {len(arrays)} arrays, charges within {off.max():.1e} of the record, "
        f"fields of {len(record['voltage_cases'])} voltage cases"
    )


if __name__ == "__main__":
    main(*sys.argv[1:])
