//! From the strength of a sharp edge or corner to the highest field on its rounding.
//!
//! A fillet of radius ρ, tangent to both faces of a wedge of angle w, carries at most
//! `E = c(w) K ρ^(n−1)`, with K and `n = π/(2π−w)` of the sharp edge and ρ far smaller than everything else.  At
//! the rim of a sheet (w = 0) the rounding is a half circle and the metal 2ρ thick, the sheet its middle.  The next
//! terms of the sharp field, `K₂ s^(2n−1)` (opposite on the two faces) and `K₃ s^(3n−1)`, give the first correction:
//! `1 + A x₃ + B x₂²` with `x₂ = K₂ ρ^n / K`, `x₃ = K₃ ρ^(2n) / K`; at a rim `1 + A x₃ ln x₃ + B x₂²`.

use crate::base::Vec3;
use crate::physics::edges::Edge;
use crate::physics::strength;
use crate::physics::strength::Place;
use nalgebra::DMatrix;
use nalgebra::DVector;
use std::f64::consts::FRAC_PI_2;

/// Angle through the metal [degrees], c, A and B of the fillet; plane second-kind integral equation for c, change between
/// ρ/side 0.003 and 0.001 at most 0.3 %; the value at 0° and for the rim is the limit of plates with half-round
/// edges (1.699, 1.776, 1.838, 1.865 at ρ/width 0.1, 0.05, 0.02, 0.01), that at 180° exact.
///
/// A and B by a plane first-kind integral equation with graded panels: A from regular prisms of 3, 4, 6, 8 and 12 sides
/// and an isosceles one of 30° (ρ/side 0.02 and 0.1), B from wedges one length above a plane (ρ 0.02 to 0.5).
const FILLET: [[f64; 4]; 9] = [
    [0.0, 1.9, 2.6, -1.5],
    [30.0, 1.867_69, 2.4, -1.12],
    [45.0, 1.845_99, 2.2, -0.85],
    [60.0, 1.819_47, 1.95, -0.58],
    [90.0, 1.746_06, 0.765, 0.29],
    [120.0, 1.629_13, 0.25, 0.43],
    [135.0, 1.543_72, 0.13, 0.38],
    [150.0, 1.429_72, 0.09, 0.30],
    [180.0, 1.0, 0.0, 0.0],
];

/// The same for the rim of a sheet.
///
/// Isolated plates of ρ/width 0.01 to 0.1 within 0.3 %; plates over a plane one gap under the metal, ρ/gap 0.05 to 0.5:
/// −0.3, +0.7, +1.8, −2.2 %, at ρ/gap 1 −17 %.
const RIM: [f64; 3] = [1.9, 0.695, 4.2];

/// Angle under which an edge is a rim [rad].
const RIM_ANGLE: f64 = 1e-6;

/// Doubt of c itself [1], and of the correction, in sizes of its terms [1].
///
/// Square bars of ρ/side 0.01 to 0.2 come out within 0.3 % with terms up to 0.035; block over a plane, ρ/gap 1, +4.8 %
/// with terms of 0.24; plate over a plane, ρ/gap 1, −17 % with terms of 1.3.
const BASE: f64 = 0.005;
const SHARE: f64 = 0.25;

/// Sum of the terms from which the rounding is not small against the part [1].
pub const NOT_SMALL: f64 = 0.15;

/// Distance from a corner from which the law of edges holds, in radii [1].
pub const OFF_CORNER: f64 = 5.0;

/// Highest field on a rounding.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rounded {
    /// Highest field [V/m].
    pub field: f64,
    /// Its bar [V/m].
    pub bar: f64,
    /// Size of the correction's terms [1].
    pub terms: f64,
}

/// Coefficient of the rounded edge [1] and its two corrections, for an angle through the metal [rad].
///
/// The first of the triple is c in `E = c K ρ^(n−1)`; a monotone cubic (Fritsch and Carlson, SIAM J. Numer. Anal. 17,
/// 1980) through the table.
pub fn coefficients(angle: f64) -> [f64; 3] {
    if angle < RIM_ANGLE {
        return RIM;
    }
    [1, 2, 3].map(|column| monotone(angle.to_degrees().clamp(0.0, 180.0), column))
}

/// Value at `x` of the cubic through the points of the table.
fn monotone(x: f64, column: usize) -> f64 {
    let n = FILLET.len();
    let slope = |k: usize| (FILLET[k + 1][column] - FILLET[k][column]) / (FILLET[k + 1][0] - FILLET[k][0]);
    let tangent = |k: usize| match k {
        0 => slope(0),
        k if k + 1 == n => slope(n - 2),
        k => {
            let (a, b) = (slope(k - 1), slope(k));
            if a * b <= 0.0 { 0.0 } else { 2.0 * a * b / (a + b) }
        }
    };
    let k = (0..n - 1).rfind(|k| FILLET[*k][0] <= x).unwrap_or(0);
    let width = FILLET[k + 1][0] - FILLET[k][0];
    let t = (x - FILLET[k][0]) / width;
    let (t2, t3) = (t * t, t * t * t);
    FILLET[k][column] * (2.0 * t3 - 3.0 * t2 + 1.0)
        + FILLET[k + 1][column] * (3.0 * t2 - 2.0 * t3)
        + width * (tangent(k) * (t3 - 2.0 * t2 + t) + tangent(k + 1) * (t3 - t2))
}

