"""Writes cad.csv beside this file: capacitance and surface field of the true bodies of revolution in meshes/cad,
and of the rounded blocks there (blocks.py), and mutual capacitance of sheets with a narrow gap (sheets.py), computed
apart from the program.

Run by hand from the root of the project; nothing runs it in the tests:

    python3 -m venv target/venv && target/venv/bin/pip install numpy scipy mpmath
    target/venv/bin/python tests/reference/axisymmetric.py --check     # closed forms only
    target/venv/bin/python tests/reference/axisymmetric.py

Method.  On the meridian x(s) the charge density of a body of revolution obeys

    ∫ E(s') r' k(x, x') ds' / (4π) = V(x),    k = ∫ dφ / |x − x'| = 4 K(m) / ρ,    E = σ/ε₀,
    ρ² = (r + r')² + (z − z')²,    m = 4 r r' / ρ²

with K the complete elliptic integral of the first kind (Jackson, Classical Electrodynamics, 3rd ed. 1999, problem 5.10
for the ring; Kellogg, Foundations of Potential Theory, 1929, ch. III, for the logarithm of m → 1).  E is a polynomial on
every panel of the meridian, tested at its Gauss points.  Panels shrink by GRADE towards each joint of two arcs, where
the curvature jumps and E has a term s ln s.  Where a panel is near the point, or near its image (−r, z) across the
axis, the integral is cut by bisection until each piece is as far away as it is long: every piece then converges
geometrically, the logarithm included.  The uncertainty of a row is the change between two resolutions, at least
FLOOR of the value.

Where the place of a maximum is a ring, r and z are those of the ring; of two mirror places (torus, capsule, cylinder,
spheroid) the one with z ≥ 0 is named.  The maximum of the large plate of the pair is flat: middle of its upper face.
"""

import csv
import sys
from math import acosh, atan2, cos, pi, sqrt
from pathlib import Path

import numpy as np
from numpy.polynomial import legendre
from scipy.optimize import minimize_scalar
from scipy.special import ellipkm1

import blocks
import sheets

HERE = Path(__file__).parent
EPS0 = 8.8541878188e-12  # F/m, CODATA 2022
GRADE = 0.25  # ratio of neighbouring panels towards a joint
FLOOR = 1e-9  # least relative uncertainty claimed
DEPTH = 46  # bisections towards the point itself: the last piece is 1e-14 of the panel
NEAR = 1.0  # panels closer than this many of their lengths are cut


class Curve:
    """One smooth piece of a meridian: `at(t)` gives (r, z), `along(t)` the derivative, t from 0 to 1."""

    def __init__(self, at, along, on_axis=(False, False), smooth=(False, False)):
        self.at, self.along, self.on_axis, self.smooth = at, along, on_axis, smooth


def line(a, b):
    a, b = np.array(a, float), np.array(b, float)
    at = lambda t: a[:, None] + (b - a)[:, None] * t
    return Curve(at, lambda t: (b - a)[:, None] + 0 * t, (a[0] == 0, b[0] == 0))


def arc(c, radius, start, end, smooth=(False, False)):
    """Arc about `c` between two angles; an end with r = 0 within rounding is an end on the axis."""
    angle = lambda t: start + (end - start) * t
    at = lambda t: np.array([np.abs(c[0] + radius * np.cos(angle(t))), c[1] + radius * np.sin(angle(t))])
    along = lambda t: (end - start) * radius * np.array([-np.sin(angle(t)), np.cos(angle(t))])
    on_axis = tuple(abs(c[0] + radius * cos(a)) < 1e-12 * radius for a in (start, end))
    return Curve(at, along, on_axis, smooth)


