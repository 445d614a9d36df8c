//! Potential coefficients of panels: from charges to averaged potentials.
//!
//! In: `Panels` [m].  Out: `∫dS/r` of panels at points [m], and the dense matrix of averages.
//! Not here: 1/4πε and volts (`physics`), the solution (`solve`).
//! Symbols: as in the crate's table.
//! Reference: Harrington, Field Computation by Moment Methods, 1968, chapter 2.

pub mod dense;
mod sources;

pub use sources::Sources;
