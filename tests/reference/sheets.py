"""Capacitance of two equal parallel sheets with a narrow gap, discs and squares; axisymmetric.py writes it to cad.csv.

Discs of radius 1, gap g: Love's equation (Love, Quart. J. Mech. Appl. Math. 2, 1949, 428)

    f(x) ∓ (1/π) ∫ g f(y) dy / (g² + (x − y)²) = 1,   −1 < x < 1,   charge for ±1 V: 4 ε₀ ∫ f dx,

upper sign for opposite, lower for equal potentials; polynomials on panels that shrink towards x = 1.

Squares of side 1, gap g: Galerkin's method with products p(x) q(y) of polynomials on panels that shrink geometrically
towards the edges, of rising degree away from them (Schwab, p- and hp-Finite Element Methods, 1998).  With

    1/R = (2/√π) ∫ exp(−R² t²) dt,   t = exp(s), trapezoidal rule in s,

every term is a product of a matrix in x and one in y; the second sheet multiplies a term by 1 ∓ exp(−g² t²).  A matrix
entry is ∫ exp(−t² u²) c(u) du with c the correlation of two polynomials, itself a polynomial between the differences of
the panels' ends: Gauss points on pieces that halve towards u = 0 serve every t.  The capacitance of opposite or equal
sheets is then a lower bound, up to rounding.
"""

import numpy as np
from numpy.polynomial import legendre


def halving(lo, hi, depth=50):
    """Ends of pieces of [lo, hi] that shrink by half towards 0; lo and hi are not of opposite sign."""
    if lo < 0:
        return [(-b, -a) for a, b in halving(-hi, -lo, depth)]
    start = max(lo, hi * 2.0**-depth)
    n = max(1, int(np.ceil(np.log2(hi / start) - 1e-9)))
    cuts = start * (hi / start) ** (np.arange(n + 1) / n)
    cuts[0], cuts[-1] = lo, hi
    return list(zip(cuts, cuts[1:]))


def rule(pieces, order):
    """Gauss points and weights on all pieces."""
    u, w = legendre.leggauss(order)
    lo, hi = np.array(pieces).T
    return ((lo + hi)[:, None] / 2 + np.outer((hi - lo) / 2, u)).ravel(), np.outer((hi - lo) / 2, w).ravel()


def disc_charge(gap, sign, order, ratio=0.5):
    """∫ f dx of Love's equation, `sign` −1 for opposite and +1 for equal potentials."""
    edges = [0.0] + [1 - ratio**k for k in range(1, 60) if ratio**k > gap / 40] + [1.0]
    nodes, w = legendre.leggauss(order)
    invert = np.linalg.inv(legendre.legvander(nodes, order - 1))
    panels = list(zip(edges, edges[1:]))
    x = np.concatenate([(a + b) / 2 + (b - a) / 2 * nodes for a, b in panels])
    weights = np.concatenate([(b - a) / 2 * w for a, b in panels])
    matrix = np.eye(len(x))
    for j, (a, b) in enumerate(panels):
        for i, at in enumerate(x):
            for centre in (at, -at):
                todo, pieces = [(a, b)], []
                while todo:
                    lo, hi = todo.pop()
                    if hi - lo <= np.hypot((lo + hi) / 2 - centre, gap):
                        pieces.append((lo, hi))
                    else:
                        todo += [(lo, (lo + hi) / 2), ((lo + hi) / 2, hi)]
                y, v = rule(pieces, order + 8)
                basis = legendre.legvander((2 * y - a - b) / (b - a), order - 1) @ invert
                matrix[i, j * order : (j + 1) * order] += sign / np.pi * (gap / (gap**2 + (centre - y) ** 2) * v) @ basis
    return 2 * weights @ np.linalg.solve(matrix, np.ones(len(x)))


def disc_pair(gap, order):
    """C11, C12 over 4πε₀a."""
    opposite, equal = (disc_charge(gap, sign, order) / np.pi for sign in (-1, 1))
    return (opposite + equal) / 2, (equal - opposite) / 2