class Panel:
    """Part of a curve with its Gauss points: parameters `t`, points `x` (2, n), weights `w` with the arc length."""

    def __init__(self, curve, lo, hi, order):
        self.curve, self.lo, self.hi = curve, lo, hi
        u, w = legendre.leggauss(order)
        self.t, self.x, self.w = weighted(curve, np.array([lo]), np.array([hi]), u, w)
        self.length = self.w.sum()

    def basis(self, t):
        """Lagrange polynomials of the Gauss points at the parameters `t`, (len(t), n)."""
        n = len(self.t)
        here = legendre.legvander((2 * t - self.lo - self.hi) / (self.hi - self.lo), n - 1)
        return here @ coefficients(n)


def coefficients(n, kept={}):
    """Matrix from values at n Gauss points to Legendre coefficients."""
    if n not in kept:
        kept[n] = np.linalg.inv(legendre.legvander(legendre.leggauss(n)[0], n - 1))
    return kept[n]


def weighted(curve, lo, hi, u, w):
    """Parameters, points and arc-length weights of the rule (u, w) on the pieces [lo, hi]."""
    t = ((lo + hi)[:, None] / 2 + np.outer((hi - lo) / 2, u)).ravel()
    speed = np.hypot(*curve.along(t))
    return t, curve.at(t), np.outer((hi - lo) / 2, w).ravel() * speed


def ring(r, z, rp, zp):
    """∫ dφ / |x − x'| over the ring (rp, zp), seen from (r, z)."""
    plus = (r + rp) ** 2 + (z - zp) ** 2
    short = np.maximum((r - rp) ** 2 + (z - zp) ** 2, 1e-300)
    return 4 * ellipkm1(short / plus) / np.sqrt(plus)


def panels_of(curves, order, pieces, finest):
    """Panels of one meridian: every curve in `pieces` equal parts, the outer ones graded to `finest` at joints."""
    out = []
    for curve in curves:
        cuts = list(np.linspace(0, 1, pieces + 1))
        graded = [1 / pieces * GRADE**k for k in range(1, 40) if GRADE**k >= finest]
        for end in (0, 1):
            if not (curve.on_axis[end] or curve.smooth[end]):
                cuts += [g if end == 0 else 1 - g for g in graded]
        cuts.sort()
        out += [Panel(curve, a, b, order) for a, b in zip(cuts, cuts[1:])]
    return out


def pieces_towards(panel, x, start):
    """Cuts the panel by bisection until every piece is as far from x and its image as it is long."""
    done, lo, hi = [], np.array(start[:-1]), np.array(start[1:])
    for level in range(DEPTH + 1):
        mid = (lo + hi) / 2
        c = panel.curve.at(mid)
        size = np.hypot(*panel.curve.along(mid)) * (hi - lo)
        apart = np.minimum(np.hypot(c[0] - x[0], c[1] - x[1]), np.hypot(c[0] + x[0], c[1] - x[1]))
        good = (apart >= 1.5 * size) | (level == DEPTH)
        done.append(np.array([lo[good], hi[good]]))
        lo, hi, mid = lo[~good], hi[~good], mid[~good]
        if len(lo) == 0:
            break
        lo, hi = np.concatenate([lo, mid]), np.concatenate([mid, hi])
    return np.concatenate(done, axis=1)


def near_row(panel, x, own, rule):
    """∫ r' k(x, x') L_j ds' over the panel for its Lagrange polynomials L_j; `own` is the parameter of x on it, or None."""
    start = [panel.lo, panel.hi] if own is None else [panel.lo, own, panel.hi]
    lo, hi = pieces_towards(panel, x, start)
    t, y, w = weighted(panel.curve, lo, hi, *rule)
    return (ring(x[0], x[1], y[0], y[1]) * y[0] * w) @ panel.basis(t)


