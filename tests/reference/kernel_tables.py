"""Writes kernel_segment.csv and kernel_triangle.csv beside this file: integrals of 1/r over segments
and flat triangles, and their gradients, at points that are exact doubles.

Run by hand from the root of the project; nothing runs it in the tests:

    python3 -m venv target/venv && target/venv/bin/pip install mpmath
    target/venv/bin/python tests/reference/kernel_tables.py

Arithmetic has 80 digits.  The values are the closed forms (edge logarithms; solid angle of van Oosterom
and Strackee, IEEE Trans. Biomed. Eng. 30, 1983, eq. 8).  Rows marked `yes` under `checked` were also
integrated numerically, without those forms, and agree within CHECK_TOL, or the script stops.  On an edge
the gradient is infinite and left empty; in the plane of a triangle its normal part is the mean of both
sides, zero.
"""

import csv
import random
from fractions import Fraction
from pathlib import Path

from mpmath import mp, mpf, atan2, log, pi, sqrt

mp.dps = 80
CHECK_TOL = mpf(10) ** -20
SOURCE = (
    "50-digit closed form, van Oosterom and Strackee 1983; cross-checked by 50-digit quadrature where marked"
)
RNG = random.Random(20240611)
HERE = Path(__file__).parent


# Vectors of any number type.
def sub(a, b):
    return [p - q for p, q in zip(a, b)]


def add(a, b):
    return [p + q for p, q in zip(a, b)]


def mul(a, s):
    return [p * s for p in a]


def dot(a, b):
    return sum(p * q for p, q in zip(a, b))


def cross(a, b):
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def norm(a):
    return sqrt(dot(a, a))


def exact(points):
    return [[mpf(c) for c in p] for p in points]


# Closed forms.
def edge_log(a, b, x):
    ra, rb, l = norm(sub(a, x)), norm(sub(b, x)), norm(sub(b, a))
    return log((ra + rb + l) / (ra + rb - l))


def on_segment(a, b, x):
    a, b, x = ([Fraction(c) for c in p] for p in (a, b, x))
    e, d = sub(b, a), sub(x, a)
    return all(c == 0 for c in cross(e, d)) and 0 <= dot(e, d) <= dot(e, e)


def segment(a, b, x):
    """Potential and gradient of the segment."""
    a, b, x = exact((a, b, x))
    e = sub(b, a)
    t = mul(e, 1 / norm(e))
    da, db = sub(a, x), sub(b, x)
    ra, rb, sa, sb = norm(da), norm(db), dot(da, t), dot(db, t)
    across = sub(mul(t, sa), da)  # from the foot of x to x
    d_sq = dot(across, across)
    g = mul(t, 1 / ra - 1 / rb)
    if d_sq > mpf(10) ** -60:
        g = add(g, mul(across, -(sb / rb - sa / ra) / d_sq))
    return edge_log(a, b, x), g


def triangle(corners, x):
    """Potential and gradient (None on an edge) of the triangle."""
    touched = [on_segment(corners[k], corners[(k + 1) % 3], x) for k in range(3)]
    frac = [[Fraction(c) for c in p] for p in corners]
    fx = [Fraction(c) for c in x]
    volume = dot(cross(sub(frac[1], frac[0]), sub(frac[2], frac[0])), sub(fx, frac[0]))
    p, x = exact(corners), exact([x])[0]
    normal = cross(sub(p[1], p[0]), sub(p[2], p[0]))
    area2 = norm(normal)
    n = mul(normal, 1 / area2)
    h = dot(sub(x, p[0]), n) if volume != 0 else mpf(0)
    a, b, c = (sub(q, x) for q in p)
    ra, rb, rc = norm(a), norm(b), norm(c)
    omega = mpf(0)
    if volume != 0:
        den = ra * rb * rc + dot(a, b) * rc + dot(a, c) * rb + dot(b, c) * ra
        omega = 2 * atan2(abs(h) * area2, den)
    potential, g = -abs(h) * omega, mul(n, -omega if h > 0 else omega)
    for k in range(3):
        if touched[k]:
            continue  # p ln(..) tends to zero
        u, w = p[k], p[(k + 1) % 3]
        e = sub(w, u)
        m = cross(mul(e, 1 / norm(e)), n)
        s = edge_log(u, w, x)
        potential += dot(m, sub(u, x)) * s
        g = sub(g, mul(m, s))
    return potential, None if any(touched) else g