/// Highest field on the rounding of radius `radius` [m] at a place, where its K is `strength` with the bar `bar`, at
/// row potentials `v` [V/m].
pub fn edge(place: &Place, [strength, bar]: [f64; 2], v: &[f64], radius: f64) -> Rounded {
    let n = strength::order(place.angle);
    let [c, a, b] = coefficients(place.angle);
    let k = strength.abs().max(f64::MIN_POSITIVE);
    let x2 = strength::dot(&place.second, v) * radius.powf(n) / k;
    let x3 = strength::dot(&place.third, v) * radius.powf(2.0 * n) / k * strength.signum();
    let third = if place.angle < RIM_ANGLE && 0.0 < x3.abs() { a * x3 * x3.abs().ln() } else { a * x3 };
    let (third, second) = (third.clamp(-MOST, MOST), (b * x2 * x2).clamp(-MOST, MOST));
    let terms = third.abs() + second.abs();
    let sharp = c * k * radius.powf(n - 1.0);
    let field = sharp * (1.0 + third + second).max(LEAST);
    Rounded { field, bar: field * (bar / k + BASE + SHARE * terms), terms }
}

/// Largest term that is taken, and least factor that is left [1].
const MOST: f64 = 1.5;
const LEAST: f64 = 0.2;

/// Strength along one edge as seen from a corner at which it ends.
#[derive(Clone, Debug, PartialEq)]
pub struct Ray {
    /// Angle through the metal [rad].
    pub angle: f64,
    /// Unit vector along the edge, from the corner.
    pub direction: Vec3,
    /// Distance from the corner [m], K and its bar [V·m^(−n)].
    pub values: Vec<[f64; 3]>,
    /// Length of the edge [m].
    pub length: f64,
}

/// A corner at which edges end: `K(t) ~ t^m` along each, `E ~ r^(λ−1)`, with `λ = n + m` the same for all.
#[derive(Clone, Debug, PartialEq)]
pub struct Corner {
    /// Index of the body.
    pub body: usize,
    /// The corner [m].
    pub at: Vec3,
    /// Index of each edge that ends here, and whether it ends with its start.
    pub edges: Vec<(usize, bool)>,
}

/// The law of a corner.
#[derive(Clone, Debug, PartialEq)]
pub struct CornerLaw {
    /// λ − 1: exponent of distance [1].
    pub exponent: f64,
    /// `Σ ln(c K₀)` over the edges, divided by their number: logarithm of the strength.
    level: f64,
    /// Relative bar of the strength at the distance `near` [1].
    doubt: f64,
    /// Least distance from the corner at which K is known [m].
    near: f64,
    /// Bar of the exponent [1].
    exponent_bar: f64,
    /// Least length of an edge that ends here [m].
    length: f64,
    /// Whether the law was measured on corners like this: three convex edges of a solid.
    plain: bool,
}

/// Corners of all edges that are not closed.
pub fn corners(edges: &[Edge]) -> Vec<Corner> {
    let mut found: Vec<Corner> = Vec::new();
    for (e, edge) in edges.iter().enumerate().filter(|(_, edge)| !edge.closed) {
        let ends =
            [(edge.segments[0].ends[0], true), (edge.segments[edge.segments.len() - 1].ends[1], false)];
        for (at, start) in ends {
            let near = SAME_CORNER * edge.length();
            match found.iter_mut().find(|c| c.body == edge.body && (c.at - at).norm() <= near) {
                Some(corner) => corner.edges.push((e, start)),
                None => found.push(Corner { body: edge.body, at, edges: vec![(e, start)] }),
            }
        }
    }
    found
}

/// Distance between ends of edges that are one corner, in lengths of an edge [1].
const SAME_CORNER: f64 = 1e-6;

/// λ of the corner of a cube and of a quarter of a plane, which are known: 0.454 17 (Morrison and Lewis, SIAM J. Appl.
/// Math. 31, 1976, and later: 0.296 58 for the quarter plane).
const CUBE: f64 = 0.454_17;
const QUARTER: f64 = 0.296_58;

/// Difference from a right angle under which it counts as one [rad].
const RIGHT: f64 = 0.01;

/// Power of distance of the next term along an edge [1]: on the cube K doubles its departure from `t^m` 2.65-fold from
/// octave to octave.
const NEXT: f64 = 1.4;

/// Share of the length of an edge within which K tells the law of its end [1].
const WITHIN: f64 = 0.26;