class Solved:
    """Fields E [V per length of the input] at all Gauss points, one column per body held at 1 V with the others at 0."""

    def __init__(self, bodies, order, pieces, finest):
        self.panels, self.body = [], []
        for i, curves in enumerate(bodies):
            added = panels_of(curves, order, pieces, finest)
            self.panels += added
            self.body += [i] * len(added)
        self.n_bodies = len(bodies)
        self.x = np.concatenate([p.x for p in self.panels], axis=1)
        self.w = np.concatenate([p.w for p in self.panels])
        self.of = np.repeat(self.body, order)
        right = (self.of[:, None] == np.arange(self.n_bodies)).astype(float)
        self.field = np.linalg.solve(self.matrix(order), right)

    def matrix(self, order):
        rule = legendre.leggauss(order + 4)
        r, z = self.x
        a = ring(r[:, None], z[:, None], r, z) * r * self.w
        for j, panel in enumerate(self.panels):
            cols = slice(j * order, (j + 1) * order)
            ends = panel.curve.at(np.array([panel.lo, panel.hi]))
            y = np.concatenate([panel.x, ends], axis=1)
            apart = np.hypot(r[:, None] - y[0], z[:, None] - y[1]).min(axis=1)
            image = np.hypot(r[:, None] + y[0], z[:, None] - y[1]).min(axis=1)
            for i in np.flatnonzero(np.minimum(apart, image) < NEAR * panel.length):
                own = panel.t[i - cols.start] if cols.start <= i < cols.stop else None
                a[i, cols] = near_row(panel, self.x[:, i], own, rule)
        return a / (4 * pi)

    def capacitance(self):
        """Maxwell matrix over ε₀, in the length of the input."""
        flux = 2 * pi * self.x[0] * self.w
        return np.array([flux[self.of == i] @ self.field[self.of == i] for i in range(self.n_bodies)])

    def on_panel(self, j, volts, t):
        n = len(self.panels[j].t)
        return self.panels[j].basis(np.atleast_1d(t)) @ (self.field[j * n : (j + 1) * n] @ volts)

    def highest(self, volts, body):
        """Largest |E| on a body for the potentials `volts`, and its (r, z)."""
        best = (-1.0, None)
        for j, panel in enumerate(self.panels):
            if self.body[j] == body:
                t = np.linspace(panel.lo, panel.hi, 65)
                e = np.abs(self.on_panel(j, volts, t))
                if e.max() > best[0]:
                    best = (e.max(), (j, t[max(e.argmax() - 1, 0)], t[min(e.argmax() + 1, 64)]))
        j, lo, hi = best[1]
        size = lambda t: abs(self.on_panel(j, volts, t)[0])
        found = minimize_scalar(lambda t: -size(t), bounds=(lo, hi), method="bounded", options={"xatol": 1e-12})
        t = max((found.x, lo, hi), key=size)
        return size(t), *self.panels[j].curve.at(np.array([t]))[:, 0]

    def field_at(self, volts, r, z):
        """E at the point of a surface nearest to (r, z)."""
        def apart(t, p):
            return np.hypot(*(p.curve.at(np.array([t]))[:, 0] - (r, z)))

        nearest = lambda p: min(apart(t, p) for t in np.linspace(p.lo, p.hi, 9))
        j = min(range(len(self.panels)), key=lambda j: nearest(self.panels[j]))
        p = self.panels[j]
        t = minimize_scalar(apart, args=(p,), bounds=(p.lo, p.hi), method="bounded", options={"xatol": 1e-13}).x
        t = min((t, p.lo, p.hi), key=lambda t: apart(t, p))
        return self.on_panel(j, volts, t)[0]


def sphere(radius, z):
    return [arc((0, z), radius, -pi / 2, pi / 2)]


def torus(major, minor):
    return [arc((major, 0), minor, 0, pi, (True, True)), arc((major, 0), minor, pi, 2 * pi, (True, True))]


def capsule(radius, straight):
    h = straight / 2
    side = line((radius, -h), (radius, h))
    return [arc((0, -h), radius, -pi / 2, 0), side, arc((0, h), radius, 0, pi / 2)]


def plate(radius, low, high, f):
    """Round disc with rims rounded by f; a full half circle where it is twice f thick."""
    side = [line((radius, low + f), (radius, high - f))] if high - low > 2 * f * (1 + 1e-12) else []
    kink = not side
    return [
        line((0, low), (radius - f, low)),
        arc((radius - f, low + f), f, -pi / 2, 0, (False, kink)),
        *side,
        arc((radius - f, high - f), f, 0, pi / 2, (kink, False)),
        line((radius - f, high), (0, high)),
    ]