# Numerical integration, from the definition.
def gauss(n):
    """Nodes and weights on (0, 1)."""
    nodes = []
    for i in range(1, n + 1):
        z = mp.cos(pi * (i - mpf(1) / 4) / (n + mpf(1) / 2))
        for _ in range(100):
            p0, p1 = mpf(1), z
            for k in range(2, n + 1):
                p0, p1 = p1, ((2 * k - 1) * z * p1 - (k - 1) * p0) / k
            slope = n * (z * p1 - p0) / (z * z - 1)
            step = p1 / slope
            z -= step
            if abs(step) < mpf(10) ** -(mp.dps - 5):
                break
        nodes.append(((1 + z) / 2, 1 / ((1 - z * z) * slope * slope)))
    return nodes


GAUSS = gauss(26)


def integrand(y, x):
    d = sub(y, x)
    r = norm(d)
    return [1 / r] + mul(d, 1 / r**3)


def quad_triangle(corners, x, depth=9):
    """Tensor Gauss over a collapsed square, quartered while the triangle is near."""
    p0, p1, p2 = corners
    centre = mul(add(add(p0, p1), p2), mpf(1) / 3)
    longest = max(norm(sub(p1, p0)), norm(sub(p2, p1)), norm(sub(p0, p2)))
    if depth and norm(sub(x, centre)) < mpf("1.5") * longest:
        m0, m1, m2 = (mul(add(u, w), mpf(1) / 2) for u, w in ((p0, p1), (p1, p2), (p2, p0)))
        parts = ((p0, m0, m2), (m0, p1, m1), (m2, m1, p2), (m0, m1, m2))
        total = [mpf(0)] * 4
        for part in parts:
            total = add(total, quad_triangle(part, x, depth - 1))
        return total
    u, v = sub(p1, p0), sub(p2, p1)
    area2, total = norm(cross(u, v)), [mpf(0)] * 4
    for s, ws in GAUSS:
        for t, wt in GAUSS:
            y = add(p0, mul(add(u, mul(v, t)), s))
            total = add(total, mul(integrand(y, x), ws * wt * s * area2))
    return total


def quad_segment(a, b, x, depth=14):
    centre = mul(add(a, b), mpf(1) / 2)
    if depth and norm(sub(x, centre)) < 2 * norm(sub(b, a)):
        return add(quad_segment(a, centre, x, depth - 1), quad_segment(centre, b, x, depth - 1))
    l, total = norm(sub(b, a)), [mpf(0)] * 4
    for s, ws in GAUSS:
        total = add(total, mul(integrand(add(a, mul(sub(b, a), s)), x), ws * l))
    return total


def quad_from_inside(corners, x):
    """Potential at a point of the triangle: cut there, the radial integral is exact."""
    total = mpf(0)
    for k in range(3):
        u, w = sub(corners[k], x), sub(corners[(k + 1) % 3], x)
        area2 = norm(cross(u, w))
        if area2 > mpf(10) ** -60:
            total += area2 * quad_segment(u, w, [mpf(0)] * 3, 40)[0] / norm(sub(w, u))
    return total


def check(row, got, want):
    error = max(abs(p - q) for p, q in zip(got, want)) / max(abs(q) for q in want)
    if error > CHECK_TOL:
        raise SystemExit(f"{row}: closed form and quadrature differ by {mp.nstr(error, 3)}")


# Points and shapes.
def rand_vec(size=1.0):
    return [RNG.uniform(-size, size) for _ in range(3)]


