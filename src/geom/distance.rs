//! Shortest distances between points, segments and triangles.
//!
//! After Ericson, Real-Time Collision Detection, 2005, sections 5.1.5 (point and triangle), 5.1.9
//! (two segments) and 5.1.10 (two triangles).  Shapes without extent are allowed.

use crate::base::Vec3;
use crate::geom::Triangle;

/// The closest points of two shapes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Closest {
    /// Square of their distance [m²].
    pub distance_sq: f64,
    /// Point of the first shape [m].
    pub on_first: Vec3,
    /// Point of the second shape [m].
    pub on_second: Vec3,
}

impl Closest {
    fn between(on_first: Vec3, on_second: Vec3) -> Self {
        Closest { distance_sq: (on_second - on_first).norm_squared(), on_first, on_second }
    }

    fn swapped(self) -> Self {
        Closest { on_first: self.on_second, on_second: self.on_first, ..self }
    }

    fn nearer(self, other: Self) -> Self {
        if other.distance_sq < self.distance_sq { other } else { self }
    }
}

/// Point of `triangle` closest to `x` [m].
pub fn point_of_triangle(triangle: &Triangle, x: &Vec3) -> Vec3 {
    let [a, b, c] = triangle.corners;
    let edges = [(a, b), (b, c), (c, a)];
    let normal = triangle.cross();
    let area_sq = normal.norm_squared();
    let above = |(p, q): &(Vec3, Vec3)| 0.0 <= normal.dot(&(q - p).cross(&(x - p)));
    if 0.0 < area_sq && edges.iter().all(above) {
        return x - normal * ((x - a).dot(&normal) / area_sq);
    }
    let ends = edges.map(|(p, q)| point_of_segment(&p, &q, x));
    let far = |p: &Vec3| (p - x).norm_squared();
    ends[1..].iter().fold(ends[0], |best, p| if far(p) < far(&best) { *p } else { best })
}

/// Point of the segment `ab` closest to `x` [m].
pub fn point_of_segment(a: &Vec3, b: &Vec3, x: &Vec3) -> Vec3 {
    let d = b - a;
    let length_sq = d.norm_squared();
    let t = if 0.0 < length_sq { ((x - a).dot(&d) / length_sq).clamp(0.0, 1.0) } else { 0.0 };
    a + d * t
}

/// Closest points of two segments.
pub fn segments(first: &[Vec3; 2], second: &[Vec3; 2]) -> Closest {
    let (d, e) = (first[1] - first[0], second[1] - second[0]);
    let r = first[0] - second[0];
    let (dd, ee, de) = (d.norm_squared(), e.norm_squared(), d.dot(&e));
    let denominator = dd * ee - de * de;
    let s = if 0.0 < denominator {
        ((de * e.dot(&r) - ee * d.dot(&r)) / denominator).clamp(0.0, 1.0)
    } else {
        0.0
    };
    let p = point_of_segment(&second[0], &second[1], &(first[0] + d * s));
    Closest::between(point_of_segment(&first[0], &first[1], &p), p)
}

/// Closest points of two triangles; at distance zero where they cross.
pub fn triangles(first: &Triangle, second: &Triangle) -> Closest {
    if let Some(p) = pierced(first, second).or_else(|| pierced(second, first)) {
        return Closest::between(p, p);
    }
    let mut best = Closest::between(first.corners[0], second.corners[0]);
    for i in 0..3 {
        let edge = [first.corners[i], first.corners[(i + 1) % 3]];
        for j in 0..3 {
            best = best.nearer(segments(&edge, &[second.corners[j], second.corners[(j + 1) % 3]]));
        }
        let (p, q) = (first.corners[i], second.corners[i]);
        best = best.nearer(Closest::between(p, point_of_triangle(second, &p)));
        best = best.nearer(Closest::between(q, point_of_triangle(first, &q)).swapped());
    }
    best
}

/// A cheap lower bound of the squared distance of two triangles [m²]: how far the second one stays
/// on one side of the plane of the first.
pub fn at_least_sq(first: &Triangle, second: &Triangle) -> f64 {
    let normal = first.cross();
    let heights = second.corners.map(|p| (p - first.corners[0]).dot(&normal));
    let low = heights[0].min(heights[1]).min(heights[2]);
    let high = heights[0].max(heights[1]).max(heights[2]);
    let off = low.max(-high).max(0.0);
    let area_sq = normal.norm_squared();
    if 0.0 < area_sq { off * off / area_sq } else { 0.0 }
}

/// Where an edge of `by` passes through the inside of `triangle`, if one does [m].
fn pierced(triangle: &Triangle, by: &Triangle) -> Option<Vec3> {
    let normal = triangle.cross();
    let heights = by.corners.map(|p| (p - triangle.corners[0]).dot(&normal));
    (0..3).find_map(|k| {
        let (h, g) = (heights[k], heights[(k + 1) % 3]);
        if 0.0 <= h * g {
            return None;
        }
        let p = by.corners[k] + (by.corners[(k + 1) % 3] - by.corners[k]) * (h / (h - g));
        let inside = (0..3).all(|e| {
            let (a, b) = (triangle.corners[e], triangle.corners[(e + 1) % 3]);
            0.0 <= normal.dot(&(b - a).cross(&(p - a)))
        });
        inside.then_some(p)
    })
}
