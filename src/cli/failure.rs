//! Why a verb did not do what was asked, and the exit code for it.

use crate::base::Finding;
use crate::case::CaseError;
use crate::cli;
use crate::cli::show::LengthUnit;
use crate::record::RecordError;
use crate::report::ReportError;
use crate::study::StudyError;
use std::io;
use std::path::PathBuf;

/// What stopped a verb.
#[derive(Debug, thiserror::Error)]
pub(super) enum Failure {
    /// The case could not be loaded.
    #[error(transparent)]
    Case(#[from] CaseError),
    /// The study gave no record.
    #[error(transparent)]
    Study(#[from] StudyError),
    /// The geometry of a case is refused.
    #[error("{error}")]
    Refused {
        /// The findings.
        error: StudyError,
        /// Name of the length unit of the case.
        unit_name: String,
        /// Metres in it [m].
        unit: f64,
    },
    /// A record where a case or a shape is wanted.
    #[error("{}: this is a record of a solved case; `matrix`, `stress` and `netlist` answer from it", .path.display())]
    IsRecord {
        /// The file.
        path: PathBuf,
    },
    /// A case with the wrong ending.
    #[error("{}: this looks like a case; give it the ending .toml", .path.display())]
    LooksLikeCase {
        /// The file.
        path: PathBuf,
    },
    /// An output could not be written.
    #[error(transparent)]
    Report(#[from] ReportError),
    /// A record could not be read.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// Standard output could not be written to.
    #[error("standard output: {0}; redirect it to a place that can be written to")]
    Output(io::Error),
    /// Case files and STL files on one command line, or several cases.
    #[error("give either one case file (.toml) or STL files, not both")]
    Mixed,
    /// `--write-case` beside a case.
    #[error("--write-case starts a case from STL files; this is a case already")]
    CaseToCase,
    /// A file is in the way.
    #[error("{}: a file already stands there; give another name, or --overwrite to replace it", .path.display())]
    Exists {
        /// The file.
        path: PathBuf,
    },
    /// An output would replace the case or a shape.
    #[error("{}: read by this case, and named for an output under [deliver]; give the output another name", .path.display())]
    Input {
        /// The file.
        path: PathBuf,
    },
    /// The record in the way is one of another study.
    #[error(
        "{}: holds {held}; give another [deliver] folder or record, or --overwrite to replace it",
        .path.display()
    )]
    OtherRecord {
        /// The record.
        path: PathBuf,
        /// What stands there.
        held: &'static str,
    },
}

impl Failure {
    /// The exit code.
    pub(super) fn code(&self) -> u8 {
        match self {
            Failure::Case(error) if error.is_unread() => cli::FILE,
            Failure::Study(StudyError::Refused(_)) | Failure::Refused { .. } => cli::REFUSED,
            // Nothing was computed and nothing is written, so this is not the accuracy code.
            Failure::Study(StudyError::Memory { .. }) => cli::BAD_REQUEST,
            Failure::Study(StudyError::Singular(_)) => cli::CHECK,
            Failure::Report(ReportError::SameName { .. }) => cli::BAD_REQUEST,
            Failure::Report(ReportError::Record { .. } | ReportError::Table { .. }) => cli::CHECK,
            Failure::Report(_) | Failure::Record(_) | Failure::Output(_) => cli::FILE,
            Failure::Case(_)
            | Failure::Mixed
            | Failure::CaseToCase
            | Failure::Input { .. }
            | Failure::IsRecord { .. }
            | Failure::LooksLikeCase { .. }
            | Failure::Exists { .. }
            | Failure::OtherRecord { .. } => cli::BAD_REQUEST,
        }
    }

    /// The unit in which lengths of its findings are told.
    pub(super) fn unit(&self) -> LengthUnit<'_> {
        match self {
            Failure::Refused { unit_name, unit, .. } => (unit_name, *unit),
            _ => ("m", 1.0),
        }
    }

    /// The findings that go with it.
    pub(super) fn findings(&self) -> &[Finding] {
        match self {
            Failure::Study(StudyError::Refused(findings))
            | Failure::Refused { error: StudyError::Refused(findings), .. } => findings,
            _ => &[],
        }
    }
}
