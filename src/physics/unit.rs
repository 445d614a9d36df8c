//! Unit charges and what they miss.

use crate::base::Vec3;
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
    let points: Vec<Vec3> =
        panels.triangles.iter().flat_map(|tri| rules::SIX.map(|(w, _)| tri.at(w))).collect();
    let sums = sources.potentials(&points, &charges.density);
    let of_row = |(j, sum): (usize, &Vec<f64>)| {
        let (groups, _) = sum.as_chunks::<6>();
        let of_panel =
            |(p, seen): (usize, &[f64; 6])| seen.map(|v| panels.unit_potential(p, j) - v / (4.0 * PI));
        groups.iter().enumerate().map(of_panel).collect()
    };
    Residuals { at: sums.iter().enumerate().map(of_row).collect() }
}
