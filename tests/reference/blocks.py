"""Capacitance and surface field of blocks with all edges and corners rounded; axisymmetric.py writes them to cad.csv.

The surface of one octant is three flats, three quarter cylinders and an eighth of a sphere, cut into quadrilaterals
that shrink towards the seams, where the curvature jumps.  The charge density is a product of polynomials on each,
the potential is held to 1 at its Gauss points (Nyström's method; Atkinson, The Numerical Solution of Integral Equations
of the Second Kind, 1997, ch. 9, for surfaces in pieces).  Near a point a quadrilateral is bisected across its longer
side until each piece is farther away than long; pieces of SMALL of the quadrilateral are the last.  Other octants
enter by mirrored points, the two other faces of a cube by turned ones.
"""

from math import pi

import numpy as np
from numpy.polynomial import legendre

SMALL = 1e-8
NEAR = 1.2  # sizes of a quadrilateral within which it is cut
CHUNK = 4000  # pieces worked on at once
COARSE, FINE = (5, 0, 1), (6, 0, 2)  # order, levels on the flats and on the arcs


class Patch:
    """x(u, v) for u in [u0, u1], v in [v0, v1], with the area element; `group` maps points to points of its copies."""

    def __init__(self, at, area, box, group):
        self.at, self.area, self.box, self.group = at, area, box, group


def octant(sides, f, cuts, arcs, cube):
    """Quadrilaterals of one octant; of a cube only one flat and one cylinder, with the turned ones in the group."""
    inner = [s / 2 - f for s in sides]
    mirrors = [np.diag(d).astype(float) for d in np.array(np.meshgrid(*[(1, -1)] * 3)).reshape(3, 8).T]
    turns = [np.roll(np.eye(3), k, axis=0) for k in range(3)]
    both = [m @ t for m in mirrors for t in turns] if cube else mirrors
    out = []

    def add(at, area, us, vs, group):
        for u0, u1 in zip(us, us[1:]):
            for v0, v1 in zip(vs, vs[1:]):
                out.append(Patch(at, area, (u0, u1, v0, v1), group))

    for k in range(1 if cube else 3):
        i, j = (k + 1) % 3, (k + 2) % 3

        def flat(u, v, i=i, j=j, k=k):
            x = np.empty(np.broadcast(u, v).shape + (3,))
            x[..., i], x[..., j], x[..., k] = u, v, sides[k] / 2
            return x

        def round_edge(u, v, i=i, j=j, k=k):
            x = np.empty(np.broadcast(u, v).shape + (3,))
            x[..., k], x[..., i], x[..., j] = u, inner[i] + f * np.cos(v), inner[j] + f * np.sin(v)
            return x

        add(flat, lambda u, v: 1 + 0 * u * v, cuts(inner[i]), cuts(inner[j]), both)
        add(round_edge, lambda u, v: f + 0 * u * v, cuts(inner[k]), arcs, both)

    def ball(u, v):
        x = f * np.stack(np.broadcast_arrays(np.sin(u) * np.cos(v), np.sin(u) * np.sin(v), np.cos(u)), axis=-1)
        return x + np.array(inner)

    add(ball, lambda u, v: f * f * np.sin(u) + 0 * v, arcs, arcs, mirrors)
    return out


