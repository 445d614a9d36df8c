//! The `amberskin` program: everything is in the library.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(amberskin::cli::run(std::env::args_os()))
}