def bowl():
    cx = (32**2 + 30**2 - 6**2) / 60
    cz = -sqrt(32**2 - cx**2)
    return [
        arc((0, 0), 30, -pi / 2, atan2(cz, cx)),
        arc((cx, cz), 2, atan2(-cz, -cx), atan2(-cz, 30 - cx)),
        arc((30, 0), 4, atan2(cz, cx - 30), pi / 2, (False, True)),
        arc((30, 0), 4, pi / 2, pi, (True, False)),
        arc((0, 0), 26, 0, -pi / 2),
    ]


def dimpled():
    cz = (16**2 + 26**2 - 18**2) / 52
    cx = sqrt(16**2 - cz**2)
    return [
        arc((0, 0), 20, -pi / 2, atan2(cz, cx)),
        arc((cx, cz), 4, atan2(cz, cx), atan2(26 - cz, -cx)),
        arc((0, 26), 14, atan2(cz - 26, cx), -pi / 2),
    ]


def spheroid(equatorial, polar):
    at = lambda t: np.array([equatorial * np.sin(pi * t), -polar * np.cos(pi * t)])
    along = lambda t: pi * np.array([equatorial * np.cos(pi * t), polar * np.sin(pi * t)])
    return [Curve(at, along, (True, True))]


def dented():
    """Distance from the origin 20 − 7 exp(−(θ/0.5)²), θ from +z; halves, so that pieces are shorter on the dent."""

    def radius(a):
        g = 7 * np.exp(-((a / 0.5) ** 2))
        return 20 - g, g * 2 * a / 0.25

    def half(start, end):
        def at(t):
            a = start + (end - start) * t
            return radius(a)[0] * np.array([np.sin(a), np.cos(a)])

        def along(t):
            a = start + (end - start) * t
            d, slope = radius(a)
            return (end - start) * (slope * np.array([np.sin(a), np.cos(a)]) + d * np.array([np.cos(a), -np.sin(a)]))

        return Curve(at, along, (start == pi, end == 0), (True, True))

    return [half(pi, 1.2), half(1.2, 0)]


COARSE, FINE = (12, 4, 1e-3), (16, 6, 1e-4)  # order, pieces of a curve, finest panel in curves

# Name, sides and radius [mm] of the blocks.
ROUNDED = [("block", (40, 30, 20), 3), *((f"cube_r{f}", (100, 100, 100), f) for f in (4, 2, 1))]

GAPS = (0.01, 0.001)  # of the sheets, in radii or sides

# id, STL files without their suffix `_coarse`, `_fine`, ...; meridians [mm]; times as many pieces; symmetric about z = 0;
# further places (r, z) [mm].
BODIES = [
    ("torus", ["torus"], [torus(30, 10)], 1, True, [(20, 0), (30, 10)]),
    ("capsule", ["capsule"], [capsule(10, 20)], 1, True, [(10, 0)]),
    ("cylinder", ["cylinder"], [plate(10, -10, 10, 2)], 1, True, [(10, 0), (0, 10)]),
    ("plates", ["plate_low", "plate_high"], [plate(30, -10, -4, 3), plate(20, 4, 10, 2)], 1, False, [(0, -4), (0, 4)]),
    ("bowl", ["bowl"], [bowl()], 1, False, [(0, -30), (0, -26)]),
    ("spheroid", ["spheroid"], [spheroid(10, 30)], 4, True, [(10, 0)]),
    ("dimpled", ["dimpled"], [dimpled()], 1, False, [(0, 12), (0, -20)]),
    ("dented", ["dented"], [dented()], 3, False, [(0, 13), (0, -20)]),
]


