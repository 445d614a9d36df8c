//! The command line.

use crate::cli::help;
use crate::report::Form;
use clap::Args as ClapArgs;
use clap::Parser;
use clap::Subcommand;
use clap::ValueEnum;
use std::path::PathBuf;

/// Capacitances, surface fields and netlists of electrode assemblies drawn as STL, each number with
/// a figure for how far to trust it.
#[derive(Debug, Parser)]
#[command(name = "amberskin", version, about, after_help = help::SHORT, after_long_help = help::LONG)]
#[command(subcommand_required = true, arg_required_else_help = true, disable_help_subcommand = true)]
pub(super) struct Args {
    /// What to do.
    #[command(subcommand)]
    pub(super) verb: Verb,
    /// Print results as JSON on standard output.
    #[arg(long, global = true)]
    pub(super) json: bool,
    /// No progress and no remarks on standard error; errors are still told.
    #[arg(long, global = true)]
    pub(super) quiet: bool,
}

#[derive(Debug, Subcommand)]
pub(super) enum Verb {
    /// Look at STL files or at a case: sizes, defects, contacts, gaps, creases; solves nothing.
    #[command(after_help = help::INSPECT)]
    Inspect(Inspect),
    /// Solve a case to the accuracy it asks for; write the record and the files of [deliver].
    #[command(after_help = help::CODES, after_long_help = help::SOLVE)]
    Solve(Solve),
    /// Print the matrices of a record: charge per volt, mutual, potential coefficients.
    #[command(after_help = help::MATRIX)]
    Matrix(Matrix),
    /// Print the highest surface field of every electrode in every voltage case of a record.
    #[command(after_help = help::STRESS)]
    Stress(Stress),
    /// Print the subcircuit of a record for a circuit simulator.
    #[command(after_help = help::NETLIST)]
    Netlist(Netlist),
    /// Solve cases with exact answers on this machine and print deviation against bar.
    #[command(after_help = help::PROVE)]
    Prove,
    /// Explain the sign and naming rules of the tables.
    Key,
}

#[derive(Debug, ClapArgs)]
pub(super) struct Inspect {
    /// One case file (.toml), or STL files.
    #[arg(required = true, value_name = "CASE or STL")]
    pub(super) files: Vec<PathBuf>,
    /// Write each body as repaired, a binary STL file a body, into this folder.
    #[arg(long, value_name = "DIR")]
    pub(super) repair: Option<PathBuf>,
    /// Write a case to fill in: one electrode a shell, units and size checks left blank.
    #[arg(long, value_name = "FILE")]
    pub(super) write_case: Option<PathBuf>,
    /// Replace files that already stand where --repair or --write-case would write.
    #[arg(long)]
    pub(super) overwrite: bool,
}

#[derive(Debug, ClapArgs)]
pub(super) struct Solve {
    /// The case file (TOML).
    pub(super) case: PathBuf,
    /// Replace a record of another case or of other shapes, and files that no record of this case names.
    #[arg(long)]
    pub(super) overwrite: bool,
}

#[derive(Debug, ClapArgs)]
pub(super) struct Matrix {
    /// The record (record.json) of a solved case.
    pub(super) record: PathBuf,
    /// Print comma-separated values with all digits: one form square, or all forms in long rows.
    #[arg(long, conflicts_with = "json")]
    pub(super) csv: bool,
    /// Only this form; without it all three.
    #[arg(long, value_enum)]
    pub(super) form: Option<FormWord>,
}

#[derive(Debug, ClapArgs)]
pub(super) struct Stress {
    /// The record (record.json) of a solved case.
    pub(super) record: PathBuf,
}

#[derive(Debug, ClapArgs)]
pub(super) struct Netlist {
    /// The record (record.json) of a solved case.
    pub(super) record: PathBuf,
    /// Leave out the 1e15 ohm resistors that give floating electrodes a DC path.
    #[arg(long)]
    pub(super) no_bleed: bool,
    /// Write to this file instead of standard output.
    #[arg(short, long, value_name = "FILE")]
    pub(super) output: Option<PathBuf>,
    /// Replace the file of -o if it exists.
    #[arg(long, requires = "output")]
    pub(super) overwrite: bool,
}

/// A form of the matrix, as typed.
#[derive(Clone, Copy, Debug, ValueEnum)]
pub(super) enum FormWord {
    /// Maxwell capacitance matrix: charge per volt.
    ChargePerVolt,
    /// Two-terminal capacitances and those to earth.
    Mutual,
    /// Inverse of the Maxwell matrix: volt per charge.
    PotentialCoefficients,
}

impl FormWord {
    /// The form meant.
    pub(super) fn form(self) -> Form {
        match self {
            FormWord::ChargePerVolt => Form::Maxwell,
            FormWord::Mutual => Form::Mutual,
            FormWord::PotentialCoefficients => Form::PotentialCoefficients,
        }
    }
}
