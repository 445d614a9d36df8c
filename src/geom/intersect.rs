//! How two triangles meet: crossing, lying in each other, or apart.
//!
//! After Möller, J. Graphics Tools 2 (1997) 25, and Guigue and Devillers, J. Graphics Tools 8
//! (2003) 25, with a tolerance in place of the sign of zero.

use crate::base::Vec3;
use crate::geom::Triangle;

/// How a triangle meets a plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Section {
    /// At most in one point.
    Apart,
    /// In a segment with these ends [m]: a cut, or an edge that lies in the plane.
    Segment([Vec3; 2]),
    /// It lies in the plane.
    InPlane,
}

/// How two triangles meet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Meeting {
    /// Apart, or touching without passing through each other.
    Apart,
    /// They pass through each other along the segment with these ends [m].
    Crossing([Vec3; 2]),
    /// They lie in one plane and share an area.
    Coplanar {
        /// The shared area [m²].
        area: f64,
        /// Its middle [m].
        middle: Vec3,
    },
}

/// How `triangle` meets the plane; heights up to `abs_tol` [m] count as none.
pub fn section(triangle: &Triangle, through: &Vec3, unit_normal: &Vec3, abs_tol: f64) -> Section {
    let heights = triangle.corners.map(|p| {
        let h = (p - through).dot(unit_normal);
        if h.abs() <= abs_tol { 0.0 } else { h }
    });
    let mut ends = [Vec3::zeros(); 3];
    let mut count = 0;
    for k in 0..3 {
        let (h, g) = (heights[k], heights[(k + 1) % 3]);
        let (p, q) = (triangle.corners[k], triangle.corners[(k + 1) % 3]);
        if h == 0.0 {
            ends[count] = p;
            count += 1;
        } else if h * g < 0.0 {
            ends[count] = p + (q - p) * (h / (h - g));
            count += 1;
        }
    }
    match count {
        2 => Section::Segment([ends[0], ends[1]]),
        3 => Section::InPlane,
        _ => Section::Apart,
    }
}

/// How two triangles meet.
///
/// A crossing shorter or shallower than `abs_tol` [m] counts as apart, and so does a shared area
/// narrower than it.  Triangles without area meet nothing.
pub fn triangles(first: &Triangle, second: &Triangle, abs_tol: f64) -> Meeting {
    let (n, m) = (first.normal(), second.normal());
    if n == Vec3::zeros() || m == Vec3::zeros() {
        return Meeting::Apart;
    }
    let low_high = |t: &Triangle, through: &Vec3, normal: &Vec3| {
        let heights = t.corners.map(|p| (p - through).dot(normal));
        (heights[0].min(heights[1]).min(heights[2]), heights[0].max(heights[1]).max(heights[2]))
    };
    let (low, high) = low_high(second, &first.corners[0], &n);
    if high < -abs_tol || abs_tol < low {
        return Meeting::Apart;
    }
    let (low_first, high_first) = low_high(first, &second.corners[0], &m);
    let flat = -abs_tol <= low && high <= abs_tol && -abs_tol <= low_first && high_first <= abs_tol;
    if flat {
        return coplanar(first, second, abs_tol);
    }
    let through = low < -abs_tol && abs_tol < high && low_first < -abs_tol && abs_tol < high_first;
    let along = n.cross(&m).try_normalize(0.0);
    let (true, Some(along)) = (through, along) else { return Meeting::Apart };
    let own = section(first, &second.corners[0], &m, 0.0);
    let other = section(second, &first.corners[0], &n, 0.0);
    let (Section::Segment(own), Section::Segment(other)) = (own, other) else { return Meeting::Apart };
    shared(own, other, &along, abs_tol)
}

/// The part that two segments along one line share, if longer than `abs_tol`.
fn shared(own: [Vec3; 2], other: [Vec3; 2], along: &Vec3, abs_tol: f64) -> Meeting {
    let order = |mut s: [Vec3; 2]| {
        if s[1].dot(along) < s[0].dot(along) {
            s.swap(0, 1);
        }
        s
    };
    let (own, other) = (order(own), order(other));
    let from = if own[0].dot(along) < other[0].dot(along) { other[0] } else { own[0] };
    let to = if own[1].dot(along) < other[1].dot(along) { own[1] } else { other[1] };
    if abs_tol < (to - from).dot(along) { Meeting::Crossing([from, to]) } else { Meeting::Apart }
}

/// The area two triangles of one plane share: the second clipped at the edges of the first
/// (Sutherland and Hodgman, Commun. ACM 17, 1974, 32).
fn coplanar(first: &Triangle, second: &Triangle, abs_tol: f64) -> Meeting {
    let normal = first.normal();
    let mut polygon: Vec<Vec3> = second.corners.to_vec();
    for k in 0..3 {
        let (a, b) = (first.corners[k], first.corners[(k + 1) % 3]);
        let inward = normal.cross(&(b - a));
        let height = |p: &Vec3| (p - a).dot(&inward);
        let mut kept = Vec::with_capacity(polygon.len() + 1);
        for (i, p) in polygon.iter().enumerate() {
            let q = &polygon[(i + 1) % polygon.len()];
            let (h, g) = (height(p), height(q));
            if 0.0 <= h {
                kept.push(*p);
            }
            if h * g < 0.0 {
                kept.push(p + (q - p) * (h / (h - g)));
            }
        }
        polygon = kept;
    }
    let Some(&corner) = polygon.first() else { return Meeting::Apart };
    let fan = polygon.windows(2).skip(1).map(|w| Triangle::new([corner, w[0], w[1]]));
    let (area, moment) = fan
        .fold((0.0, Vec3::zeros()), |(area, moment), t| (area + t.area(), moment + t.centroid() * t.area()));
    let widest = first.longest_edge().min(second.longest_edge());
    if abs_tol * widest < area { Meeting::Coplanar { area, middle: moment / area } } else { Meeting::Apart }
}
