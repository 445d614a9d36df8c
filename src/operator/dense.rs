//! The dense matrix of averaged potentials.

use super::Sources;
use super::sources::Targets;
use crate::base::Vec3;
use crate::base::threads;
use crate::kernel::rules;
use crate::panel::Panels;

/// The matrix, stored column after column: entry (i, j) is the mean over the test points of panel `i`
/// of `∫_j dS/r` divided by the area of `j` [1/m].
///
/// Nearly symmetric (DESIGN 3.2); the unknowns that belong to it are charges of panels.
#[derive(Clone, Debug)]
pub struct Dense {
    /// Count of panels.
    pub n: usize,
    /// Entries, column after column [1/m].
    pub columns: Vec<f64>,
}

/// Bytes that assembly and factorisation of `n` panels with `rows` right sides take [B].
///
/// The matrix itself, factored in place, and 3,000 bytes a panel for moments, edges, residuals and
/// blocks of the factorisation (measured: see `tests/bench/round.rs`).
pub fn bytes(n: usize, rows: usize) -> f64 {
    let n = n as f64;
    8.0 * n * n + n * (3000.0 + 200.0 * rows as f64)
}

/// Assembles the matrix, columns in parallel.
pub fn assemble(panels: &Panels, sources: &Sources) -> Dense {
    let n = panels.len();
    // All first test points, then all second ones, then all third: the mean is over three runs.
    let at = |w: [f64; 3]| panels.triangles.iter().map(move |tri| tri.at(w));
    let points: Vec<Vec3> = rules::TEST_POINTS.iter().flat_map(|w| at(*w)).collect();
    let targets = Targets::new(&points, sources.plane());
    let mut columns = vec![0.0; n * n];
    threads::for_each_chunk(&mut columns, n.max(1), |j, column| {
        let (mut seen, mut scratch) = (vec![0.0; targets.padded()], vec![0.0; targets.padded()]);
        sources.column(j, &targets, &mut seen, &mut scratch);
        let scale = 1.0 / (panels.triangles[j].area() * rules::TEST_POINTS.len() as f64);
        for (i, entry) in column.iter_mut().enumerate() {
            *entry = (seen[i] + seen[n + i] + seen[2 * n + i]) * scale;
        }
    });
    Dense { n, columns }
}
