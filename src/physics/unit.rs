//! Unit charges and what they miss.

use crate::base::Vec3;
use crate::kernel::rules;
use crate::operator::Sources;
use crate::operator::dense;
use crate::panel::Panels;
use crate::panel::Ring;
use crate::solve::circulant;
use crate::solve::circulant::BlockColumn;
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
    if let Some(ring) = &panels.ring {
        return solve_ring(panels, sources, ring);
    }
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

/// The same for panels that repeat around an axis: one block column, one right side for each set of rows that
/// turn into each other; the other solutions are turned copies.
fn solve_ring(panels: &Panels, sources: &Sources, ring: &Ring) -> Result<UnitCharges, SolveError> {
    let (n, m, count) = (panels.len(), panels.distinct(), ring.sectors());
    let first = ring.first_rows();
    let matrix = BlockColumn { m, count, columns: dense::columns(panels, sources, m) };
    let mut b = vec![0.0; n * first.len()];
    for (row, column) in first.iter().zip(b.chunks_mut(n.max(1))) {
        (0..n).for_each(|p| column[p] = 4.0 * PI * panels.unit_potential(p, *row));
    }
    let pivot_ratio = circulant::solve(&matrix, &mut b)?;
    let mut density = vec![Vec::new(); panels.n_rows];
    for (row, charge) in first.iter().zip(b.chunks(n.max(1))) {
        for s in 0..count {
            let turned = |p: usize| charge[(p + n - s * m) % n] / panels.triangles[p].area();
            density[ring.turned_row(*row, s)] = (0..n).map(turned).collect();
        }
    }
    Ok(UnitCharges { density, pivot_ratio })
}

/// Evaluates all unit solutions at the six points of every panel; one pass over all pairs.
pub fn residuals(panels: &Panels, sources: &Sources, charges: &UnitCharges) -> Residuals {
    let distinct = &panels.triangles[..panels.distinct()];
    let points: Vec<Vec3> = distinct.iter().flat_map(|tri| rules::SIX.map(|(w, _)| tri.at(w))).collect();
    let sums = sources.potentials(&points, &charges.density);
    let of_row = |(j, sum): (usize, &Vec<f64>)| {
        let (groups, _) = sum.as_chunks::<6>();
        let of_panel =
            |(p, seen): (usize, &[f64; 6])| seen.map(|v| panels.unit_potential(p, j) - v / (4.0 * PI));
        groups.iter().enumerate().map(of_panel).collect()
    };
    let at: Vec<Vec<[f64; 6]>> = sums.iter().enumerate().map(of_row).collect();
    match &panels.ring {
        Some(ring) => Residuals { at: all_sectors(&at, ring) },
        None => Residuals { at },
    }
}

/// Residuals in all sectors from those of all unit solutions in the first one: row `j` seen in sector `t` is
/// row `j` turned back `t` times, seen in the first.
fn all_sectors(first: &[Vec<[f64; 6]>], ring: &Ring) -> Vec<Vec<[f64; 6]>> {
    let count = ring.sectors();
    let of_row =
        |j: usize| (0..count).flat_map(|t| first[ring.turned_row(j, count - t)].iter().copied()).collect();
    (0..first.len()).map(of_row).collect()
}
