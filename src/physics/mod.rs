//! Unit charges to capacitance, error bars, surface field, field at a point and energy.
//!
//! In: `Panels` and their unit charge densities.  Out: farads, volts per metre, bars.
//! Not here: where to refine (`adapt`), algebra on the finished matrix (`circuit`).
//! Symbols: as in the crate's table; `s = σ/ε` [V/m per V], `u`, `v` weights over the rows.
//! References: Becker, Rannacher, Acta Numerica 10 (2001) 1; Carstensen, Stephan, Math. Comp. 64
//! (1995) 483; Feischl et al., Arch. Comput. Methods Eng. 22 (2015) 309.

pub mod capacitance;
pub mod edges;
pub mod estimate;
pub mod faceting;
pub mod field;
pub mod gap;
pub mod look;
pub mod rim;
pub mod solved;
pub mod unit;

use crate::base::si::EPS0;

/// Permittivity of the surroundings [F/m].
pub fn permittivity(eps_r: f64) -> f64 {
    EPS0 * eps_r
}
