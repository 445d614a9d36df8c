//! Algebra on the Maxwell capacitance matrix: mutual, earth, inverse, bond, float, follow.
//!
//! In: a matrix [F] and the state of each row.  Out: potentials, charges, energy, and how they
//! answer to a change of the matrix.
//! Not here: any field (`physics`), any bar: bars come from the weights given here.
//! Symbols: as in the crate's table; `u` and `w` are weights, see [`Settled`].
//!
//! ```
//! use amberskin::circuit::{State, settle};
//! // 3 pF from a live plate to a floating one, 2 pF from there to earth: a divider of 3 to 5.
//! let c = [vec![8e-12, -3e-12], vec![-3e-12, 5e-12]];
//! let rest = settle(&c, &[State::Potential(1e3), State::Charge(0.0)], &[])?;
//! assert!((rest.potentials[1] - 600.0).abs() < 1e-9);
//! # Ok::<(), amberskin::circuit::CircuitError>(())
//! ```

mod matrix;
mod settle;

pub use matrix::Matrix;
pub use matrix::bonded;
pub use matrix::earth;
pub use matrix::inverse;
pub use matrix::mutual;
pub use settle::Settled;
pub use settle::State;
pub use settle::settle;

/// Why the algebra has no answer.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum CircuitError {
    /// The matrix is not square, or not of the size of the states.
    #[error("the capacitance matrix has {found} entries in line {line}; {expected} are needed")]
    Size {
        /// Line, counted from 0.
        line: usize,
        /// Entries in it (0 if the line is missing).
        found: usize,
        /// Number of rows.
        expected: usize,
    },
    /// An entry, potential or charge is infinite or not a number.
    #[error("row {row} holds a number that is not finite")]
    NotFinite {
        /// Row, counted from 0.
        row: usize,
    },
    /// No unique answer: an electrode without capacitance, or a matrix whose rows depend on each other.
    #[error(
        "the capacitance matrix of {n} rows is singular to rounding (pivot {pivot:.1e} of 1); no electrode may be without a capacitance of its own"
    )]
    Singular {
        /// Unknowns.
        n: usize,
        /// Smallest over largest pivot after scaling to a unit diagonal [1].
        pivot: f64,
    },
    /// A group or a follower names a row that does not exist, stands in two groups or goes round.
    #[error(
        "row {row} is named in two groups, does not exist, or follows itself; each row belongs to at most one group and follows a row that does not lead back"
    )]
    BadGroup {
        /// Row, counted from 0.
        row: usize,
    },
    /// Bonded rows at two potentials.
    #[error("row {row} is bonded to one at {other} V and is given {volts} V; give both the same")]
    TwoPotentials {
        /// Row, counted from 0.
        row: usize,
        /// Its potential [V].
        volts: f64,
        /// That of the other [V].
        other: f64,
    },
    /// A charge on a row that is bonded to one with a given potential.
    #[error(
        "row {row} is given {coulombs} C and is bonded to one with a given potential; give a potential or a charge"
    )]
    ChargeOnHeld {
        /// Row, counted from 0.
        row: usize,
        /// The charge [C].
        coulombs: f64,
    },
}
