//! The flat triangle with uniform charge.

use super::rules;
use super::segment;
use super::segment::View;
use crate::base::Vec3;
use crate::geom::Triangle;

/// Distance from the centroid, in longest edges, from which a seven-point rule replaces the closed
/// form [1].
///
/// The closed form is a difference of edge terms and loses digits with distance, 1e-16 × distance;
/// the rule gains with the sixth power: 3e-9 at 6 edges (measured), 1e-15 at 60.
const FAR_IN_EDGES: f64 = 60.0;

/// Height over longest edge under which a triangle counts as a sliver [1].
///
/// The closed form loses digits with this ratio: 1e-16 / ratio.
const SLIVER: f64 = 1e-2;

/// Distance from a sliver, in its heights, from which it is summed as line elements [1].
///
/// Eight Gauss points across the height, measured on slivers of ratio 1e-2 … 1e-6: 1e-12 at 4
/// heights, 1e-15 at 8.
const SLIVER_FAR: f64 = 8.0;

/// A triangle with what its closed forms need, worked out once.
#[derive(Clone, Debug, PartialEq)]
pub struct Prepared {
    tri: Triangle,
    /// Unit normal.
    n: Vec3,
    /// Twice the area [m²].
    cross: f64,
    centroid: Vec3,
    /// Longest edge, and height over it [m].
    longest: f64,
    height: f64,
    /// Unit directions, outward normals in the plane and lengths [m] of the edges.
    t: [Vec3; 3],
    m: [Vec3; 3],
    l: [f64; 3],
}

/// `∫ dS / r` over the triangle, seen from `x` [m]; see [`Prepared::potential`].
pub fn potential(tri: &Triangle, x: &Vec3) -> f64 {
    Prepared::new(tri).potential(x)
}

/// Gradient at `x` of [`potential`] [1]; see [`Prepared::gradient`].
pub fn gradient(tri: &Triangle, x: &Vec3) -> Vec3 {
    Prepared::new(tri).gradient(x)
}

/// How the integral is taken for a given point.
enum Form {
    Rule,
    Lines,
    Closed,
}

impl Prepared {
    /// Works out normals and lengths of `tri`.
    pub fn new(tri: &Triangle) -> Self {
        let (n, cross, longest) = (tri.normal(), tri.cross().norm(), tri.longest_edge());
        let e = |k: usize| tri.corners[(k + 1) % 3] - tri.corners[k];
        let unit = |d: Vec3| d.try_normalize(0.0).unwrap_or_else(Vec3::zeros);
        let (l, t) = ([0, 1, 2].map(|k| e(k).norm()), [0, 1, 2].map(|k| unit(e(k))));
        let m = t.map(|t| unit(t.cross(&n)));
        let height = if 0.0 < longest { cross / longest } else { 0.0 };
        Prepared { tri: *tri, n, cross, centroid: tri.centroid(), longest, height, t, m, l }
    }

    /// `∫ dS / r` over the triangle, seen from `x` [m].
    ///
    /// `Σ_edges p ln((r_a + r_b + l)/(r_a + r_b − l)) − |h| Ω`: each edge enters as a uniformly charged
    /// rod, weighted by its in-plane distance `p` from the foot of `x`; `h` is the height of `x` over
    /// the plane and `Ω` the solid angle (van Oosterom and Strackee 1983, eq. 8).  Far points take a
    /// seven-point rule, slivers seen from outside a sum of line elements.
    ///
    /// Relative error against 50-digit arithmetic (`tests/it/kernels.rs`): at most 1e-12 over random,
    /// sliver, coplanar, on-edge, on-vertex and far points (1e6 edges).
    pub fn potential(&self, x: &Vec3) -> f64 {
        match self.form(x) {
            Form::Rule => {
                let term = |(w, weight): &([f64; 3], f64)| weight / (x - self.tri.at(*w)).norm();
                0.5 * self.cross * rules::SEVEN.iter().map(term).sum::<f64>()
            }
            Form::Lines => self.slices().iter().map(|(a, b, w)| w * segment::potential(a, b, x)).sum(),
            Form::Closed => self.closed_potential(x),
        }
    }

