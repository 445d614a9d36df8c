//! From the drawn facet to the panel: the mean height of the rebuilt surface (DESIGN 3.6).

use super::Origin;
use crate::base::Plane;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::kernel::rules;
use crate::mesh::Assembly;

/// The panel of an origin, and its offset from the facet [m].
///
/// The surface over a facet is the cubic of Vlachos et al., curved PN triangles, I3D 2001, through the
/// recovered corner normals.  The panel stands at the mean height of that surface over it, its corners
/// moved along the recovered normals, so that it widens on a bulge as the surface does and panels of
/// one height close.  Sphere of 320, 1,280, 2,420 regular facets, error of the capacitance: as drawn
/// −1.1e-2, −2.9e-3, −1.5e-3, placed so: see `tests/it/accuracy.rs`.
pub(super) fn place(assembly: &Assembly, plane: Option<&Plane>, origin: &Origin) -> (Triangle, f64) {
    let surface = &assembly.bodies[origin.body as usize].surface;
    let facet = origin.facet as usize;
    let corners = surface.welded.facets[facet].map(|k| surface.welded.points[k as usize]);
    let normals = surface.normals[facet];
    let flat = Triangle::new(corners);
    let n = flat.normal();
    let offset = mean_height(&corners, &normals, &n, &origin.bary);
    let at = |w: [f64; 3]| {
        let point = flat.at(w);
        if offset.abs() <= 0.0 {
            return point;
        }
        let normal = normals[0] * w[0] + normals[1] * w[1] + normals[2] * w[2];
        let along = normal.dot(&n);
        point + if 0.5 < along { normal * (offset / along) } else { n * offset }
    };
    let placed = origin.bary.map(at);
    // A bulge through the earth plane is no bulge: the facets are too coarse for the gap there.
    if plane.is_some_and(|plane| 0.0 < offset && placed.iter().any(|x| plane.height(x) <= 0.0)) {
        return (Triangle::new(origin.bary.map(|w| flat.at(w))), 0.0);
    }
    (Triangle::new(placed), offset)
}

fn mean_height(corners: &[Vec3; 3], normals: &[Vec3; 3], n: &Vec3, bary: &[[f64; 3]; 3]) -> f64 {
    // Heights of the control points b210 … over the plane; those of the corners are zero.
    let side = |i: usize, j: usize| -(corners[j] - corners[i]).dot(&normals[i]) * normals[i].dot(n) / 3.0;
    let h = [[0.0, side(0, 1), side(0, 2)], [side(1, 0), 0.0, side(1, 2)], [side(2, 0), side(2, 1), 0.0]];
    let mean_side = (h[0][1] + h[0][2] + h[1][0] + h[1][2] + h[2][0] + h[2][1]) / 6.0;
    let height = |w: [f64; 3]| {
        let mut sum = 6.0 * w[0] * w[1] * w[2] * 1.5 * mean_side;
        for i in 0..3 {
            for j in (0..3).filter(|j| *j != i) {
                sum += 3.0 * w[i] * w[i] * w[j] * h[i][j];
            }
        }
        sum
    };
    let point = |w: &[f64; 3]| [0, 1, 2].map(|k| (0..3).map(|c| w[c] * bary[c][k]).sum::<f64>());
    // The six-point rule integrates a cubic exactly.
    rules::SIX.iter().map(|(w, weight)| weight * height(point(w))).sum()
}