def quantities(bodies, pieces, symmetric, places, resolution):
    """{quantity: (unit, value in SI)} of one case at one resolution."""
    order, per_curve, finest = resolution
    s = Solved(bodies, order, per_curve * pieces, finest)
    n = len(bodies)
    c = s.capacitance() * EPS0 * 1e-3
    out = {f"C{i + 1}{j + 1}" if n > 1 else "C": ("F", (c[i, j] + c[j, i]) / 2) for i in range(n) for j in range(i, n)}
    for volts in [(1.0,)] if n == 1 else [(1.0, 0.0), (0.5, -0.5)]:
        drive = "" if n == 1 else "; " + ", ".join(f"V{i + 1} = {v:g} V" for i, v in enumerate(volts))
        for i in range(n):
            e, r, z = s.highest(np.array(volts), i)
            name = ("E_max" if n == 1 else f"E_max on {i + 1}") + drive
            out[name] = ("V/m per V", e * 1e3)
            out[name + "; r"] = ("m", r * 1e-3 if r > 1e-5 else 0.0)
            out[name + "; z"] = ("m", (abs(z) if symmetric else z) * 1e-3 if abs(z) > 1e-5 else 0.0)
        for r, z in places:
            out[f"E at r = {r} mm, z = {z} mm{drive}"] = ("V/m per V", s.field_at(np.array(volts), r, z) * 1e3)
    return out


def row(name, files, quantity, unit, coarse, fine, source, floor=FLOOR):
    """One row of cad.csv: `fine`, its change from `coarse`, and never less than `floor` of it."""
    # A place is where a slope vanishes: known to the root of the rounding only.
    least = 1e-9 if unit == "m" else floor * abs(fine)
    return [name, files, quantity, unit, repr(float(fine)), f"{max(abs(fine - coarse), least):.1e}", source]


def body_rows():
    source = "axisymmetric integral equation (axisymmetric.py), two resolutions"
    for name, stems, bodies, pieces, symmetric, places in BODIES:
        coarse = quantities(bodies, pieces, symmetric, places, COARSE)
        fine = quantities(bodies, pieces, symmetric, places, FINE)
        files = ";".join(f"{kernel}_{stem}_*.stl" for kernel in ("scad", "occ") for stem in stems)
        for quantity, (unit, value) in fine.items():
            yield row(f"cad.{name}", files, quantity, unit, coarse[quantity][1], value, source)
        print(name, flush=True)


def size_rows():
    """Area and volume of the true bodies: Pappus for those of revolution, Steiner's formula for rounded blocks."""
    for _, stems, bodies, pieces, *_ in BODIES:
        for stem, curves in zip(stems, bodies):
            area, volume = np.zeros(2), np.zeros(2)
            for k, (order, per_curve, finest) in enumerate((COARSE, FINE)):
                for p in panels_of(curves, order, per_curve * pieces, finest):
                    slope = p.curve.along(p.t)
                    area[k] += 2e-6 * pi * p.x[0] @ p.w
                    volume[k] += 1e-9 * pi * p.x[0] ** 2 @ (p.w * slope[1] / np.hypot(*slope))
            files = f"scad_{stem}_*.stl;occ_{stem}_*.stl"
            yield row(f"cad.{stem}", files, "area", "m2", *area, "area of the surface of revolution (axisymmetric.py)")
            yield row(f"cad.{stem}", files, "volume", "m3", *np.abs(volume), "volume of the body of revolution (axisymmetric.py)")
    for stem, sides, f in ROUNDED:
        a, b, c = (side - 2 * f for side in sides)
        faces = a * b + b * c + c * a
        area = 1e-6 * (2 * faces + 2 * pi * f * (a + b + c) + 4 * pi * f**2)
        volume = 1e-9 * (a * b * c + 2 * f * faces + pi * f**2 * (a + b + c) + 4 / 3 * pi * f**3)
        files = "scad_block_*.stl;occ_block_*.stl" if stem == "block" else f"occ_{stem}_drawn.stl"
        yield row(f"cad.{stem}", files, "area", "m2", area, area, "Steiner's formula")
        yield row(f"cad.{stem}", files, "volume", "m3", volume, volume, "Steiner's formula")