/// Field at the corner over the geometric mean of `c K₀ ρ^(λ−1)` of its edges [1].
///
/// Filleted cube with ρ 4 and 2 % of the side: 1.55, 1.55; prisms of triangles 1.56, of hexagons 1.50 (ρ 4 %), all with
/// balls of the same radius at the corners.
const CORNER: f64 = 1.55;

/// Doubt of it [1]: where it was measured, and elsewhere.
const CORNER_BASE: [f64; 2] = [0.04, 0.25];

/// The law of a corner from the strengths along its edges; none where they do not tell one.
pub fn corner_law(rays: &[Ray]) -> Option<CornerLaw> {
    let all = fit(rays, 0)?;
    let fewer = fit(rays, 1).unwrap_or(all);
    let plain = rays.len() == 3 && rays.iter().all(|ray| RIM_ANGLE < ray.angle);
    let near = rays.iter().filter_map(|ray| ray.values.first()).map(|v| v[0]).fold(f64::INFINITY, f64::min);
    let level = |(lambda, level): (f64, f64)| level + (lambda - 1.0) * near.ln();
    let bars = rays.iter().flat_map(|ray| ray.values.iter().take(2)).map(|[_, k, bar]| bar / k);
    let count = rays.iter().map(|ray| ray.values.len().min(2)).sum::<usize>().max(1) as f64;
    Some(CornerLaw {
        exponent: all.0 - 1.0,
        level: all.1,
        doubt: (level(all) - level(fewer)).abs() + bars.sum::<f64>() / count,
        near,
        exponent_bar: if known(rays).is_some() { 0.0 } else { (all.0 - fewer.0).abs() + LAMBDA },
        length: rays.iter().map(|ray| ray.length).fold(f64::INFINITY, f64::min),
        plain,
    })
}

/// Doubt of a fitted λ [1].
const LAMBDA: f64 = 0.01;

impl CornerLaw {
    /// Highest field on the rounding of radius `radius` [m]: a ball of that radius that touches the fillets [V/m].
    pub fn rounded(&self, radius: f64) -> Rounded {
        let field = CORNER * (self.level + self.exponent * radius.ln()).exp();
        let terms = (radius / self.length).powf(NEXT);
        let far = (radius / self.near).ln().abs();
        let base = CORNER_BASE[usize::from(!self.plain)];
        Rounded { field, bar: field * (base + self.doubt + self.exponent_bar * far + terms), terms }
    }
}

/// λ where the corner is one of the known ones.
fn known(rays: &[Ray]) -> Option<f64> {
    let right = |a: &Ray, b: &Ray| a.direction.dot(&b.direction).abs() <= RIGHT;
    let all = |angle: f64| rays.iter().all(|ray| (ray.angle - angle).abs() <= RIGHT);
    match rays {
        [a, b, c] if all(FRAC_PI_2) && right(a, b) && right(b, c) && right(a, c) => Some(CUBE),
        [a, b] if all(0.0) && right(a, b) => Some(QUARTER),
        _ => None,
    }
}

/// λ and the mean of `ln(c K₀)` over the edges by least squares of
/// `ln K = ln K₀ + (λ − n) ln t + a (t/length)^1.4`, without the `skip` places nearest to the corner.
fn fit(rays: &[Ray], skip: usize) -> Option<(f64, f64)> {
    let known = known(rays);
    let mut rows: Vec<(usize, f64, f64, f64, f64)> = Vec::new();
    for (e, ray) in rays.iter().enumerate() {
        let n = strength::order(ray.angle);
        for [t, k, bar] in ray.values.iter().skip(skip).filter(|[t, ..]| *t <= WITHIN * ray.length) {
            if *k <= 0.0 || *t <= 0.0 {
                return None;
            }
            let weight = 1.0 / (bar / k).max(1e-3);
            rows.push((e, t.ln(), (t / ray.length).powf(NEXT), k.ln() + n * t.ln(), weight));
        }
    }
    let count = rays.len();
    let unknowns = 2 * count + usize::from(known.is_none());
    if count == 0 || rows.len() < unknowns {
        return None;
    }
    let a = DMatrix::from_fn(rows.len(), unknowns, |r, c| {
        let (e, log, next, _, weight) = rows[r];
        weight
            * match c {
                c if c < count => f64::from(u8::from(c == e)),
                c if c < 2 * count => next * f64::from(u8::from(c - count == e)),
                _ => log,
            }
    });
    let right = DVector::from_fn(rows.len(), |r, _| {
        let (_, log, _, value, weight) = rows[r];
        weight * (value - known.unwrap_or(0.0) * log)
    });
    let found = a.svd(true, true).solve(&right, 1e-12).ok()?;
    let lambda = known.unwrap_or_else(|| found[2 * count]);
    let level = |e: usize| found[e] + coefficients(rays[e].angle)[0].ln();
    let mean = (0..count).map(level).sum::<f64>() / count as f64;
    (lambda.is_finite() && mean.is_finite() && 0.0 < lambda).then_some((lambda, mean))
}
