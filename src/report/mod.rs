//! Answer sheet, tables, CSV, JSON, netlist and surface file from a record.
//!
//! In: a `Record` and a `SurfaceTable`, SI.  Out: texts, and files that are whole or absent.
//! Not here: any result (`study`), printing on a terminal (`cli`).
//! Symbols: as in the crate's table; a *bar* is the ± figure of a number.
//! Reference: VTK file formats, vtk.org; SPICE netlists as written since SPICE2 (Nagel, UCB/ERL M520, 1975).

pub mod answers;
pub mod case_file;
pub mod csv;
pub mod deliver;
pub mod digits;
pub mod file;
pub mod form;
pub mod json;
pub mod lengths;
pub mod netlist;
pub mod printing;
pub mod stl;
pub mod tables;
pub mod vtu;

pub use deliver::Targets;
pub use deliver::deliver;
pub use file::WRITING;
pub use form::Form;
pub use printing::Printing;

use crate::record::RecordError;
use std::io;
use std::path::PathBuf;

/// Why an output was not written.  Exit code 6.
#[derive(Debug, thiserror::Error)]
pub enum ReportError {
    /// A folder could not be made.
    #[error("{}: the folder cannot be made: {source}; give a folder that may be written to", .path.display())]
    Folder {
        /// The folder.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// A file could not be written; what stood there before still stands.
    #[error("{}: cannot be written: {source}; give a path in a folder that may be written to", .path.display())]
    Write {
        /// The file.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// Two outputs would have the same name.
    #[error("{}: named for two outputs under `[deliver]`; give each its own name", .path.display())]
    SameName {
        /// The name.
        path: PathBuf,
    },
    /// The record holds what cannot be stored.
    #[error("{}: {source}", .path.display())]
    Record {
        /// Where it should have gone.
        path: PathBuf,
        /// What is wrong with it.
        source: RecordError,
    },
    /// The surface table contradicts itself or holds a number that is not finite.
    #[error("{}: not written: {problem}", .path.display())]
    Table {
        /// Where it should have gone.
        path: PathBuf,
        /// The first contradiction.
        problem: vtu::TableProblem,
    },
}
