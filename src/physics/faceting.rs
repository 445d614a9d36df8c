//! What the flat facets miss of the drawn shape, to first order (DESIGN 3.6).

use crate::base::si::EPS0;
use crate::panel::Panels;
use crate::physics::unit::UnitCharges;

/// Share of the faceting change that enters the bar [1].
///
/// Ellipsoids and spheroids of 2:1 to 10:1 (regular, jittered, meridians) were off by up to 0.05 of it, CAD
/// exports of a spheroid and of a dented ball by up to 0.06 (`cargo bench --bench calibration`).
pub const SHARE: f64 = 0.06;

/// Share of what flat panels do not follow of their surface that enters the bar [1].
///
/// Balls of four kinds of mesh, alone and in gaps, left 0.016 to 0.018 of it, of the sign of a rough surface:
/// above its mean height; up to 0.031 at gaps of 0.02 radii, where η and the second order cover the rest
/// (`cargo bench --bench calibration`).
pub const BULGE_SHARE: f64 = 0.02;

/// First-order change of `uᵀ C v` from the drawn facets to the rebuilt surface, `ε Σ_T A δn_T s_u s_v`: the
/// signed sum, and the part of magnitudes that enters a bar [F × units of u and v].
///
/// That part is [`SHARE`] of the change where the surface is told by normals alone, and everywhere of what
/// the flat panels themselves do not follow; more where that is a good part of the gap at which a panel
/// stands (`gaps` [m]): first order ends there.
pub fn change(
    panels: &Panels,
    charges: &UnitCharges,
    gaps: &[f64],
    eps_r: f64,
    [u, v]: [&[f64]; 2],
) -> (f64, f64) {
    let field = |w: &[f64], p: usize| -> f64 { w.iter().zip(&charges.density).map(|(w, s)| w * s[p]).sum() };
    let (mut sum, mut bar) = (0.0, 0.0);
    for (p, gap) in gaps.iter().enumerate() {
        let (drawn, doubtful) = (panels.drawn[p], doubt(panels, p, *gap));
        if drawn.abs() <= 0.0 && doubtful <= 0.0 {
            continue;
        }
        let term = EPS0 * eps_r * panels.triangles[p].area() * field(u, p) * field(v, p);
        (sum, bar) = (sum + drawn * term, bar + (doubtful * term).abs());
    }
    (sum, bar)
}

/// First-order change of `uᵀ C v` from the panels to the surface over them, `ε Σ_T A h_T s_u s_v` [F × units of u and
/// v] (DESIGN 3.6).
pub fn left(panels: &Panels, charges: &UnitCharges, eps_r: f64, [u, v]: [&[f64]; 2]) -> f64 {
    let field = |w: &[f64], p: usize| -> f64 { w.iter().zip(&charges.density).map(|(w, s)| w * s[p]).sum() };
    let held = (0..panels.len()).filter(|p| 0.0 < panels.left[*p].abs());
    let term = |p: usize| panels.triangles[p].area() * panels.left[p] * field(u, p) * field(v, p);
    EPS0 * eps_r * held.map(term).sum::<f64>()
}

/// Height by which panel `p` may stand wrong, at the gap `gap` [m].
pub fn doubt(panels: &Panels, p: usize, gap: f64) -> f64 {
    let own = panels.offset[p].abs();
    let told = if panels.is_exact(p) { 0.0 } else { SHARE * panels.drawn[p].abs() };
    told.max(own * (BULGE_SHARE + own / gap.max(f64::MIN_POSITIVE)).min(1.0))
}
