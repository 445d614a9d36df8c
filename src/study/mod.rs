//! One case to one record; progress events.
//!
//! In: a resolved case and the bytes of its shapes.  Out: `Outcome`, or all that was refused.
//! Not here: printing, files (`report`, `cli`), formulas (the rooms below).
//! Symbols: as in the crate's table.

mod bodies;
mod checks;
mod inspect;
mod prove;
mod prove_shapes;
mod record;
mod run;
mod state;
mod voltage;

use crate::base::Finding;
use crate::base::Severity;
use crate::base::counted;
use crate::record::Record;
use crate::record::SurfaceTable;

pub use inspect::inspect_case;
pub use inspect::inspect_files;
pub use prove::ProveLine;
pub use prove::prove;
pub use run::run;

/// What a running study tells.
#[derive(Clone, Debug, PartialEq)]
pub enum Event {
    /// A phase began: `read`, `inspect`, `panel`, `assemble`, `factor`, `correct`, `refine`, `results`.
    Phase(&'static str),
    /// A round of refinement ended.
    Round {
        /// Counted from 1.
        number: usize,
        /// Panels in it.
        panels: usize,
        /// Largest relative bar reached under the demand [1].
        reached: f64,
        /// Bar asked [1].
        asked: f64,
        /// Estimated seconds left, if more rounds follow [s].
        left: Option<f64>,
    },
}

/// A finished study: the record (its surface file not hashed yet) and the panels.
#[derive(Clone, Debug, PartialEq)]
pub struct Outcome {
    /// The record; `surface_file` is filled by whoever writes the surface file.
    pub record: Record,
    /// What the surface file holds.
    pub surface: SurfaceTable,
}

/// What an incoming inspection found.
#[derive(Clone, Debug, PartialEq)]
pub struct Inspection {
    /// Every finding, repairs made among them.
    pub findings: Vec<Finding>,
    /// A line for each body.
    pub bodies: Vec<BodyLine>,
    /// Panels expected for the demand, roughly, and memory [B], for a case.
    pub effort: Option<(usize, f64)>,
    /// Repaired bodies, name and facets in the unit of the drawing, for `--repair`.
    pub repaired: Vec<(String, Vec<[crate::base::Vec3; 3]>)>,
}

/// One body of an inspection.
#[derive(Clone, Debug, PartialEq)]
pub struct BodyLine {
    /// Electrode name, or file and shell.
    pub name: String,
    /// Facets after repair.
    pub facets: usize,
    /// Closed or open.
    pub closed: bool,
    /// Overall size, in the unit of the drawing where no case gives one, else [m].
    pub size: [f64; 3],
    /// Area in the square of that unit, else [m²].
    pub area: f64,
    /// Volume in the cube of that unit, else [m³].
    pub volume: f64,
}

/// Why a study gave no record.
#[derive(Debug, thiserror::Error)]
pub enum StudyError {
    /// The geometry is refused; all findings, the refusals among them.
    #[error("geometry refused: {}", problems(.0))]
    Refused(Vec<Finding>),
    /// The first round would not fit.
    #[error(
        "{panels} panels need {needed_bytes:.2e} bytes, {limit_bytes:.2e} are allowed; raise `memory_limit` or draw fewer facets"
    )]
    Memory {
        /// Panels of the first round.
        panels: usize,
        /// Memory needed [B].
        needed_bytes: f64,
        /// Memory allowed [B].
        limit_bytes: f64,
    },
    /// The linear system could not be solved.
    #[error("the linear system is singular: {0}")]
    Singular(String),
}

/// `1 problem`, `3 problems`: the refusals among the findings.
fn problems(findings: &[Finding]) -> String {
    counted(findings.iter().filter(|finding| finding.severity == Severity::Refusal).count(), "problem")
}