class Block:
    """Density over ε₀ at the Gauss points of every quadrilateral, for a potential of 1 V."""

    def __init__(self, sides, f, order, levels, arc_levels):
        cube = sides[0] == sides[1] == sides[2]

        def cuts(inner):
            """From the middle to the seam: pieces that shrink by 2.5 to f / 3^levels, the first one halved."""
            ends, step = [inner], f / 3**levels
            while ends[-1] - step > 0.35 * inner:
                ends.append(ends[-1] - step)
                step *= 2.5
            return np.array([0.0, ends[-1] / 2] + ends[::-1])

        half = [pi / 4 * 0.3**k for k in range(arc_levels, -1, -1)]
        arcs = np.array([0.0] + half + [pi / 2 - h for h in half[-2::-1]] + [pi / 2])
        self.order, self.f, self.sides = order, f, sides
        self.nodes, self.weights = legendre.leggauss(order)
        self.invert = np.linalg.inv(legendre.legvander(self.nodes, order - 1))
        self.patches = octant(sides, f, cuts, arcs, cube)
        self.x, self.w = (np.concatenate(part) for part in zip(*(self.points(p) for p in self.patches)))
        self.field = np.linalg.solve(self.matrix(), np.full(len(self.x), 4 * pi))
        copies = np.repeat([len(p.group) for p in self.patches], order**2)
        self.capacitance = (self.field * self.w * copies).sum()

    def points(self, p):
        u0, u1, v0, v1 = p.box
        u = ((u0 + u1) / 2 + (u1 - u0) / 2 * self.nodes)[:, None]
        v = ((v0 + v1) / 2 + (v1 - v0) / 2 * self.nodes)[None, :]
        w = (u1 - u0) * (v1 - v0) / 4 * np.outer(self.weights, self.weights)
        return p.at(u, v).reshape(-1, 3), (p.area(u, v) * w).ravel()

    def matrix(self):
        n, m = len(self.x), self.order**2
        out = np.zeros((n, n))
        for k, p in enumerate(self.patches):
            y, w = self.x[k * m : (k + 1) * m], self.w[k * m : (k + 1) * m]
            u0, u1, v0, v1 = p.box
            us, vs = np.linspace(u0, u1, 3), np.linspace(v0, v1, 3)
            ring = p.at(us[:, None], vs[None, :]).reshape(-1, 3)
            probe = np.concatenate([y, ring])
            size = max(np.linalg.norm(a - b) for a in ring for b in ring)
            block = out[:, k * m : (k + 1) * m]
            seen = []
            for g in p.group:
                x = self.x @ g  # The transpose of g on each point: its inverse.
                close = np.linalg.norm(x - probe.mean(axis=0), axis=1) < 3 * size
                close[close] = np.linalg.norm(x[close, None] - probe, axis=2).min(axis=1) < NEAR * size
                far = np.flatnonzero(~close)
                apart = np.sqrt(np.maximum((x[far] ** 2).sum(1)[:, None] + (y**2).sum(1) - 2 * x[far] @ y.T, 1e-300))
                block[far] += w / apart
                seen.append((np.flatnonzero(close), x[close]))
            rows = np.concatenate([i for i, _ in seen])
            if len(rows):
                np.add.at(block, rows, self.near(p, np.concatenate([x for _, x in seen])))
        return out

    def near(self, p, x):
        """∫ L_j / |x − y| dS for every x of a list, by bisection."""
        out = np.zeros((len(x), self.order**2))
        u0, u1, v0, v1 = p.box
        who, box = np.arange(len(x)), np.tile(np.array(p.box, float), (len(x), 1))
        least = SMALL * np.linalg.norm(p.at(np.array([u0]), np.array([v0])) - p.at(np.array([u1]), np.array([v1])))
        while len(who):
            mid_u, mid_v = (box[:, 0] + box[:, 1]) / 2, (box[:, 2] + box[:, 3]) / 2
            along_u = np.linalg.norm(p.at(box[:, 0], mid_v) - p.at(box[:, 1], mid_v), axis=1)
            along_v = np.linalg.norm(p.at(mid_u, box[:, 2]) - p.at(mid_u, box[:, 3]), axis=1)
            size = np.maximum(along_u, along_v)
            done = (np.linalg.norm(p.at(mid_u, mid_v) - x[who], axis=1) > 1.2 * size) | (size < least)
            for start in range(0, int(done.sum()), CHUNK):
                part = np.flatnonzero(done)[start : start + CHUNK]
                np.add.at(out, who[part], self.pieces(p, x[who[part]], box[part]))
            who, box, cut_u = who[~done], box[~done], (along_u >= along_v)[~done]
            lower, upper = box.copy(), box.copy()
            rows = np.arange(len(who))
            middle = np.where(cut_u, mid_u[~done], mid_v[~done])
            lower[rows, np.where(cut_u, 1, 3)] = upper[rows, np.where(cut_u, 0, 2)] = middle
            who, box = np.concatenate([who, who]), np.concatenate([lower, upper])
        return out

    def pieces(self, p, x, box):
        u, w = legendre.leggauss(self.order + 2)
        u0, u1, v0, v1 = p.box
        at_u = (box[:, :1] + box[:, 1:2]) / 2 + (box[:, 1:2] - box[:, :1]) / 2 * u
        at_v = (box[:, 2:3] + box[:, 3:]) / 2 + (box[:, 3:] - box[:, 2:3]) / 2 * u
        shape = lambda t, lo, hi: legendre.legvander((2 * t - lo - hi) / (hi - lo), self.order - 1) @ self.invert
        y = p.at(at_u[:, :, None], at_v[:, None, :])
        scale = (box[:, 1] - box[:, 0]) * (box[:, 3] - box[:, 2]) / 4
        k = p.area(at_u[:, :, None], at_v[:, None, :]) * np.outer(w, w) * scale[:, None, None]
        k = k / np.maximum(np.linalg.norm(y - x[:, None, None], axis=3), 1e-300)
        bu, bv = shape(at_u, u0, u1), shape(at_v, v0, v1)
        return (bu.transpose(0, 2, 1) @ k @ bv).reshape(len(x), -1)

    def on_patch(self, k, u, v):
        """E on the grid of u and v on quadrilateral k."""
        u0, u1, v0, v1 = self.patches[k].box
        bu = legendre.legvander((2 * u - u0 - u1) / (u1 - u0), self.order - 1) @ self.invert
        bv = legendre.legvander((2 * v - v0 - v1) / (v1 - v0), self.order - 1) @ self.invert
        m = self.order**2
        return bu @ self.field[k * m : (k + 1) * m].reshape(self.order, self.order) @ bv.T

    def field_at(self, point):
        """E at the point of the surface nearest to `point`, and how far that is."""
        best = (np.inf, 0.0)
        for k, p in enumerate(self.patches):
            for g in p.group:
                there = np.array(point) @ g
                away = lambda u, v: np.linalg.norm(p.at(u[:, None], v[None, :]) - there, axis=2)
                d, u, v = lowest(away, p.box)
                best = min(best, (float(d), float(self.on_patch(k, u, v)[0, 0])))
        return best[1], best[0]

    def highest(self):
        """Largest E, and its place in the octant."""
        best = (-np.inf, None)
        for k, p in enumerate(self.patches):
            e, u, v = lowest(lambda u, v: -self.on_patch(k, u, v), p.box)
            if -e > best[0]:
                best = (float(-e), p.at(u, v)[0])
        return best


