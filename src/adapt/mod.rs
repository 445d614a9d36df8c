//! Solve, estimate, mark, split; and when to stop.
//!
//! In: first panels, a demand, limits.  Out: the last `Solved` round and why it is the last.
//! Not here: printing (a callback tells each round), formulas (`physics`).
//! Symbols: as in the crate's table; η̄, η̃ as in `physics::estimate`.
//! Reference: Dörfler, SIAM J. Numer. Anal. 33 (1996) 1106.

mod mark;
mod run;
mod split;

pub use mark::Demand;
pub use mark::over_floor;
pub use mark::reached;
pub use mark::scale;
pub use run::Finished;
pub use run::Limits;
pub use run::Round;
pub use run::Stop;
pub use run::run;
pub use split::at_least;
pub use split::bisect;
