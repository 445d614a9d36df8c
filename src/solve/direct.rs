//! LU with partial pivoting, in place.

use crate::operator::dense::Dense;
use faer::MatMut;
use faer::MatRef;
use faer::Par;
use faer::dyn_stack::MemBuffer;
use faer::dyn_stack::MemStack;
use faer::linalg::lu::partial_pivoting::factor;
use faer::linalg::lu::partial_pivoting::solve;
use faer::perm::PermRef;

/// Why a system could not be solved.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum SolveError {
    /// A pivot is zero or not finite.
    #[error("pivot {index} of {n} is {value:e}; two panels may coincide")]
    Pivot {
        /// Which.
        index: usize,
        /// Unknowns.
        n: usize,
        /// Its value.
        value: f64,
    },
    /// The workspace could not be had.
    #[error("no memory for the workspace of {n} unknowns")]
    Workspace {
        /// Unknowns.
        n: usize,
    },
}

/// A factored matrix; the matrix itself is gone.
pub struct Factors {
    n: usize,
    lu: Vec<f64>,
    forward: Vec<usize>,
    inverse: Vec<usize>,
    /// Smallest over largest pivot, without sign [1]: rounding errors grow by about its inverse.
    pub pivot_ratio: f64,
}

fn par() -> Par {
    #[cfg(feature = "parallel")]
    return Par::rayon(0);
    #[cfg(not(feature = "parallel"))]
    return Par::Seq;
}

/// Factors the matrix in its own memory.
///
/// # Errors
/// [`SolveError::Pivot`] for a singular or non-finite matrix: the library itself gives no verdict.
pub fn factor(matrix: Dense) -> Result<Factors, SolveError> {
    let Dense { n, columns: mut lu } = matrix;
    let (mut forward, mut inverse) = (vec![0_usize; n], vec![0_usize; n]);
    let scratch = factor::lu_in_place_scratch::<usize, f64>(n, n, par(), faer::prelude::default());
    let mut buffer = MemBuffer::try_new(scratch).map_err(|_| SolveError::Workspace { n })?;
    let a = MatMut::from_column_major_slice_mut(&mut lu, n, n);
    factor::lu_in_place(
        a,
        &mut forward,
        &mut inverse,
        par(),
        MemStack::new(&mut buffer),
        faer::prelude::default(),
    );
    let pivots = (0..n).map(|k| lu[k * n + k].abs());
    let (mut lo, mut hi) = (f64::INFINITY, 0.0_f64);
    for (index, value) in pivots.enumerate() {
        if !(value.is_finite() && 0.0 < value) {
            return Err(SolveError::Pivot { index, n, value });
        }
        (lo, hi) = (lo.min(value), hi.max(value));
    }
    let pivot_ratio = if n == 0 { 1.0 } else { lo / hi };
    Ok(Factors { n, lu, forward, inverse, pivot_ratio })
}

/// Solves for all right sides, each a column of length n, one after the other in `b`; the
/// solutions take their place.
///
/// # Errors
/// [`SolveError::Workspace`].
///
/// # Panics
/// If the length of `b` is not a multiple of the count of unknowns.
pub fn solve(factors: &Factors, b: &mut [f64]) -> Result<(), SolveError> {
    let n = factors.n;
    if n == 0 {
        return Ok(());
    }
    assert_eq!(b.len() % n, 0, "right sides are whole columns");
    let columns = b.len() / n;
    let scratch = solve::solve_in_place_scratch::<usize, f64>(n, columns, par());
    let mut buffer = MemBuffer::try_new(scratch).map_err(|_| SolveError::Workspace { n })?;
    let lu = MatRef::from_column_major_slice(&factors.lu, n, n);
    let perm = PermRef::new_checked(&factors.forward, &factors.inverse, n);
    let b = MatMut::from_column_major_slice_mut(b, n, columns);
    solve::solve_in_place(lu, lu, perm, b, par(), MemStack::new(&mut buffer));
    Ok(())
}