def direction():
    while True:
        v = rand_vec()
        r = sum(c * c for c in v) ** 0.5
        if 0.1 < r <= 1.0:
            return [c / r for c in v]


def log_uniform(lo, hi):
    return 10 ** RNG.uniform(lo, hi)


def rand_triangle():
    while True:
        p = [rand_vec() for _ in range(3)]
        e = [sub(p[1], p[0]), sub(p[2], p[0]), sub(p[2], p[1])]
        longest = max(dot(d, d) for d in e)
        c = cross(e[0], e[1])
        if dot(c, c) > (0.1 * longest) ** 2:
            return p


def sliver(ratio):
    """Flat caps and needles, any orientation."""
    t, other = direction(), direction()
    v = cross(t, other)
    v = mul(v, 1 / sum(c * c for c in v) ** 0.5)
    at = RNG.choice([0.5, RNG.uniform(0, 1), 0.0, 1.0, RNG.uniform(0, ratio)])
    origin = rand_vec()
    p = [origin, add(origin, t), add(origin, add(mul(t, at), mul(v, ratio)))]
    k = RNG.randrange(3)
    return p[k:] + p[:k]


def dyadic_triangle():
    """Corners on a grid of 1/1024, so that points with weights of 1/64 lie exactly in the plane."""
    p = rand_triangle()
    return [[round(c * 1024) / 1024 for c in q] for q in p]


def combine(p, w):
    return [sum(q[i] * s for q, s in zip(p, w)) for i in range(3)]


def unit_normal(p):
    c = cross(sub(p[1], p[0]), sub(p[2], p[0]))
    return mul(c, 1 / dot(c, c) ** 0.5)


def triangle_cases():
    for i in range(60):
        yield "random", rand_triangle(), rand_vec(2.0), i < 8
    for i in range(60):
        p = sliver(log_uniform(-6, -1))
        yield "sliver", p, add(combine(p, [1 / 3] * 3), mul(direction(), log_uniform(-1, 1))), False
    for i in range(60):
        ratio = log_uniform(-6, -1)
        p, w = sliver(ratio), [RNG.uniform(0, 1) for _ in range(3)]
        w = mul(w, 1 / sum(w))
        yield "sliver_near", p, add(combine(p, w), mul(direction(), ratio * log_uniform(-1, 1.5))), False
    for i in range(40):
        p, w = dyadic_triangle(), [RNG.randrange(-64, 128) / 64 for _ in range(2)]
        yield "coplanar", p, combine(p, w + [1 - sum(w)]), i < 20
    for i in range(20):
        p, w = dyadic_triangle(), [RNG.randrange(1, 32) / 64 for _ in range(2)]
        yield "coplanar", p, combine(p, w + [1 - sum(w)]), i < 10
    for i in range(30):
        p, w, k = dyadic_triangle(), RNG.randrange(1, 64) / 64, RNG.randrange(3)
        yield "on_edge", p, combine([p[k], p[(k + 1) % 3]], [w, 1 - w]), i < 10
    for i in range(20):
        p = rand_triangle() if i % 2 else sliver(log_uniform(-6, -1))
        yield "on_vertex", p, p[RNG.randrange(3)], i < 10
    for i in range(40):
        p, w, k = rand_triangle(), RNG.uniform(-0.2, 1.2), RNG.randrange(3)
        yield "near_edge", p, add(combine([p[k], p[(k + 1) % 3]], [w, 1 - w]), mul(direction(), log_uniform(-9, -2))), False
    for i in range(40):
        p, w = rand_triangle(), [RNG.uniform(-0.2, 1) for _ in range(2)]
        lift = RNG.choice([-1, 1]) * log_uniform(-12, -2)
        yield "near_plane", p, add(combine(p, w + [1 - sum(w)]), mul(unit_normal(p), lift)), False
    for i in range(60):
        p = rand_triangle() if i % 2 else sliver(log_uniform(-6, -1))
        yield "far", p, mul(direction(), log_uniform(0.5, 6)), i < 16


