//! From the surface over a chart to the flat panel at its mean height (DESIGN 3.6).

use super::Origin;
use crate::base::Images;
use crate::base::Plane;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::kernel::rules;
use crate::mesh::Assembly;
use crate::mesh::Chart;
use crate::mesh::Surface;

/// A panel in place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Placed {
    pub(super) triangle: Triangle,
    /// Mean height of the surface over the triangle through its places at the corners [m].
    pub(super) offset: f64,
    /// Mean height of the surface over the panel itself [m].
    pub(super) left: f64,
    /// Mean height of the surface over what was drawn [m].
    pub(super) drawn: f64,
}

/// Least cosine between a normal at a corner and that of the panel for the corner to move along it [1].
const ALONG: f64 = 0.5;

/// Barycentric coordinates in the chart of the point `w` of a panel with corners `bary`.
pub(super) fn in_chart(bary: &[[f64; 3]; 3], w: [f64; 3]) -> [f64; 3] {
    [0, 1, 2].map(|k| (0..3).map(|c| w[c] * bary[c][k]).sum())
}

/// The panel of an origin.
///
/// Through the places of the surface at its corners goes a flat triangle, which is moved to the mean
/// height of the surface over it, its corners along the normals there, so that it widens on a bulge
/// as the surface does and panels of one height close.  Sphere of 320, 1,280, 2,420 regular facets, error of
/// the capacitance: as drawn −1.1e-2, −2.9e-3, −1.5e-3, placed so: see `tests/it/accuracy.rs`.
pub(super) fn place(assembly: &Assembly, charts: &[Chart], images: &Images, origin: &Origin) -> Placed {
    let surface = &assembly.bodies[origin.body as usize].surface;
    let chart = &charts[origin.chart as usize];
    let spots = origin.bary.map(|w| chart.spot(surface, w));
    let through = Triangle::new(spots.map(|spot| spot.point));
    let n = through.normal();
    let base = chart.flat();
    let (mut offset, mut drawn) = (0.0, chart.drawn);
    for (w, weight) in &rules::SIX {
        let inside = in_chart(&origin.bary, *w);
        let point = chart.spot(surface, inside).point;
        offset += weight * (point - through.at(*w)).dot(&n);
        if !chart.merged {
            drawn += weight * (point - base.at(inside)).dot(&base.normal());
        }
    }
    // On a border the panel stays: beside another form, moved differently, it would stand out as a step.
    let ends = |w: &[f64; 3]| (0..3).any(|k| chart.borders[k] && w[(k + 2) % 3] <= 0.0);
    let lifted = |k: usize| {
        if ends(&origin.bary[k]) {
            return spots[k].point;
        }
        let along = spots[k].normal.dot(&n);
        let way = if ALONG < along { spots[k].normal / along } else { n };
        spots[k].point + way * offset
    };
    let mut corners: [Vec3; 3] = if offset.abs() <= 0.0 { through.corners } else { [0, 1, 2].map(lifted) };
    let mut rise = 0.0_f64;
    for side in 0..3 {
        let Some(shift) = side_shift(surface, chart, &origin.bary, &through, side) else { continue };
        rise = rise.max(shift.norm());
        corners[side] += shift;
        corners[(side + 1) % 3] += shift;
    }
    // A bulge through a plane is no bulge: the facets are too coarse for the gap there.
    let flat = origin.bary.map(|w| base.at(w));
    if 0.0 < drawn && crosses(images, &flat, &corners) {
        return Placed { triangle: Triangle::new(flat), offset: 0.0, left: 0.0, drawn: 0.0 };
    }
    let placed = Triangle::new(corners);
    let normal = placed.normal();
    let left = |(w, weight): &([f64; 3], f64)| {
        weight * (chart.spot(surface, in_chart(&origin.bary, *w)).point - placed.at(*w)).dot(&normal)
    };
    let stays = origin.bary.iter().any(ends);
    let left = if stays { rules::SIX.iter().map(left).sum() } else { 0.0 };
    // Beside an arc the panel follows its surface no better than its side follows the arc.
    let offset = if offset.abs() < rise { rise } else { offset };
    Placed { triangle: placed, offset, left, drawn }
}

/// Mean way from the straight side of a panel to the arc that it stands for, in the plane of the panel [m];
/// none for sides that are no part of an arc.
///
/// Moved by it the panel has the area that the arc bounds.
fn side_shift(
    surface: &Surface,
    chart: &Chart,
    bary: &[[f64; 3]; 3],
    through: &Triangle,
    side: usize,
) -> Option<Vec3> {
    let (a, b) = (bary[side], bary[(side + 1) % 3]);
    let on_arc = |k: usize| chart.curves[k].is_some() && a[(k + 2) % 3] + b[(k + 2) % 3] <= 0.0;
    (0..3).find(|k| on_arc(*k))?;
    let middle = chart.spot(surface, [0, 1, 2].map(|k| 0.5 * (a[k] + b[k]))).point;
    let off = middle - (through.corners[side] + through.corners[(side + 1) % 3]) * 0.5;
    let n = through.normal();
    // The mean of a parabola is two thirds of its height.
    Some((off - n * off.dot(&n)) * (2.0 / 3.0))
}

/// Whether corners come to lie at or behind a plane at 0 V, or behind an even mirror from the front of it:
/// where a body meets an even mirror its corners stay in the plane up to rounding.
fn crosses(images: &Images, flat: &[Vec3; 3], placed: &[Vec3; 3]) -> bool {
    let size = (flat[1] - flat[0]).norm().max((flat[2] - flat[0]).norm());
    let through = |plane: &Plane, least: f64| {
        (0..3).any(|k| least * size < plane.height(&flat[k]) && plane.height(&placed[k]) <= 0.0)
    };
    images.grounded().any(|grounded| through(&grounded.plane, f64::NEG_INFINITY))
        || images.even().any(|plane| through(plane, IN_PLANE))
}

/// Height of a corner over an even mirror up to which it lies in it, in sizes of the panel [1].
const IN_PLANE: f64 = 1e-9;