def block_rows():
    """Twice the change is claimed: fields in the middle of long quadrilaterals settle unevenly."""
    source = "integral equation on curved quadrilaterals (blocks.py), two resolutions"
    si = {"F": EPS0 * 1e-3, "V/m per V": 1e3, "m": 1e-3}
    for stem, sides, f in ROUNDED:
        coarse = blocks.quantities(sides, f, blocks.COARSE)
        files = "scad_block_*.stl;occ_block_*.stl" if stem == "block" else f"occ_{stem}_drawn.stl"
        for quantity, (unit, value) in blocks.quantities(sides, f, blocks.FINE).items():
            doubled = value + 2 * (coarse[quantity][1] - value)
            yield row(f"cad.{stem}", files, quantity, unit, doubled * si[unit], value * si[unit], source)
        print(stem, flush=True)


def sheet_rows():
    discs = [{gap: sheets.disc_pair(gap, order) for gap in GAPS} for order in (12, 16)]
    settings = ((0.2, 5, 1e-7, 0.25), (0.15, 6, 1e-8, 0.25))
    squares = [sheets.square_charges(GAPS, *s) for s in settings]
    squares = [{gap: ((o + e) / 2, (e - o) / 2) for gap, (o, e) in pair.items()} for pair in squares]
    for shape, letter, area, pairs, floor, source in [
        ("discs", "a", pi, discs, FLOOR, "Love's equation (sheets.py), two resolutions"),
        # One square alone comes out 1.2e-8 low, six times the change between the two resolutions.
        ("squares", "L", 1, squares, 1e-7, "Galerkin's method with a sum of Gaussians (sheets.py), two resolutions"),
    ]:
        for gap in GAPS:
            (c11, c12), (fine11, fine12) = (pair[gap] for pair in pairs)
            name, per = f"sheets.{shape}.{gap}", f"/(4*pi*eps0*{letter})"
            yield row(name, "", "C11" + per, "1", c11, fine11, source, floor)
            yield row(name, "", "C12" + per, "1", c12, fine12, source, floor)
            yield row(name, "", "C_mutual" + per, "1", (c11 - c12) / 2, (fine11 - fine12) / 2, source, floor)
            over = 4 * pi * gap / area
            flat = "C_mutual*gap/(eps0*" + ("pi*a^2)" if shape == "discs" else "L^2)")
            yield row(name, "", flat, "1", over * (c11 - c12) / 2, over * (fine11 - fine12) / 2, source, floor)


def two_spheres(gap):
    """C11 and C12 over 4πε₀a of two equal spheres by images (Smythe, Static and Dynamic Electricity, 3rd ed., sec. 5.08)."""
    u = acosh(1 + gap / 2)
    n = np.arange(1, 4000)
    with np.errstate(over="ignore"):
        return np.sinh(u) * (1 / np.sinh((2 * n - 1) * u)).sum(), -np.sinh(u) * (1 / np.sinh(2 * n * u)).sum()


def torus_series(ratio):
    """C over 4πε₀R of a ring, R/r = ratio: (2/π) sqrt(1 − 1/ratio²) Σ' Q/P of degree n − 1/2 at `ratio` (Hicks 1881)."""
    import mpmath as mp

    q = lambda n: mp.re(mp.legenq(n - mp.mpf(1) / 2, 0, ratio, type=3))
    p = lambda n: mp.re(mp.legenp(n - mp.mpf(1) / 2, 0, ratio, type=3))
    series = q(0) / p(0) + 2 * sum(q(n) / p(n) for n in range(1, 20))
    return float(2 / mp.pi * mp.sqrt(1 - mp.mpf(1) / ratio**2) * series)


