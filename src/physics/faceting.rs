//! What the flat facets miss of the drawn shape, to first order (DESIGN 3.6).

use crate::base::si::EPS0;
use crate::kernel::rules;
use crate::panel::Panels;
use crate::physics::unit::UnitCharges;

/// Mean height of the rebuilt surface over each panel, outward positive [m].
///
/// The surface over a facet is the cubic of Vlachos et al., curved PN triangles, I3D 2001, through
/// the recovered corner normals; the six-point rule integrates a cubic exactly.  On a sphere of 1,280
/// regular facets the first-order correction leaves 2 % of the faceting error.
pub fn offsets(panels: &Panels) -> Vec<f64> {
    (0..panels.len()).map(|p| offset(panels, p)).collect()
}

fn offset(panels: &Panels, p: usize) -> f64 {
    let surface = &panels.assembly.bodies[panels.body[p] as usize].surface;
    let facet = panels.facet[p] as usize;
    let corners = surface.welded.facets[facet].map(|k| surface.welded.points[k as usize]);
    let normals = surface.normals[facet];
    let n = crate::geom::Triangle::new(corners).normal();
    // Heights of the control points b210 … over the plane; those of the corners are zero.
    let side = |i: usize, j: usize| -(corners[j] - corners[i]).dot(&normals[i]) * normals[i].dot(&n) / 3.0;
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
    let bary = panels.bary[p];
    let point = |w: &[f64; 3]| [0, 1, 2].map(|k| (0..3).map(|c| w[c] * bary[c][k]).sum::<f64>());
    rules::SIX.iter().map(|(w, weight)| weight * height(point(w))).sum()
}

/// First-order change of `uᵀ C v` from moving each panel by its offset: the signed sum and the sum
/// of magnitudes, `ε Σ_T A δn s_u s_v` [F × units of u and v].
pub fn change(
    panels: &Panels,
    offsets: &[f64],
    charges: &UnitCharges,
    eps_r: f64,
    [u, v]: [&[f64]; 2],
) -> (f64, f64) {
    let field = |w: &[f64], p: usize| -> f64 { w.iter().zip(&charges.density).map(|(w, s)| w * s[p]).sum() };
    let term = |p: usize| {
        let offset = offsets[p];
        if offset == 0.0 {
            0.0
        } else {
            EPS0 * eps_r * panels.triangles[p].area() * offset * field(u, p) * field(v, p)
        }
    };
    (0..panels.len()).map(term).fold((0.0, 0.0), |(sum, abs), t| (sum + t, abs + t.abs()))
}
