//! Unit charges and what they miss.

use crate::base::threads;
use crate::kernel::rules;
use crate::operator::Sources;
use crate::operator::dense;
use crate::panel::Panels;
use crate::solve::direct;
use crate::solve::direct::SolveError;
use std::f64::consts::PI;

/// Charges of the unit solutions: row `j` at 1 V, everything else at 0 V.
#[derive(Clone, Debug, PartialEq)]
pub struct UnitCharges {
    /// `density[j][p] = σ/ε` on panel `p` [V/m per V].
    pub density: Vec<Vec<f64>>,
    /// Smallest over largest pivot of the factorisation [1].
    pub pivot_ratio: f64,
}

/// Unit potential minus computed potential, at six points of every panel.
#[derive(Clone, Debug, PartialEq)]
pub struct Residuals {
    /// `at[j][p][q]` at point `q` of [`rules::SIX`] [V per V].
    pub at: Vec<Vec<[f64; 6]>>,
}

/// Solves `1/4π Σ_p s_p ∫_p dS/r = unit potential` in the mean over the test points of every panel.
///
/// # Errors
/// Those of the factorisation.
pub fn solve(panels: &Panels, sources: &Sources) -> Result<UnitCharges, SolveError> {
    let n = panels.len();
    let factors = direct::factor(dense::assemble(panels, sources))?;
    let mut b = vec![0.0; n * panels.n_rows];
    for (j, column) in b.chunks_mut(n.max(1)).enumerate() {
        (0..n).for_each(|p| column[p] = 4.0 * PI * panels.unit_potential(p, j));
    }
    direct::solve(&factors, &mut b)?;
    let per_area =
        |column: &[f64]| column.iter().zip(&panels.triangles).map(|(q, tri)| q / tri.area()).collect();
    Ok(UnitCharges { density: b.chunks(n.max(1)).map(per_area).collect(), pivot_ratio: factors.pivot_ratio })
}

/// Evaluates all unit solutions at the six points of every panel; one pass over all pairs.
pub fn residuals(panels: &Panels, sources: &Sources, charges: &UnitCharges) -> Residuals {
    let n_rows = panels.n_rows;
    let by_panel: Vec<Vec<[f64; 6]>> = threads::map(panels.len(), |p| {
        let (mut scratch, mut row) = (sources.scratch(), vec![0.0; panels.len()]);
        let mut found = vec![[0.0; 6]; n_rows];
        for (q, (w, _)) in rules::SIX.iter().enumerate() {
            row.fill(0.0);
            sources.add_potentials(&panels.triangles[p].at(*w), 1.0, &mut row, &mut scratch);
            for (j, density) in charges.density.iter().enumerate() {
                let sum: f64 = row.iter().zip(density).map(|(g, s)| g * s).sum();
                found[j][q] = panels.unit_potential(p, j) - sum / (4.0 * PI);
            }
        }
        found
    });
    Residuals { at: (0..n_rows).map(|j| by_panel.iter().map(|row| row[j]).collect()).collect() }
}