def gaussian_matrices(panels, degrees, t, order=20):
    """∫∫ p_i(x) p_j(x') exp(−t²(x − x')²) over [0, 1]², even functions about the middle; (n, n, len(t)).

    Panels are given by the distance of their ends from the edge; p_i are Legendre polynomials on panel and mirror panel.
    """
    first = np.concatenate([[0], np.cumsum([p + 1 for p in degrees])])
    out = np.zeros((first[-1], first[-1], len(t)))
    for i, (a0, a1) in enumerate(panels):
        for j, (b0, b1) in enumerate(panels[: i + 1]):
            block = 0.0
            for mirror in (False, True):
                # x and x' are distances from the same edge; the mirror panel is at 1 − b.
                c0, c1 = (1 - b1, 1 - b0) if mirror else (b0, b1)
                ends = sorted({a0 - c1, a0 - c0, a1 - c1, a1 - c0} | ({0.0} if a0 - c1 < 0 < a1 - c0 else set()))
                u, w = rule([piece for lo, hi in zip(ends, ends[1:]) for piece in halving(lo, hi)], order)
                lo, hi = np.maximum(a0, c0 + u), np.minimum(a1, c1 + u)
                g, v = legendre.leggauss((degrees[i] + degrees[j]) // 2 + 1)
                x = (lo + hi)[:, None] / 2 + np.outer((hi - lo) / 2, g)
                pa = legendre.legvander((2 * x - a0 - a1) / (a1 - a0), degrees[i])
                pb = legendre.legvander((2 * (x - u[:, None]) - c0 - c1) / (c1 - c0) * (-1 if mirror else 1), degrees[j])
                correlation = np.einsum("uqa,uqb,uq->abu", pa, pb, np.outer((hi - lo) / 2, v), optimize=True)
                block = block + 2 * (correlation * w) @ np.exp(-np.outer(u**2, t**2))
            rows, cols = slice(first[i], first[i + 1]), slice(first[j], first[j + 1])
            out[rows, cols] = block
            out[cols, rows] = block.transpose(1, 0, 2)
    return out


def square_charges(gaps, ratio, most, tip, step):
    """{gap: (opposite, equal)}: charge over 4πε₀ of one of two unit squares at ±1 V and at 1 V; gap None for one alone."""
    levels = int(np.ceil(np.log(tip) / np.log(ratio)))
    ends = [0.0] + [0.5 * ratio ** (levels - k) for k in range(levels + 1)]
    panels = list(zip(ends, ends[1:]))
    degrees = [min(most, 1 + k) for k in range(len(panels))]
    t = np.exp(np.arange(np.log(1e-10), np.log(1e4 / (0.5 * ratio**levels)), step))
    a = gaussian_matrices(panels, degrees, t)
    n = len(a)
    i, j = np.triu_indices(n)
    load = np.zeros(n)  # ∫ p over the side: only the constants.
    load[np.concatenate([[0], np.cumsum([p + 1 for p in degrees])[:-1]])] = [2 * (hi - lo) for lo, hi in panels]
    right = np.outer(load, load)[i, j] * np.where(i == j, 1, 2)
    flat = a.reshape(n * n, -1)
    out = {}
    for gap in gaps:
        both = []
        for second in (0,) if gap is None else (-1, 1):
            factor = 1 if not second else (-np.expm1(-((gap * t) ** 2)) if second < 0 else 1 + np.exp(-((gap * t) ** 2)))
            full = ((flat * (2 / np.sqrt(np.pi) * step * t * factor)) @ flat.T).reshape(n, n, n, n).transpose(0, 2, 1, 3)
            m = full[i, j][:, i, j] + full[j, i][:, i, j] + full[i, j][:, j, i] + full[j, i][:, j, i]
            m *= np.where(i == j, 0.5, 1)[:, None] * np.where(i == j, 0.5, 1)
            scale = 1 / np.sqrt(np.diag(m))
            both.append(right @ (scale * np.linalg.solve(m * scale[:, None] * scale, scale * right)))
        out[gap] = tuple(both)
    return out
