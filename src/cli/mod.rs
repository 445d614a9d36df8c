//! Arguments, progress lines, messages and exit codes: the only room that prints.
//!
//! In: the words of a command line.  Out: text on the terminal, an exit code.
//! Not here: any result (`study`), any file format (`report`, `record`, `case`).
//! Symbols: as in the crate's table; results go to standard output, all else to standard error.

mod args;
mod case_to_fill;
mod failure;
mod help;
mod inspect;
mod interrupt;
mod key;
mod progress;
mod prove;
mod records;
mod show;
mod solve;

use clap::Parser;
use clap::error::ErrorKind;
use failure::Failure;
use show::Show;
use std::ffi::OsString;

/// All done and every demand met.
pub const DONE: u8 = 0;
/// The request makes no sense: arguments, case file, or an overwrite that was not asked for.
pub const BAD_REQUEST: u8 = 1;
/// The geometry is refused.
pub const REFUSED: u8 = 2;
/// The accuracy asked for was not reached.
pub const ACCURACY: u8 = 3;
/// A limit is exceeded, or it is not decided whether.
pub const LIMIT: u8 = 4;
/// An internal check failed beyond its bar.
pub const CHECK: u8 = 5;
/// A file could not be read or written.
pub const FILE: u8 = 6;
/// Interrupted.
pub const INTERRUPTED: u8 = 130;

/// Does what a command line asks and says how it went: the exit code.
///
/// `words` starts with the name of the program.
pub fn run(words: impl IntoIterator<Item = OsString>) -> u8 {
    let args = match args::Args::try_parse_from(words) {
        Ok(args) => args,
        Err(error) => {
            // A terminal that cannot be written to leaves nobody to tell.
            let _ = error.print();
            return match error.kind() {
                ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => DONE,
                _ => BAD_REQUEST,
            };
        }
    };
    interrupt::watch();
    let show = Show { json: args.json, quiet: args.quiet };
    match dispatch(&args.verb, &show) {
        Ok(code) => code,
        Err(failure) => {
            show.failure(&failure);
            failure.code()
        }
    }
}

fn dispatch(verb: &args::Verb, show: &Show) -> Result<u8, Failure> {
    match verb {
        args::Verb::Inspect(args) => inspect::run(args, show),
        args::Verb::Solve(args) => solve::run(args, show),
        args::Verb::Matrix(args) => records::matrix(args, show),
        args::Verb::Stress(args) => records::stress(args, show),
        args::Verb::Netlist(args) => records::netlist(args, show),
        args::Verb::Prove => prove::run(show),
        args::Verb::Key => key::run(show),
    }
}
