//! The Maxwell capacitance matrix (charge per volt).

use crate::base::si::EPS0;
use crate::kernel::rules;
use crate::panel::Panels;
use crate::physics::unit::Residuals;
use crate::physics::unit::UnitCharges;

/// A square matrix, row by row [unit where it stands].
pub type Matrix = Vec<Vec<f64>>;

/// Charges of the flat panels, before and after the correction.
#[derive(Clone, Debug, PartialEq)]
pub struct Capacitance {
    /// `raw[i][j]`: sum of charges on row `i` at 1 V on row `j` [F].
    pub raw: Matrix,
    /// After the residual correction, symmetrised [F].
    pub corrected: Matrix,
}

/// Sums charges and adds the first-order correction `Σ_p ∫ r_j σ_i dS` of every entry (DESIGN 3.3).
///
/// The corrected diagonal is the energy functional `2⟨1, σ⟩ − ⟨Vσ, σ⟩`, a lower bound up to quadrature.
pub fn corrected(panels: &Panels, charges: &UnitCharges, residuals: &Residuals, eps_r: f64) -> Capacitance {
    let (n, n_rows, eps) = (panels.len(), panels.n_rows, EPS0 * eps_r);
    let areas: Vec<f64> = panels.triangles.iter().map(|tri| tri.area()).collect();
    let mut raw = vec![vec![0.0; n_rows]; n_rows];
    let mut full = raw.clone();
    for i in 0..n_rows {
        for j in 0..n_rows {
            let (s_i, s_j) = (&charges.density[i], &charges.density[j]);
            let on_i = (0..n).filter(|p| panels.row(*p) == Some(i));
            raw[i][j] = eps * on_i.map(|p| s_j[p] * areas[p]).sum::<f64>();
            let mean = |p: usize| -> f64 {
                rules::SIX.iter().zip(&residuals.at[j][p]).map(|((_, w), r)| w * r).sum()
            };
            full[i][j] = raw[i][j] + eps * (0..n).map(|p| s_i[p] * areas[p] * mean(p)).sum::<f64>();
        }
    }
    Capacitance { corrected: symmetrised(&full), raw }
}

/// Mean of a matrix and its transpose.
pub fn symmetrised(c: &Matrix) -> Matrix {
    (0..c.len()).map(|i| (0..c.len()).map(|j| 0.5 * (c[i][j] + c[j][i])).collect()).collect()
}
