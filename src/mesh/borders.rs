//! Where patches end: border edges, chained into lines, arcs and free curves.

use super::faces::Faces;
use super::faces::NONE;
use crate::base::Vec3;
use nalgebra::Matrix3;
use nalgebra::SymmetricEigen;
use std::collections::BTreeMap;

/// Turn of a chain of border edges at a corner from which a new curve begins [rad]: 40°, above the turn of
/// a circle drawn with twelve sides.
const CORNER: f64 = 0.7;

/// Distance from a curve within which a corner lies on it, in roundings [1].
const ON: f64 = 2.0;

/// Corners from which a chain can be an arc: three always lie on a circle.
const ARC_CORNERS: usize = 4;

/// An edge where two patches meet, a crease within a patch, or a rim.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Border {
    /// Its ends, as indices of points, in the direction in which the first facet runs.
    pub ends: [u32; 2],
    /// The facets beside it; the same one twice at a rim, and where more than two facets meet.
    pub facets: [u32; 2],
    /// Index of the curve that it lies on.
    pub curve: u32,
}

/// What a chain of border edges lies on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Curve {
    /// A straight line.
    Line,
    /// A part of a circle.
    Arc {
        /// Centre [m].
        centre: Vec3,
        /// Unit vector across the plane of the circle [1].
        axis: Vec3,
        /// Radius [m].
        radius: f64,
    },
    /// Neither.
    Free,
}

/// Border edges of patches in order of their facets, and their curves.
pub(super) fn borders(faces: &Faces<'_>, of_facet: &[u32]) -> (Vec<Border>, Vec<Curve>) {
    let mut borders = edges(faces, of_facet);
    let mut at: BTreeMap<u32, Vec<u32>> = BTreeMap::new();
    for (k, border) in borders.iter().enumerate() {
        border.ends.iter().for_each(|p| at.entry(*p).or_default().push(k as u32));
    }
    let mut curves = Vec::new();
    // First chains that begin at a junction, then closed ones.
    let junctions: Vec<u32> =
        at.iter().filter(|(p, _)| through(faces, &borders, &at, **p).is_none()).map(|(p, _)| *p).collect();
    let starts = junctions.iter().flat_map(|p| at[p].iter().map(|k| (*k, *p)).collect::<Vec<_>>());
    let rest = (0..borders.len() as u32).map(|k| (k, NONE));
    for (k, from) in starts.chain(rest).collect::<Vec<_>>() {
        if borders[k as usize].curve != NONE {
            continue;
        }
        let from = if from == NONE { borders[k as usize].ends[0] } else { from };
        let id = curves.len() as u32;
        let points = walk(faces, &mut borders, &at, (k, from), id);
        curves.push(curve(faces, &points));
    }
    (borders, curves)
}

fn edges(faces: &Faces<'_>, of_facet: &[u32]) -> Vec<Border> {
    let mut borders = Vec::new();
    for f in 0..of_facet.len() as u32 {
        for side in 0..3 {
            let g = faces.across[f as usize][side];
            let ends = faces.ends(f, side);
            if g == NONE {
                borders.push(Border { ends, facets: [f, f], curve: NONE });
            } else if f < g && (of_facet[f as usize] != of_facet[g as usize] || !faces.smooth(f, side)) {
                borders.push(Border { ends, facets: [f, g], curve: NONE });
            }
        }
    }
    borders
}

/// The two borders of a point through which one curve goes, None at a junction or a corner.
fn through(
    faces: &Faces<'_>,
    borders: &[Border],
    at: &BTreeMap<u32, Vec<u32>>,
    point: u32,
) -> Option<[u32; 2]> {
    let [a, b] = at.get(&point)?.as_slice() else { return None };
    let away = |k: u32| {
        let [p, q] = borders[k as usize].ends;
        let other = if p == point { q } else { p };
        faces.point(other) - faces.point(point)
    };
    let (u, v) = (away(*a), -away(*b));
    (u.cross(&v).norm().atan2(u.dot(&v)) <= CORNER).then_some([*a, *b])
}

/// Marks the chain from border `k` on with `id`; its points in order, the first twice if it is closed.
fn walk(
    faces: &Faces<'_>,
    borders: &mut [Border],
    at: &BTreeMap<u32, Vec<u32>>,
    (mut k, mut from): (u32, u32),
    id: u32,
) -> Vec<u32> {
    let mut points = vec![from];
    loop {
        borders[k as usize].curve = id;
        let [p, q] = borders[k as usize].ends;
        from = if p == from { q } else { p };
        points.push(from);
        let Some([a, b]) = through(faces, borders, at, from) else { return points };
        k = if a == k { b } else { a };
        if borders[k as usize].curve != NONE {
            return points;
        }
    }
}

/// Line, arc or neither through the points of a chain.
fn curve(faces: &Faces<'_>, chain: &[u32]) -> Curve {
    let points: Vec<Vec3> = chain.iter().map(|k| faces.point(*k)).collect();
    let (Some(first), Some(last)) = (points.first(), points.last()) else { return Curve::Free };
    let near = ON * faces.rounding;
    if let Some(along) = (last - first).try_normalize(near) {
        let off = |p: &Vec3| ((p - first) - along * (p - first).dot(&along)).norm();
        if points.iter().all(|p| off(p) <= near) {
            return Curve::Line;
        }
    }
    arc(&points, near).unwrap_or(Curve::Free)
}

fn arc(points: &[Vec3], near: f64) -> Option<Curve> {
    let closed = points.first() == points.last();
    let points = if closed { &points[1..] } else { points };
    if points.len() < ARC_CORNERS {
        return None;
    }
    let n = points.len() as f64;
    let middle = points.iter().sum::<Vec3>() / n;
    let moment: Matrix3<f64> = points.iter().map(|p| (p - middle) * (p - middle).transpose()).sum();
    let eigen = SymmetricEigen::new(moment);
    let axis = eigen.eigenvectors.column(eigen.eigenvalues.imin()).into_owned();
    let scale = eigen.eigenvalues.max().max(0.0).sqrt();
    let u = Vec3::ith(axis.iamin(), 1.0).cross(&axis).normalize();
    let v = axis.cross(&u);
    let (mut a, mut b) = (Matrix3::zeros(), Vec3::zeros());
    for p in points {
        let (x, y) = ((p - middle).dot(&u) / scale, (p - middle).dot(&v) / scale);
        let row = Vec3::new(2.0 * x, 2.0 * y, 1.0);
        a.ger(1.0, &row, &row, 1.0);
        b.axpy(x * x + y * y, &row, 1.0);
    }
    let s = a.cholesky()?.solve(&b);
    let centre = middle + (u * s.x + v * s.y) * scale;
    let radius = (s.z + s.x * s.x + s.y * s.y).max(0.0).sqrt() * scale;
    let on = |p: &Vec3| {
        let q = p - centre;
        let height = q.dot(&axis);
        ((q - axis * height).norm() - radius).hypot(height) <= near
    };
    points.iter().all(on).then_some(Curve::Arc { centre, axis, radius })
}
