//! What the flat facets miss of the drawn shape, to first order (DESIGN 3.6).

use crate::base::si::EPS0;
use crate::panel::Panels;
use crate::physics::unit::UnitCharges;

/// First-order change of `uᵀ C v` from the drawn facets to the panels at the mean height of the rebuilt
/// surface: the signed sum and the sum of magnitudes, `ε Σ_T A δn s_u s_v` [F × units of u and v].
pub fn change(panels: &Panels, charges: &UnitCharges, eps_r: f64, [u, v]: [&[f64]; 2]) -> (f64, f64) {
    let field = |w: &[f64], p: usize| -> f64 { w.iter().zip(&charges.density).map(|(w, s)| w * s[p]).sum() };
    let term = |p: usize| {
        let offset = panels.offset[p];
        if offset == 0.0 {
            0.0
        } else {
            EPS0 * eps_r * panels.triangles[p].area() * offset * field(u, p) * field(v, p)
        }
    };
    (0..panels.len()).map(term).fold((0.0, 0.0), |(sum, abs), t| (sum + t, abs + t.abs()))
}
