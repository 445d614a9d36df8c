//! The triangle whose height is small against its longest edge.
//!
//! The closed form of the fat triangle cancels here: directions rounded to 1e-16 leave distances of
//! 1e-16 longest edges, and the heights are hardly larger.  Beside the sliver the distances from its
//! edges and plane are determinants in twice the length, and the solid angle comes edge by edge
//! (Wilton et al. 1984, eq. 5).  Farther off the sliver is cut at the foot of its height into two
//! right triangles, and each is summed over rays from its sharp tip.

use super::rules;
use super::segment::View;
use super::triangle::Prepared;
use super::triangle::side;
use super::wide;
use super::wide::Wide3;
use crate::base::Vec3;

/// Distance from a sliver, in its heights, from which three rays serve instead of five [1].
///
/// Gauss's rule of `n` points errs by (1/4k)²ⁿ at `k` heights: 1e-16 for five at 10 and three at 100.
const THREE_RAYS_IN_HEIGHTS: f64 = 100.0;

impl Prepared {
    /// Distance from `x` to the longest edge, squared [m²].
    fn distance_sq(&self, x: &Vec3) -> f64 {
        let d = x - self.tri.corners[0];
        let s = d.dot(&self.t[0]).clamp(0.0, self.longest);
        (d - self.t[0] * s).norm_squared()
    }

    /// Whether `x` is so near that rays do not serve: within the geometric mean of height and length.
    ///
    /// Both forms lose a factor there, the near one distance over height, the far one length over
    /// distance: at most 1,000 each for a ratio of 1e-6.
    pub(super) fn is_beside(&self, x: &Vec3) -> bool {
        self.distance_sq(x) <= self.height * self.longest
    }

    /// Height of `x` over the plane and distances from the foot of `x` to the edges, inside positive [m].
    fn distances(&self, x: &Vec3) -> (f64, [f64; 3]) {
        let [a, b, c] = &self.tri.corners;
        let e = [wide::difference(b, a), wide::difference(c, b), wide::difference(a, c)];
        let d: [Wide3; 3] = self.tri.corners.map(|p| wide::difference(&p, x));
        let normal = wide::cross(&e[0], &e[1]);
        let near = [0, 1, 2].map(|k| {
            let (a, b) = (k, (k + 1) % 3);
            // At a corner itself the distance must come out as zero.
            if wide::dot(&d[a], &d[a]) < wide::dot(&d[b], &d[b]) { a } else { b }
        });
        let p = [0, 1, 2].map(|k| {
            let outward = wide::cross(&e[k], &normal);
            let scale = self.l[k] * self.cross;
            if 0.0 < scale { wide::dot(&outward, &d[near[k]]) / scale } else { 0.0 }
        });
        let h = if 0.0 < self.cross { -wide::dot(&normal, &d[0]) / self.cross } else { 0.0 };
        (h, p)
    }

    /// Views of the three edges, distances from them, height and solid angle without sign.
    fn near_view(&self, x: &Vec3) -> ([View; 3], [f64; 3], f64, f64) {
        let (h, p) = self.distances(x);
        let d = self.tri.corners.map(|p| p - x);
        let r = d.map(|d| d.norm());
        let views = [0, 1, 2].map(|k| {
            let (a, b) = (k, (k + 1) % 3);
            let s = [d[a].dot(&self.t[k]), d[b].dot(&self.t[k])];
            View { l: self.l[k], r: [r[a], r[b]], s, d_sq: p[k] * p[k] + h * h }
        });
        let angle = |k: usize, end: usize| {
            let view = &views[k];
            (p[k] * view.s[end]).atan2(view.d_sq + h.abs() * view.r[end])
        };
        let omega = (0..3).map(|k| angle(k, 1) - angle(k, 0)).sum();
        (views, p, h, omega)
    }

    /// `∫ dS / r` from beside the sliver [m].
    pub(super) fn near_potential(&self, x: &Vec3) -> f64 {
        let (views, p, h, omega) = self.near_view(x);
        let term = |(view, p): (&View, &f64)| {
            if 0.0 < view.d_sq && *p != 0.0 { p * view.logarithm() } else { 0.0 }
        };
        views.iter().zip(&p).map(term).sum::<f64>() - h.abs() * omega
    }

    /// Its gradient [1].
    pub(super) fn near_gradient(&self, x: &Vec3) -> Vec3 {
        let (views, _, h, omega) = self.near_view(x);
        let r = [views[0].r[0], views[1].r[0], views[2].r[0]];
        let sign = side(h, x, &r);
        let edges = |sum: Vec3, (view, m): (&View, &Vec3)| sum - m * view.logarithm();
        views.iter().zip(&self.m).fold(self.n * -(sign * omega), edges)
    }

    /// `∫ dS / r` from farther off [m].
    pub(super) fn far_potential(&self, x: &Vec3) -> f64 {
        let mut sum = 0.0;
        self.for_each_ray(x, |ray, weight| sum += weight * ray.potential());
        sum
    }

    /// Its gradient [1].
    pub(super) fn far_gradient(&self, x: &Vec3) -> Vec3 {
        let mut sum = Vec3::zeros();
        self.for_each_ray(x, |ray, weight| sum += ray.gradient() * weight);
        sum
    }

    /// Calls `f` with rays from both ends of the longest edge to points of the height, and weights [1].
    ///
    /// On a ray of length `l` from the tip of a triangle of area `A` the density is `2A u/l²`, `u` the
    /// distance from the tip.
    fn for_each_ray(&self, x: &Vec3, mut f: impl FnMut(&Ray, f64)) {
        let [p, q, apex] = &self.tri.corners;
        let along = (apex - p).dot(&self.t[0]);
        let up = self.m[0] * -self.height;
        let near = THREE_RAYS_IN_HEIGHTS * self.height;
        let rule =
            if self.distance_sq(x) < near * near { &rules::GAUSS_FIVE[..] } else { &rules::GAUSS_THREE };
        for (tip, leg) in [(p, along), (q, along - self.longest)] {
            for (at, weight) in rule {
                let end = self.t[0] * leg + up * *at;
                let l = end.norm();
                if leg != 0.0 && 0.0 < self.height {
                    let ray = Ray::new(&(tip - x), &end, l);
                    f(&ray, weight * leg.abs() * self.height / (l * l));
                }
            }
        }
    }
}

/// A rod whose density grows from zero at its first end.
struct Ray {
    view: View,
    t: Vec3,
    /// From the foot of the perpendicular to the observation point [m].
    across: Vec3,
}

impl Ray {
    /// From the tip and along `e`, both seen from the observation point.
    fn new(tip: &Vec3, e: &Vec3, l: f64) -> Self {
        let t = e / l;
        let end = tip + e;
        let view = View::of(l, &t, [tip, &end], [tip.norm(), end.norm()]);
        Ray { across: t * view.s[0] - tip, t, view }
    }

    /// `∫ u ds / r` [m], `u` the distance from the first end.
    fn potential(&self) -> f64 {
        let View { l, r: [ra, rb], s: [sa, sb], .. } = self.view;
        l * (sa + sb) / (ra + rb) - sa * self.view.logarithm()
    }

    /// Its gradient [1].
    fn gradient(&self) -> Vec3 {
        let (sines, fall) = (self.view.sine_difference(), self.view.end_difference());
        let sa = self.view.s[0];
        let along = self.view.logarithm() - sines - sa * fall;
        let across = if 0.0 < self.view.d_sq { sa * sines / self.view.d_sq - fall } else { 0.0 };
        self.t * along + self.across * across
    }
}
