"""Writes occ_*.stl: the bodies of bodies.scad and blocks with round edges, built and meshed by the OpenCascade kernel.

    python3 -m venv target/venv && target/venv/bin/pip install cadquery-ocp==8.0.1.1.0
    target/venv/bin/python meshes/cad/occ_bodies.py [FOLDER]     FOLDER: where to; beside this file when left out

Lengths are millimetres, the axis of revolution is z.  The kernel keeps planes, cylinders, spheres and tori as such;
the spheroid is an ellipse turned about its axis, the dented ball a B-spline through 800 points of its whole meridian.  The
mesher puts every corner on the body; the chord height [mm] and the angle [rad] given to it stand beside each body.
"""

import sys
from math import atan2, cos, exp, pi, sin, sqrt
from pathlib import Path

from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakeWire
from OCP.BRepFilletAPI import BRepFilletAPI_MakeFillet
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeRevol
from OCP.GC import GC_MakeArcOfCircle
from OCP.Geom import Geom_Ellipse
from OCP.GeomAPI import GeomAPI_Interpolate
from OCP.collections import HArray1_gp_Pnt
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt
from OCP.StlAPI import StlAPI_Writer
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopExp import TopExp_Explorer
from OCP.TopoDS import TopoDS


def point(r, z):
    return gp_Pnt(round(r, 12), 0.0, round(z, 12))  # Rounding puts the ends of arcs on the axis exactly.


def line(a, b):
    return BRepBuilderAPI_MakeEdge(point(*a), point(*b)).Edge()


def arc(c, radius, start, end):
    """Arc about `c` from angle `start` to `end` [rad], the way the angles run."""
    at = lambda t: point(c[0] + radius * cos(t), c[1] + radius * sin(t))
    return BRepBuilderAPI_MakeEdge(GC_MakeArcOfCircle(at(start), at((start + end) / 2), at(end)).Value()).Edge()


def turned(edges):
    """Solid of a closed meridian in the plane y = 0, turned about z."""
    wire = BRepBuilderAPI_MakeWire()
    for edge in edges:
        wire.Add(edge)
    face = BRepBuilderAPI_MakeFace(wire.Wire()).Face()
    return BRepPrimAPI_MakeRevol(face, gp_Ax1(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1))).Shape()


def plate(r, low, high, f):
    """Round disc with rims rounded by `f`."""
    edges = [line((0, low), (r - f, low)), arc((r - f, low + f), f, -pi / 2, 0)]
    if 2 * f < high - low:
        edges.append(line((r, low + f), (r, high - f)))
    edges += [arc((r - f, high - f), f, 0, pi / 2), line((r - f, high), (0, high)), line((0, high), (0, low))]
    return turned(edges)


def capsule():
    side = line((10, -10), (10, 10))
    return turned([arc((0, -10), 10, -pi / 2, 0), side, arc((0, 10), 10, 0, pi / 2), line((0, 20), (0, -20))])


def bowl():
    cx = (32**2 + 30**2 - 6**2) / (2 * 30)
    cz = -sqrt(32**2 - cx**2)
    return turned([
        arc((0, 0), 30, -pi / 2, atan2(cz, cx)),
        arc((cx, cz), 2, atan2(-cz, -cx), atan2(-cz, 30 - cx)),
        arc((30, 0), 4, atan2(cz, cx - 30), pi),
        arc((0, 0), 26, 0, -pi / 2),
        line((0, -26), (0, -30)),
    ])


def dimpled():
    cz = (16**2 + 26**2 - 18**2) / (2 * 26)
    cx = sqrt(16**2 - cz**2)
    return turned([
        arc((0, 0), 20, -pi / 2, atan2(cz, cx)),
        arc((cx, cz), 4, atan2(cz, cx), atan2(26 - cz, -cx)),
        arc((0, 26), 14, atan2(cz - 26, cx), -pi / 2),
        line((0, 12), (0, -20)),
    ])