def lowest(f, box):
    """Least value of f on a box, and its u and v: grids that close in on it."""
    u0, u1, v0, v1 = box
    for _ in range(28):
        u, v = np.linspace(u0, u1, 9), np.linspace(v0, v1, 9)
        d = f(u, v)
        a, b = np.unravel_index(d.argmin(), d.shape)
        du, dv = (u1 - u0) / 4, (v1 - v0) / 4
        u0, u1 = max(box[0], u[a] - du), min(box[1], u[a] + du)
        v0, v1 = max(box[2], v[b] - dv), min(box[3], v[b] + dv)
    return d[a, b], u[a : a + 1], v[b : b + 1]


def quantities(sides, f, resolution):
    """{quantity: (unit, value)} of a block [mm]: C over ε₀ in mm, fields in 1/mm, places in mm."""
    b = Block(sides, f, *resolution)
    inner = [s / 2 - f for s in sides]
    edge = [k + f / np.sqrt(2) for k in inner]
    out = {"C": ("F", b.capacitance)}
    for k in range(1 if len(set(sides)) == 1 else 3):
        place = [0 if i == k else edge[i] for i in range(3)]
        out[f"E at the middle of an edge along {'xyz'[k]}"] = ("V/m per V", b.field_at(place)[0])
    out["E in the middle of a corner"] = ("V/m per V", b.field_at([k + f / np.sqrt(3) for k in inner])[0])
    out["E_max"], place = ("V/m per V", b.highest()[0]), b.highest()[1]
    return out | {f"E_max; {axis}": ("m", x) for axis, x in zip("xyz", place)}
