//! The dense matrix of averaged potentials.

use super::Sources;
use crate::base::threads;
use crate::kernel::rules;
use crate::panel::Panels;

/// The matrix, stored row after row: entry (i, j) is the mean over the test points of panel `i` of
/// `∫_j dS/r` divided by the area of `j` [1/m].
///
/// Nearly symmetric (DESIGN 3.2); the unknowns that belong to it are charges of panels.
#[derive(Clone, Debug)]
pub struct Dense {
    /// Count of panels.
    pub n: usize,
    /// Entries, row after row [1/m].
    pub rows: Vec<f64>,
}

/// Bytes that assembly and factorisation of `n` panels with `rows` right sides take [B].
///
/// The matrix itself, factored in place, and 2,500 bytes a panel for moments, edges, residuals and
/// blocks of the factorisation (measured: see `tests/bench/round.rs`).
pub fn bytes(n: usize, rows: usize) -> f64 {
    let n = n as f64;
    8.0 * n * n + n * (2500.0 + 200.0 * rows as f64)
}

/// Assembles the matrix, rows in parallel.
pub fn assemble(panels: &Panels, sources: &Sources) -> Dense {
    let n = panels.len();
    let per_area: Vec<f64> = panels.triangles.iter().map(|tri| 1.0 / tri.area()).collect();
    let mut rows = vec![0.0; n * n];
    let weight = 1.0 / rules::TEST_POINTS.len() as f64;
    threads::for_each_chunk(&mut rows, n.max(1), |i, row| {
        let mut scratch = sources.scratch();
        for w in rules::TEST_POINTS {
            sources.add_potentials(&panels.triangles[i].at(w), weight, row, &mut scratch);
        }
        row.iter_mut().zip(&per_area).for_each(|(entry, per_area)| *entry *= per_area);
    });
    Dense { n, rows }
}
