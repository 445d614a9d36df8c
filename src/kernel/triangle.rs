//! The flat triangle with uniform charge.

use super::elementary;
use super::rules;
use super::segment::View;
use super::wide;
use crate::base::Vec3;
use crate::geom::Triangle;

/// Distance from the centroid, in longest edges, from which a seven-point rule replaces the closed
/// form [1].
///
/// The closed form is a difference of edge terms and loses digits with distance, 1e-16 × distance; the
/// rule gains with the sixth power: 3e-9 at 6 edges (measured), 4e-14 at 40.  The worst far point of the
/// tables errs by 8e-14.
const FAR_IN_EDGES: f64 = 40.0;

/// Height over longest edge under which a triangle counts as a sliver [1].
///
/// The closed form loses digits with this ratio: 1e-16 / ratio.
const SLIVER: f64 = 1e-2;

/// Height under which a point counts as in the plane, in units of its distance from the nearest corner
/// or its largest coordinate [1].
///
/// Sixteen roundings: a point worked out to lie in the plane is not nearer to it.
const IN_PLANE: f64 = 8.0 * f64::EPSILON;

/// A triangle with what its closed forms need, worked out once.
#[derive(Clone, Debug, PartialEq)]
pub struct Prepared {
    /// The triangle, its corners turned so that the longest edge comes first.
    pub(super) tri: Triangle,
    /// Unit normal.
    pub(super) n: Vec3,
    /// Twice the area [m²].
    pub(super) cross: f64,
    centroid: Vec3,
    /// Square of the distance from which the rule serves [m²].
    far_sq: f64,
    /// Longest edge, and height over it [m].
    pub(super) longest: f64,
    pub(super) height: f64,
    is_sliver: bool,
    /// Unit directions, outward normals in the plane and lengths [m] of the edges.
    pub(super) t: [Vec3; 3],
    pub(super) m: [Vec3; 3],
    pub(super) l: [f64; 3],
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
    Closed,
    SliverNear,
    SliverFar,
}

impl Prepared {
    /// Works out normals and lengths of `tri`.
    pub fn new(tri: &Triangle) -> Self {
        let e = |k: usize| tri.corners[(k + 1) % 3] - tri.corners[k % 3];
        let first = (1..3).fold(0, |best, k| if e(best).norm() < e(k).norm() { k } else { best });
        let tri = Triangle::new([0, 1, 2].map(|k| tri.corners[(first + k) % 3]));
        let [a, b, c] = &tri.corners;
        // A sliver loses its normal to rounding unless the differences are exact.
        let normal = wide::rounded(&wide::cross(&wide::difference(b, a), &wide::difference(c, a)));
        let unit = |d: Vec3| d.try_normalize(0.0).unwrap_or_else(Vec3::zeros);
        let (n, cross, e) = (unit(normal), normal.norm(), [b - a, c - b, a - c]);
        let (l, t) = (e.map(|e| e.norm()), e.map(unit));
        let m = t.map(|t| unit(t.cross(&n)));
        let longest = l[0];
        let height = if 0.0 < longest { cross / longest } else { 0.0 };
        Prepared {
            centroid: tri.centroid(),
            tri,
            n,
            cross,
            // Without area there is nothing to sum: the form beside a sliver says zero.
            far_sq: if 0.0 < cross { (FAR_IN_EDGES * longest).powi(2) } else { f64::INFINITY },
            longest,
            height,
            is_sliver: height < SLIVER * longest || cross <= 0.0,
            t,
            m,
            l,
        }
    }

    /// `∫ dS / r` over the triangle, seen from `x` [m].
    ///
    /// `Σ_edges p ln((r_a + r_b + l)/(r_a + r_b − l)) − |h| Ω`: each edge enters as a uniformly charged
    /// rod, weighted by its in-plane distance `p` from the foot of `x`; `h` is the height of `x` over
    /// the plane and `Ω` the solid angle (van Oosterom and Strackee 1983, eq. 8).  Far points take a
    /// seven-point rule, slivers forms of their own.
    ///
    /// Relative error against 50-digit arithmetic over 430 points (`tests/it/kernels.rs`): at most 6e-15
    /// for fat triangles up to 4 edges away, coplanar, on an edge, on a corner, near an edge or near the
    /// plane; 8e-14 far away (1e6 edges); 2e-13 for slivers down to a ratio of 1e-6, beside them or not.
    pub fn potential(&self, x: &Vec3) -> f64 {
        match self.form(x) {
            Form::Rule => {
                let term = |(w, weight): &([f64; 3], f64)| weight / (x - self.tri.at(*w)).norm();
                0.5 * self.cross * rules::SEVEN.iter().map(term).sum::<f64>()
            }
            Form::Closed => self.closed_potential(x),
            Form::SliverNear => self.near_potential(x),
            Form::SliverFar => self.far_potential(x),
        }
    }

    /// Gradient at `x` of [`Prepared::potential`] [1].
    ///
    /// In the plane `−Σ_edges m ln(…)`, with `m` the outward edge normals; across it `−sign(h) Ω`, taken
    /// as zero in the plane itself (the mean of both sides), which is where rounding hides the side.
    ///
    /// Relative error over the same points: at most 3e-13 away from the edges, slivers and far points
    /// included; 3e-8 at 1e-9 edges from an edge of a fat triangle, where rounding blurs the distance; on
    /// an edge the in-plane part is infinite.
    pub fn gradient(&self, x: &Vec3) -> Vec3 {
        match self.form(x) {
            Form::Rule => {
                let add = |sum: Vec3, (w, weight): &([f64; 3], f64)| {
                    let d = x - self.tri.at(*w);
                    sum - d * (0.5 * self.cross * weight / d.norm().powi(3))
                };
                rules::SEVEN.iter().fold(Vec3::zeros(), add)
            }
            Form::Closed => self.closed_gradient(x),
            Form::SliverNear => self.near_gradient(x),
            Form::SliverFar => self.far_gradient(x),
        }
    }

    #[inline(always)]
    fn form(&self, x: &Vec3) -> Form {
        if self.far_sq < (x - self.centroid).norm_squared() {
            Form::Rule
        } else if !self.is_sliver {
            Form::Closed
        } else if self.is_beside(x) {
            Form::SliverNear
        } else {
            Form::SliverFar
        }
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
        let sign = side(h, x, &r);
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
        2.0 * elementary::upper_angle(numerator, denominator)
    }
}

/// On which side of the plane `x` is, from its height `h` and its distances from the corners: 1, −1, or
/// 0 for a point that only rounding lifts out of it.
pub(super) fn side(h: f64, x: &Vec3, r: &[f64; 3]) -> f64 {
    let size = r[0].min(r[1]).min(r[2]).max(x.amax());
    if h.abs() <= IN_PLANE * size { 0.0 } else { h.signum() }
}