def segment_cases():
    for i in range(80):
        yield "random", rand_vec(), rand_vec(), rand_vec(2.0), i < 12
    for i in range(40):
        a, b = rand_vec(), rand_vec()
        yield "far", a, b, mul(direction(), log_uniform(0.5, 6)), i < 10
    for i in range(60):
        a, b, w = rand_vec(), rand_vec(), RNG.uniform(-0.5, 1.5)
        yield "near_line", a, b, add(combine([a, b], [w, 1 - w]), mul(direction(), log_uniform(-9, -1))), False
    for i in range(30):
        a, b = ([RNG.randrange(-1024, 1025) / 1024 for _ in range(3)] for _ in range(2))
        w = RNG.choice([-RNG.randrange(1, 640), 64 + RNG.randrange(1, 640)]) / 64
        yield "on_line", a, b, combine([a, b], [w, 1 - w]), i < 10
    for i in range(30):
        a, b = rand_vec(), rand_vec()
        yield "near_end", a, b, add(RNG.choice([a, b]), mul(direction(), log_uniform(-9, -1))), False


def text(value):
    return "" if value is None else repr(float(value))


def write(name, names, rows):
    with open(HERE / name, "w", newline="") as out:
        table = csv.writer(out, lineterminator="\n")
        table.writerow(["kind"] + names + ["x0", "x1", "x2", "potential", "g0", "g1", "g2", "checked", "source"])
        table.writerows(rows)
    print(name, len(rows), "rows,", sum(row[-2] == "yes" for row in rows), "of them checked by quadrature")


def main():
    rows = []
    for kind, a, b, x, checked in segment_cases():
        v, g = segment(a, b, x)
        if checked:
            check((kind, a, b, x), quad_segment(*exact((a, b, x))), [v] + g)
        rows.append([kind] + [text(c) for c in a + b + x + [v] + g] + ["yes" if checked else "no", SOURCE])
    write("kernel_segment.csv", ["a0", "a1", "a2", "b0", "b1", "b2"], rows)

    rows = []
    for kind, p, x, checked in triangle_cases():
        v, g = triangle(p, x)
        if checked and kind in ("coplanar", "on_edge", "on_vertex"):
            inside = kind != "coplanar" or all(w >= 0 for w in weights(p, x))
            checked = inside
            if inside:
                check((kind, p, x), [quad_from_inside(exact(p), exact([x])[0])], [v])
        elif checked:
            checked = clear_of(p, x)
            if checked:
                check((kind, p, x), quad_triangle(exact(p), exact([x])[0]), [v] + g)
        g = g or [None] * 3
        rows.append([kind] + [text(c) for c in p[0] + p[1] + p[2] + x + [v] + g] + ["yes" if checked else "no", SOURCE])
    write("kernel_triangle.csv", [f"{c}{i}" for c in "abc" for i in range(3)], rows)


def clear_of(p, x):
    """Whether the quadrature settles soon: a twentieth of an edge from each of many points."""
    points = [combine(p, [i / 8, j / 8, (8 - i - j) / 8]) for i in range(9) for j in range(9 - i)]
    longest = max(dot(sub(p[k], p[k - 1]), sub(p[k], p[k - 1])) for k in range(3))
    return all(dot(sub(x, y), sub(x, y)) > 0.04 * longest for y in points)


def weights(p, x):
    """Barycentric coordinates of a point of the plane, exact."""
    p, x = [[Fraction(c) for c in q] for q in p], [Fraction(c) for c in x]
    n = cross(sub(p[1], p[0]), sub(p[2], p[0]))
    return [dot(n, cross(sub(p[(k + 2) % 3], p[(k + 1) % 3]), sub(x, p[(k + 1) % 3]))) for k in range(3)]


if __name__ == "__main__":
    main()