    /// Gradient at `x` of [`Prepared::potential`] [1].
    ///
    /// In the plane `−Σ_edges m ln(…)`, with `m` the outward edge normals; across it `−sign(h) Ω`, taken
    /// as zero in the plane itself (the mean of both sides).
    ///
    /// Error against 50-digit arithmetic, relative to the largest term: at most 1e-10 away from the
    /// edges (`tests/it/kernels.rs`); on an edge the in-plane part is infinite.
    pub fn gradient(&self, x: &Vec3) -> Vec3 {
        match self.form(x) {
            Form::Rule => {
                let add = |sum: Vec3, (w, weight): &([f64; 3], f64)| {
                    let d = x - self.tri.at(*w);
                    sum - d * (0.5 * self.cross * weight / d.norm().powi(3))
                };
                rules::SEVEN.iter().fold(Vec3::zeros(), add)
            }
            Form::Lines => {
                let add = |sum: Vec3, (a, b, w): &(Vec3, Vec3, f64)| sum + segment::gradient(a, b, x) * *w;
                self.slices().iter().fold(Vec3::zeros(), add)
            }
            Form::Closed => self.closed_gradient(x),
        }
    }

    /// Outward normals in the plane and lengths [m] of the edges; edge `k` runs from corner `k`.
    pub(super) fn edges(&self) -> ([Vec3; 3], [f64; 3]) {
        (self.m, self.l)
    }

    fn form(&self, x: &Vec3) -> Form {
        let distance_sq = (x - self.centroid).norm_squared();
        if (FAR_IN_EDGES * self.longest).powi(2) < distance_sq {
            Form::Rule
        } else if SLIVER * self.longest <= self.height || self.is_beside(x) {
            Form::Closed
        } else {
            Form::Lines
        }
    }

    /// Whether `x` is within a few heights of a sliver, where the closed form does not cancel.
    fn is_beside(&self, x: &Vec3) -> bool {
        let (a, b, _) = &self.slices()[0];
        let e = b - a;
        let t =
            if 0.0 < e.norm_squared() { ((x - a).dot(&e) / e.norm_squared()).clamp(0.0, 1.0) } else { 0.0 };
        (a + e * t - x).norm() <= SLIVER_FAR * self.height
    }

    /// Segments parallel to the longest edge at the Gauss points of the height, with weights [m].
    fn slices(&self) -> [(Vec3, Vec3, f64); 8] {
        let longest = (1..3).fold(0, |best, k| if self.l[best] < self.l[k] { k } else { best });
        let [p, q, apex] = [0, 1, 2].map(|k| self.tri.corners[(longest + k) % 3]);
        rules::GAUSS_EIGHT.map(|(t, w)| (p + (apex - p) * t, q + (apex - q) * t, w * self.height))
    }

    /// What the corners look like from `x`: vectors and distances [m].
    fn view(&self, x: &Vec3) -> ([Vec3; 3], [f64; 3]) {
        let d = self.tri.corners.map(|p| p - x);
        (d, d.map(|d| d.norm()))
    }

    fn closed_potential(&self, x: &Vec3) -> f64 {
        let (d, r) = self.view(x);
        let mut sum = 0.0;
        for k in 0..3 {
            let (a, b) = (k, (k + 1) % 3);
            let near = if r[a] < r[b] { a } else { b };
            let p = self.m[k].dot(&d[near]);
            let view = View::of(self.l[k], &self.t[k], [&d[a], &d[b]], [r[a], r[b]]);
            // On the line of the edge p = 0, and p ln(1/d) tends to 0.
            if 0.0 < view.d_sq && p != 0.0 {
                sum += p * view.logarithm();
            }
        }
        let h = self.height_of(&d, &r).abs();
        sum - h * self.solid_angle(&d, &r, h)
    }

    fn closed_gradient(&self, x: &Vec3) -> Vec3 {
        let (d, r) = self.view(x);
        let mut sum = Vec3::zeros();
        for k in 0..3 {
            let (a, b) = (k, (k + 1) % 3);
            sum -= self.m[k] * View::of(self.l[k], &self.t[k], [&d[a], &d[b]], [r[a], r[b]]).logarithm();
        }
        let h = self.height_of(&d, &r);
        let sign = if h == 0.0 { 0.0 } else { h.signum() };
        sum - self.n * (sign * self.solid_angle(&d, &r, h.abs()))
    }

    /// Height of `x` over the plane, from its nearest corner [m].
    fn height_of(&self, d: &[Vec3; 3], r: &[f64; 3]) -> f64 {
        let nearest = (1..3).fold(0, |best, k| if r[k] < r[best] { k } else { best });
        -self.n.dot(&d[nearest])
    }

    /// Solid angle without sign, from the height `h ≥ 0` of the point over the plane [sr].
    fn solid_angle(&self, [a, b, c]: &[Vec3; 3], [ra, rb, rc]: &[f64; 3], h: f64) -> f64 {
        let numerator = h * self.cross;
        let denominator = ra * rb * rc + a.dot(b) * rc + a.dot(c) * rb + b.dot(c) * ra;
        if numerator == 0.0 { 0.0 } else { 2.0 * numerator.atan2(denominator) }
    }
}
