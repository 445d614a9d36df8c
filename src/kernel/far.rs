//! The far panel: exact moments of a triangle up to degree four.
//!
//! The expansion about the centroid is
//! `∫dS/r = (A/R) Σ_n ⟨|y|ⁿ P_n(cos γ)⟩ / Rⁿ`, `R` the distance from the centroid, `⟨⟩` the mean over
//! the triangle; degree one vanishes (Jackson, Classical Electrodynamics, section 4.1).  In the plane of
//! the panel with its principal axes the means are 1, 2, 4 and 5 moments.

use super::lanes::LANES;
use super::lanes::Lane;
use super::rules;
use crate::base::Vec3;
use crate::geom::Triangle;

/// Distance from the centroid, in longest edges, from which the expansion serves [1].
///
/// Worst relative error over 1,000 random triangles, every other one a sliver of ratio down to 1e-6, each
/// in 40 directions (`tests/it/kernels.rs` repeats 4 and 5): 1.0e-4 at 2, 1.2e-5 at 3, 2.6e-6 at 4,
/// 8.1e-7 at 5, 3.2e-7 at 6, 7.4e-8 at 8; slivers and fat triangles differ by less than a tenth.  At 4 one
/// panel errs by a quarter of the smallest error of a capacitance seen, 1e-5, and the errors of many panels
/// do not add up; a larger value moves no digit of the cube at 5,900 panels that counts.
pub const FAR_IN_EDGES: f64 = 4.0;

/// Moments of one triangle about its centroid, in its principal axes.
#[derive(Clone, Debug, PartialEq)]
pub struct Moments {
    centre: [f64; 3],
    u: [f64; 3],
    v: [f64; 3],
    /// Square of the distance from which the expansion serves [m²].
    far_sq: f64,
    area: f64,
    second: [f64; 2],
    third: [f64; 4],
    fourth: [f64; 5],
}

impl Moments {
    /// Moments of `tri`, by a rule that is exact for them.
    pub fn of(tri: &Triangle) -> Self {
        let (centre, [u, v]) = (tri.centroid(), principal_axes(tri));
        let far = FAR_IN_EDGES * tri.longest_edge();
        let mean = |i: i32, j: i32| -> f64 {
            let term = |(w, weight): &([f64; 3], f64)| {
                let y = tri.at(*w) - centre;
                weight * y.dot(&u).powi(i) * y.dot(&v).powi(j)
            };
            rules::SIX.iter().map(term).sum()
        };
        Moments {
            centre: centre.into(),
            u: u.into(),
            v: v.into(),
            far_sq: far * far,
            area: tri.area(),
            second: [mean(2, 0), mean(0, 2)],
            third: [mean(3, 0), mean(2, 1), mean(1, 2), mean(0, 3)],
            fourth: [mean(4, 0), mean(3, 1), mean(2, 2), mean(1, 3), mean(0, 4)],
        }
    }

    /// `∫dS/r` as seen from `x` [m], whatever the distance.
    pub fn potential(&self, x: &Vec3) -> f64 {
        let lane = |k: usize| [x[k]; LANES];
        let (mut out, mut r_sq) = ([0.0; LANES], [0.0; LANES]);
        self.expand([&lane(0), &lane(1), &lane(2)], &mut out, &mut r_sq);
        out[0]
    }

    /// `∫dS/r` as seen from eight points [m]; not-a-number for points nearer than [`FAR_IN_EDGES`].
    #[inline(always)]
    pub(super) fn potentials(&self, x: [&Lane; 3], out: &mut Lane) {
        let mut r_sq = [0.0; LANES];
        self.expand(x, out, &mut r_sq);
        for k in 0..LANES {
            out[k] = if r_sq[k] < self.far_sq { f64::NAN } else { out[k] };
        }
    }

    #[inline(always)]
    fn expand(&self, x: [&Lane; 3], out: &mut Lane, r_sq: &mut Lane) {
        let ([m20, m02], [t30, t21, t12, t03]) = (self.second, self.third);
        let [f40, f31, f22, f13, f04] = self.fourth;
        let (m, t3, t0) = (m20 + m02, t30 + t12, t21 + t03);
        let (f4, f3, f0, f) = (f40 + f22, 2.0 * (f31 + f13), f22 + f04, f40 + 2.0 * f22 + f04);
        for k in 0..LANES {
            let d = [x[0][k] - self.centre[0], x[1][k] - self.centre[1], x[2][k] - self.centre[2]];
            let u = d[0] * self.u[0] + d[1] * self.u[1] + d[2] * self.u[2];
            let v = d[0] * self.v[0] + d[1] * self.v[1] + d[2] * self.v[2];
            let rr = d[0] * d[0] + d[1] * d[1] + d[2] * d[2];
            let (uu, uv, vv) = (u * u, u * v, v * v);
            let second = 1.5 * (uu * m20 + vv * m02) - 0.5 * rr * m;
            let third = 2.5 * (u * (uu * t30 + 3.0 * vv * t12) + v * (3.0 * uu * t21 + vv * t03))
                - 1.5 * rr * (u * t3 + v * t0);
            let fourth = 4.375
                * (uu * uu * f40 + 4.0 * uv * (uu * f31 + vv * f13) + 6.0 * uu * vv * f22 + vv * vv * f04)
                - 3.75 * rr * (uu * f4 + uv * f3 + vv * f0)
                + 0.375 * rr * rr * f;
            let i1 = 1.0 / rr.sqrt();
            let i2 = i1 * i1;
            let i4 = i2 * i2;
            out[k] = self.area * i1 * (1.0 + i4 * (second + i2 * (third + i2 * fourth)));
            r_sq[k] = rr;
        }
    }
}

/// Directions in the plane of the triangle along which its second moment is diagonal.
fn principal_axes(tri: &Triangle) -> [Vec3; 2] {
    let (c, n) = (tri.centroid(), tri.normal());
    let e = (tri.corners[1] - tri.corners[0]).try_normalize(0.0).unwrap_or_else(Vec3::x);
    let f = n.cross(&e);
    let (mut xx, mut xy, mut yy) = (0.0, 0.0, 0.0);
    for p in &tri.corners {
        let (a, b) = ((p - c).dot(&e), (p - c).dot(&f));
        (xx, xy, yy) = (xx + a * a, xy + a * b, yy + b * b);
    }
    let (sin, cos) = (0.5 * (2.0 * xy).atan2(xx - yy)).sin_cos();
    [e * cos + f * sin, f * cos - e * sin]
}
