//! Block circulant systems by the discrete Fourier transform: one complex LU for each pair of frequencies.
//!
//! Block (s, t) depends on s − t alone, so the transform over the blocks makes the system block diagonal
//! (Davis, Circulant Matrices, 1979, section 5.6).

use super::direct::SolveError;
use super::direct::par;
use faer::MatMut;
use faer::MatRef;
use faer::c64;
use faer::dyn_stack::MemBuffer;
use faer::dyn_stack::MemStack;
use faer::linalg::lu::partial_pivoting::factor;
use faer::linalg::lu::partial_pivoting::solve;
use faer::perm::PermRef;
use std::f64::consts::TAU;

/// The first block column of a block circulant matrix.
#[derive(Clone, Debug)]
pub struct BlockColumn {
    /// Unknowns of a block.
    pub m: usize,
    /// Count of blocks in a column.
    pub count: usize,
    /// Entries, column after column of length `m · count` [1/m].
    pub columns: Vec<f64>,
}

/// Solves for all right sides, each a column of length `m · count`, one after the other in `b`; the
/// solutions take their place.  Returns the smallest over the largest pivot of all blocks, without sign [1].
///
/// # Errors
/// As the direct solution of a full matrix.
///
/// # Panics
/// If the length of `b` is not a multiple of the count of unknowns.
pub fn solve(matrix: &BlockColumn, b: &mut [f64]) -> Result<f64, SolveError> {
    let (m, count) = (matrix.m, matrix.count);
    let n = m * count;
    if n == 0 {
        return Ok(1.0);
    }
    assert_eq!(b.len() % n, 0, "right sides are whole columns");
    let rights = b.len() / n;
    let mut solutions = vec![0.0; b.len()];
    let (mut lo, mut hi) = (f64::INFINITY, 0.0_f64);
    // Of a real matrix the block of frequency count − k is the conjugate of that of k.
    for k in 0..=count / 2 {
        let phase = |s: usize| {
            let angle = TAU * ((k * s) % count) as f64 / count as f64;
            (angle.cos(), angle.sin())
        };
        let phases: Vec<(f64, f64)> = (0..count).map(phase).collect();
        let mut block = transformed(&matrix.columns, m, &phases);
        let mut right = transformed(b, m, &phases);
        let (least, most) = solve_block(&mut block, &mut right, m, k * m)?;
        (lo, hi) = (lo.min(least), hi.max(most));
        let weight = if k == 0 || 2 * k == count { 1.0 } else { 2.0 } / count as f64;
        for r in 0..rights {
            for (s, (cos, sin)) in phases.iter().enumerate() {
                let out = &mut solutions[r * n + s * m..r * n + (s + 1) * m];
                // Real part of x e^(+iφ).
                let x = right[r * m..(r + 1) * m].iter();
                out.iter_mut().zip(x).for_each(|(out, x)| *out += weight * (x.re * cos - x.im * sin));
            }
        }
    }
    b.copy_from_slice(&solutions);
    Ok(lo / hi)
}

/// `Σ_s block_s e^(−iφ_s)` of columns that consist of blocks of length `m`.
fn transformed(columns: &[f64], m: usize, phases: &[(f64, f64)]) -> Vec<c64> {
    let mut out = Vec::with_capacity(columns.len() / phases.len());
    for column in columns.chunks(m * phases.len()) {
        let first = out.len();
        out.resize(first + m, c64::new(0.0, 0.0));
        for (block, (cos, sin)) in column.chunks(m).zip(phases) {
            for (out, value) in out[first..].iter_mut().zip(block) {
                out.re += value * cos;
                out.im -= value * sin;
            }
        }
    }
    out
}

/// Solves one block in place; smallest and largest pivot without sign.
fn solve_block(
    block: &mut [c64],
    right: &mut [c64],
    m: usize,
    before: usize,
) -> Result<(f64, f64), SolveError> {
    let columns = right.len() / m;
    let (mut forward, mut inverse) = (vec![0_usize; m], vec![0_usize; m]);
    let scratch = factor::lu_in_place_scratch::<usize, c64>(m, m, par(), faer::prelude::default());
    let mut buffer = MemBuffer::try_new(scratch).map_err(|_| SolveError::Workspace { n: m })?;
    factor::lu_in_place(
        MatMut::from_column_major_slice_mut(block, m, m),
        &mut forward,
        &mut inverse,
        par(),
        MemStack::new(&mut buffer),
        faer::prelude::default(),
    );
    let (mut lo, mut hi) = (f64::INFINITY, 0.0_f64);
    for index in 0..m {
        let value = block[index * m + index].norm();
        if !(value.is_finite() && 0.0 < value) {
            return Err(SolveError::Pivot { index: before + index, n: m, value });
        }
        (lo, hi) = (lo.min(value), hi.max(value));
    }
    let scratch = solve::solve_in_place_scratch::<usize, c64>(m, columns, par());
    let mut buffer = MemBuffer::try_new(scratch).map_err(|_| SolveError::Workspace { n: m })?;
    let lu = MatRef::from_column_major_slice(&*block, m, m);
    let perm = PermRef::new_checked(&forward, &inverse, m);
    let right = MatMut::from_column_major_slice_mut(right, m, columns);
    solve::solve_in_place(lu, lu, perm, right, par(), MemStack::new(&mut buffer));
    Ok((lo, hi))
}
