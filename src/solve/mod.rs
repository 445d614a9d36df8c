//! Direct solution of dense systems.
//!
//! In: a square matrix and right sides.  Out: solutions and the estimate of their rounding.
//! Not here: what the numbers mean.
//! Symbols: `a` the matrix, `b` right sides, `n` unknowns.
//! Reference: Golub and Van Loan, Matrix Computations, section 3.4.

pub mod direct;