def right_half(curve, low, high):
    """Solid of the half with r > 0 of a closed meridian that crosses the axis at `low` and `high`."""
    ends = point(0, low), point(0, high)
    for a, b in (ends, ends[::-1]):
        edge = BRepBuilderAPI_MakeEdge(curve, a, b).Edge()
        along = BRepAdaptor_Curve(edge)
        if along.Value((along.FirstParameter() + along.LastParameter()) / 2).X() > 0:
            return turned([edge, line((0, low), (0, high))])


def dented():
    """Both halves of the meridian are interpolated, so that nothing has to be said about its slope at the axis."""
    n = 800
    points = HArray1_gp_Pnt(1, n)
    for i in range(n):
        t = 2 * pi * (i - n // 2) / n
        radius = 20 - 7 * exp(-((t / 0.5) ** 2))
        points.SetValue(i + 1, point(radius * sin(t), radius * cos(t)))
    curve = GeomAPI_Interpolate(points, True, 1e-9)
    curve.Perform()
    return right_half(curve.Curve(), -20, 13)


def spheroid():
    ellipse = Geom_Ellipse(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(0, -1, 0), gp_Dir(0, 0, 1)), 30, 10)
    return right_half(ellipse, -30, 30)


def block(x, y, z, f):
    """Box centred at the origin with every edge and corner rounded by `f`."""
    box = BRepPrimAPI_MakeBox(gp_Pnt(-x / 2, -y / 2, -z / 2), gp_Pnt(x / 2, y / 2, z / 2)).Shape()
    fillet = BRepFilletAPI_MakeFillet(box)
    edges = TopExp_Explorer(box, TopAbs_EDGE)
    while edges.More():
        fillet.Add(f, TopoDS.Edge(edges.Current()))
        edges.Next()
    return fillet.Shape()


# Name, body, then for each file: suffix, chord height [mm], angle [rad].
BODIES = [
    ("torus", lambda: turned([arc((30, 0), 10, 0, pi), arc((30, 0), 10, pi, 2 * pi)]), [("coarse", 1, 0.45), ("fine", 1, 0.22)]),
    ("capsule", capsule, [("coarse", 1, 0.4), ("fine", 1, 0.2)]),
    ("cylinder", lambda: plate(10, -10, 10, 2), [("coarse", 1, 0.4), ("fine", 1, 0.2)]),
    ("plate_low", lambda: plate(30, -10, -4, 3), [("coarse", 1, 0.4), ("fine", 1, 0.2)]),
    ("plate_high", lambda: plate(20, 4, 10, 2), [("coarse", 1, 0.4), ("fine", 1, 0.2)]),
    ("bowl", bowl, [("coarse", 1, 0.4), ("fine", 1, 0.25)]),
    ("spheroid", spheroid, [("coarse", 0.2, 0.3), ("fine", 0.1, 0.15)]),
    ("dimpled", dimpled, [("coarse", 1, 0.4), ("fine", 1, 0.2)]),
    ("dented", dented, [("coarse", 0.3, 0.45), ("fine", 0.1, 0.22)]),
    ("block", lambda: block(40, 30, 20, 3), [("coarse", 1, 0.4), ("middle", 1, 0.2), ("fine", 1, 0.12)]),
    ("cube_r4", lambda: block(100, 100, 100, 4), [("drawn", 1, 0.25)]),
    ("cube_r2", lambda: block(100, 100, 100, 2), [("drawn", 1, 0.25)]),
    ("cube_r1", lambda: block(100, 100, 100, 1), [("drawn", 1, 0.25)]),
]


def main():
    out = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent
    for name, body, files in BODIES:
        for suffix, height, angle in files:
            shape = body()
            BRepMesh_IncrementalMesh(shape, height, False, angle, False)
            writer = StlAPI_Writer()
            writer.ASCIIMode = False
            path = out / f"occ_{name}_{suffix}.stl"
            if not writer.Write(shape, str(path)):
                sys.exit(f"occ_bodies.py: could not write {path}")
            print(path.name, (path.stat().st_size - 84) // 50)


if __name__ == "__main__":
    main()
