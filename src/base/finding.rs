//! What an inspection or a run noticed: not an error, but to be shown beside the result.

use crate::base::Vec3;

/// How much a finding weighs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// Worth knowing.
    Note,
    /// May spoil the result; the user should look.
    Warning,
    /// The geometry is refused for it.
    Refusal,
}

impl Severity {
    /// The word printed and stored.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Note => "note",
            Severity::Warning => "warning",
            Severity::Refusal => "refusal",
        }
    }
}

/// One thing noticed, with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// How much it weighs.
    pub severity: Severity,
    /// Short stable name, words joined by `_`, for scripts.
    pub code: &'static str,
    /// One sentence without a full stop: what, which part, what would be accepted.
    pub text: String,
    /// Place [m], where there is one.
    pub place: Option<Vec3>,
}
