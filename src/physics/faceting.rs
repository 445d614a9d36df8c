//! What the flat facets miss of the drawn shape, to first order (DESIGN 3.6).

use crate::base::si::EPS0;
use crate::panel::Panels;
use crate::physics::unit::UnitCharges;

/// Share of the faceting change that enters the bar [1].
///
/// With panels at the mean height what stays as error is under 1 % of the change on regular spheres of
/// 320 to 5,000 facets, 2 to 4 % on jittered ones (`tests/it/accuracy.rs`), up to 7 % seen to first order.
pub const SHARE: f64 = 0.1;

/// First-order change of `uᵀ C v` from the drawn facets to the panels at the mean height of the rebuilt
/// surface, `ε Σ_T A δn_T s_u s_v`: the signed sum, and the part of its magnitudes that enters a bar [F × units
/// of u and v].
///
/// That part is [`SHARE`], and more where a panel was moved by a good part of the gap at which it stands
/// (`gaps` [m]): first order ends there.
pub fn change(
    panels: &Panels,
    charges: &UnitCharges,
    gaps: &[f64],
    eps_r: f64,
    [u, v]: [&[f64]; 2],
) -> (f64, f64) {
    let field = |w: &[f64], p: usize| -> f64 { w.iter().zip(&charges.density).map(|(w, s)| w * s[p]).sum() };
    let (mut sum, mut bar) = (0.0, 0.0);
    for p in (0..panels.len()).filter(|p| 0.0 < panels.offset[*p].abs()) {
        let offset = panels.offset[p];
        let term = EPS0 * eps_r * panels.triangles[p].area() * offset * field(u, p) * field(v, p);
        let share = (SHARE + offset.abs() / gaps[p].max(f64::MIN_POSITIVE)).min(1.0);
        (sum, bar) = (sum + term, bar + share * term.abs());
    }
    (sum, bar)
}
