//! Ctrl-C: a message and the end, without half a file.

use crate::cli;
use crate::cli::show::to_stderr;
use crate::report::WRITING;
use std::sync::TryLockError;
use std::thread::sleep;
use std::time::Duration;
use std::time::Instant;

/// Longest wait for a file that is being written [s]; the program ends within a second in all.
const PATIENCE: Duration = Duration::from_millis(700);

/// Ends the process on Ctrl-C, a hang-up or a request to terminate.
pub(super) fn watch() {
    if let Err(error) = ctrlc::set_handler(end) {
        to_stderr(&format!("warning: Ctrl-C ends the program without a message ({error})"));
    }
}

fn end() {
    let start = Instant::now();
    // Whoever writes a file holds the lock until the file has its name.
    let held = loop {
        match WRITING.try_lock() {
            Ok(guard) => break Some(guard),
            Err(TryLockError::Poisoned(poisoned)) => break Some(poisoned.into_inner()),
            Err(TryLockError::WouldBlock) if PATIENCE < start.elapsed() => break None,
            Err(TryLockError::WouldBlock) => sleep(Duration::from_millis(5)),
        }
    };
    to_stderr("\ninterrupted: files already written are whole, the rest was not written");
    end_process(held);
}

/// Ends the process while the lock is held, so that no file is begun in the last moment.
fn end_process<T>(_held: T) {
    std::process::exit(i32::from(cli::INTERRUPTED))
}
