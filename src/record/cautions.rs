//! The cautions that go with every number.

/// Goes with every line that holds a limit, a margin or a verdict.
pub const ESTIMATE: &str = "estimate for comparing designs; not a rating, certificate or proof of compliance; local codes and licensed practice decide.";

/// Goes with charge and energy.
pub const CHARGED: &str = "may stay charged after switch-off; earth before touching.";

/// Goes with every floating electrode, with its potential put in by [`floats_at`].
pub const FLOATING: &str =
    "a floating electrode floats at a potential of its own: treat as live until earthed.";

/// What [`crate::record::Record::cautions`] holds.
pub const CAUTIONS: [&str; 3] = [ESTIMATE, FLOATING, CHARGED];

/// The caution of one floating electrode, with its potential as text.
pub fn floats_at(potential: &str) -> String {
    format!("floats at {potential}: treat as live until earthed.")
}
