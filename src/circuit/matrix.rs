//! Other forms of the Maxwell capacitance matrix.

use crate::circuit::CircuitError;
use nalgebra::DMatrix;
use nalgebra::Dyn;
use nalgebra::LU;

/// A matrix, nested row by row [unit stated where it is used].
pub type Matrix = Vec<Vec<f64>>;

/// Smallest over largest pivot, after scaling to a unit diagonal, below which a matrix counts as
/// singular [1].
///
/// For two electrodes it is 1 − k², k the coupling: 0.19 for square sheets a twentieth of their width
/// apart (218.05 and −196.28 pF); 2e-9 for a pair that sends 1e-9 of its charge to earth.  Rounding
/// leaves 1e-16 of a matrix that should end at zero.  Bars of entries are far above 1e-12 of them, so
/// a matrix under this limit has no inverse worth a digit.
const MIN_PIVOT: f64 = 1e-12;

/// Two-terminal capacitances [F]: `c_ij = −(C_ij + C_ji) / 2`, diagonal 0.
pub fn mutual(c: &[Vec<f64>]) -> Matrix {
    let n = c.len();
    let entry = |i: usize, j: usize| if i == j { 0.0 } else { -0.5 * (c[i][j] + c[j][i]) };
    (0..n).map(|i| (0..n).map(|j| entry(i, j)).collect()).collect()
}

/// Capacitances to earth and surroundings [F]: the sum of each row.
pub fn earth(c: &[Vec<f64>]) -> Vec<f64> {
    c.iter().map(|row| row.iter().sum()).collect()
}

/// The matrix after bonding [F]: one row for each group, the sum of its members' rows and columns.
///
/// `groups` lists every row once; a row alone is a group of one.
///
/// # Errors
/// [`CircuitError::Size`], [`CircuitError::BadGroup`].
pub fn bonded(c: &[Vec<f64>], groups: &[Vec<usize>]) -> Result<Matrix, CircuitError> {
    check(c)?;
    let mut seen = vec![false; c.len()];
    for row in groups.iter().flatten() {
        match seen.get_mut(*row) {
            Some(seen) if !*seen => *seen = true,
            _ => return Err(CircuitError::BadGroup { row: *row }),
        }
    }
    if let Some(row) = seen.iter().position(|seen| !seen) {
        return Err(CircuitError::BadGroup { row });
    }
    let sum = |a: &[usize], b: &[usize]| a.iter().flat_map(|i| b.iter().map(|j| c[*i][*j])).sum();
    Ok(groups.iter().map(|a| groups.iter().map(|b| sum(a, b)).collect()).collect())
}

/// Inverse of the matrix: the potential coefficients [1/F].
///
/// To first order a change `δC` changes it by `δp = −p δC p`: entry `p_ij` has the weights
/// `−p_ik p_lj` on `δC_kl`.
///
/// # Errors
/// [`CircuitError::Size`], [`CircuitError::NotFinite`], [`CircuitError::Singular`].
pub fn inverse(c: &[Vec<f64>]) -> Result<Matrix, CircuitError> {
    check(c)?;
    let solver = Solver::build(&DMatrix::from_fn(c.len(), c.len(), |i, j| c[i][j]))?;
    let p = solver.solve(&DMatrix::identity(c.len(), c.len()));
    Ok((0..c.len()).map(|i| p.row(i).iter().copied().collect()).collect())
}

/// Refuses what is not square or not finite.
pub(super) fn check(c: &[Vec<f64>]) -> Result<(), CircuitError> {
    for (line, row) in c.iter().enumerate() {
        if row.len() != c.len() {
            return Err(CircuitError::Size { line, found: row.len(), expected: c.len() });
        }
        if row.iter().any(|v| !v.is_finite()) {
            return Err(CircuitError::NotFinite { row: line });
        }
    }
    Ok(())
}

/// A factored matrix, scaled to a unit diagonal so that electrodes of very different size do not
/// pass for a singular matrix.
pub(super) struct Solver {
    lu: LU<f64, Dyn, Dyn>,
    scale: Vec<f64>,
}

impl Solver {
    /// Factors `m`.
    pub(super) fn build(m: &DMatrix<f64>) -> Result<Solver, CircuitError> {
        let n = m.nrows();
        let scale: Vec<f64> = (0..n).map(|i| m[(i, i)].abs().sqrt().recip()).collect();
        if scale.iter().any(|s| !s.is_finite()) {
            return Err(CircuitError::Singular { n, pivot: 0.0 });
        }
        let lu = DMatrix::from_fn(n, n, |i, j| scale[i] * m[(i, j)] * scale[j]).lu();
        let pivots: Vec<f64> = lu.u().diagonal().iter().map(|p| p.abs()).collect();
        let (low, high) = pivots.iter().fold((f64::INFINITY, 0.0_f64), |(l, h), p| (l.min(*p), h.max(*p)));
        // False for a pivot that is not a number, too.
        let is_regular = MIN_PIVOT * high <= low && 0.0 < low;
        if n != 0 && !is_regular {
            return Err(CircuitError::Singular { n, pivot: low / high });
        }
        Ok(Solver { lu, scale })
    }

    /// `m⁻¹ b`.
    pub(super) fn solve(&self, b: &DMatrix<f64>) -> DMatrix<f64> {
        // The triangular solves of nalgebra do not take an empty matrix.
        if b.nrows() == 0 {
            return b.clone();
        }
        let scaled =
            |b: &DMatrix<f64>| DMatrix::from_fn(b.nrows(), b.ncols(), |i, j| self.scale[i] * b[(i, j)]);
        let x = self.lu.solve(&scaled(b));
        // Pivots were checked when it was built, so the triangular solves cannot fail.
        scaled(&x.expect("pivots are not zero"))
    }
}
