//! The line element: a thin rod with uniform charge.

use super::elementary;
use super::wide;
use crate::base::Vec3;

/// Where `x` lies against the segment: distances to the ends and coordinates along it.
pub(super) struct View {
    /// Length [m].
    pub(super) l: f64,
    /// Distances from `x` to the two ends [m].
    pub(super) r: [f64; 2],
    /// Coordinates of the ends along the segment, counted from the foot of the perpendicular [m].
    pub(super) s: [f64; 2],
    /// Distance from `x` to the line through the segment, squared [m²].
    pub(super) d_sq: f64,
}

/// Ratio of length to the sum of the end distances above which the near form is taken [1].
///
/// `l / (r_a + r_b)` close to 1 means close to the segment, where `r_a + r_b − l` cancels.  At 0.9
/// the plain form has lost one digit at most; both forms agree there to 6e-16.
const NEAR: f64 = 0.9;

impl View {
    /// From the ends; `d_sq` keeps its digits however near the line is.
    fn new(a: &Vec3, b: &Vec3, x: &Vec3) -> (Self, Vec3) {
        let (e, da, db) = (b - a, a - x, b - x);
        let (l, r) = (e.norm(), [da.norm(), db.norm()]);
        let near = if r[0] < r[1] { a } else { b };
        let turned = wide::rounded(&wide::cross(&wide::difference(b, a), &wide::difference(near, x)));
        let t = if 0.0 < l { e / l } else { Vec3::zeros() };
        let d_sq = if 0.0 < l { (turned / l).norm_squared() } else { 0.0 };
        (View { l, r, s: [da.dot(&t), db.dot(&t)], d_sq }, t.cross(&turned) / l)
    }

    /// From the length, the direction, and the vectors and distances from `x` to the ends.
    #[inline(always)]
    pub(super) fn of(l: f64, t: &Vec3, d: [&Vec3; 2], r: [f64; 2]) -> Self {
        // The end that is nearer gives the smaller rounding in the distance from the line.
        let near = if r[0] < r[1] { d[0] } else { d[1] };
        View { l, r, s: [d[0].dot(t), d[1].dot(t)], d_sq: t.cross(near).norm_squared() }
    }

    /// `∫ ds / r` [1]; infinite on the segment itself.
    #[inline(always)]
    pub(super) fn logarithm(&self) -> f64 {
        let ([ra, rb], [sa, sb]) = (self.r, self.s);
        let around = ra + rb;
        if self.l <= 0.0 {
            0.0
        } else if self.l < NEAR * around {
            elementary::log_sides(around, self.l)
        } else if 0.0 <= sa {
            elementary::log_ratio(rb + sb, ra + sa)
        } else if sb <= 0.0 {
            elementary::log_ratio(ra - sa, rb - sb)
        } else {
            elementary::log_ratio((rb + sb) * (ra - sa), self.d_sq)
        }
    }

    /// `s_b/r_b − s_a/r_a` without cancellation [1].
    pub(super) fn sine_difference(&self) -> f64 {
        let ([ra, rb], [sa, sb]) = (self.r, self.s);
        let middle = (sa + sb) / (ra + rb);
        if 0.0 < sa * sb {
            self.d_sq * self.l * (sb + sa) / (ra * rb * (sb * ra + sa * rb))
        } else if ra < rb {
            // With `s_b − s_a = l`, since far away the coordinates carry the rounding of the distance.
            self.l / rb * (1.0 - sa / ra * middle)
        } else {
            self.l / ra * (1.0 - sb / rb * middle)
        }
    }

    /// `1/r_a − 1/r_b` with the difference of the squares, which does not cancel far away [1/m].
    pub(super) fn end_difference(&self) -> f64 {
        let ([ra, rb], [sa, sb]) = (self.r, self.s);
        (sb + sa) * self.l / ((ra + rb) * ra * rb)
    }
}

/// `∫ ds / r` over the segment `ab`, seen from `x` [1]; infinite on the segment.
///
/// `ln((r_a + r_b + l)/(r_a + r_b − l)) = 2 atanh(l/(r_a + r_b))`, with `r_a`, `r_b` the distances to
/// the ends and `l` the length; close to the segment the form in the distance `d` from its line,
/// `asinh(s_b/d) − asinh(s_a/d)`, since `r_a + r_b − l` cancels there.
///
/// Relative error against 50-digit arithmetic over 240 points from 1e-9 to 1e6 lengths away, on the line
/// and near the ends among them: at most 5e-16 (`tests/it/kernels.rs`).
pub fn potential(a: &Vec3, b: &Vec3, x: &Vec3) -> f64 {
    View::new(a, b, x).0.logarithm()
}

/// Gradient at `x` of [`potential`] [1/m].
///
/// Along the segment `1/r_a − 1/r_b`, across it `−(s_b/r_b − s_a/r_a)/d`; zero across on the line
/// itself beyond the ends.  Relative error over the same points: at most 7e-16.
pub fn gradient(a: &Vec3, b: &Vec3, x: &Vec3) -> Vec3 {
    let (view, across) = View::new(a, b, x);
    if view.l <= 0.0 {
        return Vec3::zeros();
    }
    let t = (b - a) / view.l;
    let scale = if 0.0 < view.d_sq { -view.sine_difference() / view.d_sq } else { 0.0 };
    t * view.end_difference() + across * scale
}