# Computed by an axisymmetric integral equation of other make, stated to 1e-11 (C over 4πε₀a) and 1e-8 (E a/V) or better.
OTHERS = [
    ("capsule 2", capsule(1, 2), 1.4219980470506735, 0.9015928270777689),
    ("cylinder, fillet 0.2", plate(1, -1, 1, 0.2), 1.1708249936722197, 1.3767701680474185),
    ("cylinder, fillet 0.05", plate(1, -1, 1, 0.05), 1.1882665937568042, 2.1133153128611064),
]


def check():
    """Stops unless closed forms, and values of other programs of the same kind, come out to 1e-8."""
    one = np.ones(1)

    def compare(what, value, truth, limit=1e-8):
        print(f"{what:40s} {value:.15g} {value / truth - 1:+.1e}", flush=True)
        if not abs(value / truth - 1) < limit:
            sys.exit(f"axisymmetric.py: {what}: {value} against {truth}")

    def solved(bodies, pieces=1):
        return Solved(bodies, FINE[0], FINE[1] * pieces, FINE[2])

    s = solved([sphere(1, 0)])
    compare("sphere, C", s.capacitance()[0, 0] / (4 * pi), 1)
    compare("sphere, highest field", s.highest(one, 0)[0], 1)
    s = solved([spheroid(1, 3)], 4)
    compare("spheroid 1:3, C", s.capacitance()[0, 0] / (4 * pi), sqrt(8) / acosh(3))
    compare("spheroid 1:3, tip", s.highest(one, 0)[0], sqrt(8) / acosh(3))
    compare("spheroid 1:3, waist", s.field_at(one, 1, 0), sqrt(8) / acosh(3) / 3)
    for gap in (1.0, 0.1, 0.02):
        s = solved([sphere(1, -1 - gap / 2), sphere(1, 1 + gap / 2)], 3)
        c = s.capacitance() / (4 * pi)
        for what, value, truth in zip(("C11", "C12"), (c[0, 0], c[0, 1]), two_spheres(gap)):
            compare(f"two spheres, gap {gap}, {what}", value, truth)
    s = solved([torus(3, 1)])  # Its fields: gradient of the toroidal series.
    compare("torus 3, C", s.capacitance()[0, 0] / (12 * pi), torus_series(3))
    compare("torus 3, outer equator", s.highest(one, 0)[0], 0.4560452184918312)
    compare("torus 3, inner equator", s.field_at(one, 2, 0), 0.09665198896752947)
    (alone, _) = sheets.square_charges([None], 0.15, 6, 1e-8, 0.25)[None] * 2
    compare("square sheet, C", alone, 0.3667880040414091, 5e-8)  # Stated to 8e-11, by another program.
    # A ball of radius 1 - d whose octants are moved out by d along each axis: C gains the mean move, 3 d / 2.
    ball = blocks.Block((2.0, 2.0, 2.0), 1 - 1e-4, 6, 0, 1)
    compare("ball drawn apart, C", ball.capacitance / (4 * pi), 1 - 1e-4 + 1.5e-4, 1e-7)
    cube = blocks.Block((1.0, 1.0, 1.0), 0.04, *blocks.COARSE)
    copies = np.repeat([len(p.group) for p in cube.patches], cube.order**2)
    inside = (cube.field * cube.w * copies / np.linalg.norm(cube.x, axis=1)).sum() / (4 * pi)
    compare("rounded cube, potential in the middle", inside, 1, 1e-6)
    for what, body, c_ratio, e in OTHERS:
        s = solved([body])
        compare(f"{what}, C", s.capacitance()[0, 0] / (4 * pi), c_ratio)
        compare(f"{what}, highest field", s.highest(one, 0)[0], e)


def main():
    if "--check" in sys.argv:
        return check()
    rows = [*body_rows(), *block_rows(), *size_rows(), *sheet_rows()]
    with open(HERE / "cad.csv", "w", newline="") as f:
        out = csv.writer(f, lineterminator="\n")
        out.writerow(["id", "files", "quantity", "unit", "value", "uncertainty", "source"])
        out.writerows(rows)


if __name__ == "__main__":
    main()
