//! A case file to fill in, written for the user.

use crate::report::ReportError;
use crate::report::file;
use std::path::Path;

/// Writes the text of a case file to `path`, whole or not at all.
///
/// # Errors
/// [`ReportError::Write`] also where a file already stands: a case somebody filled in is never lost.
pub fn write(path: &Path, text: &str) -> Result<(), ReportError> {
    if path.exists() {
        let source = std::io::Error::new(std::io::ErrorKind::AlreadyExists, "a file already stands there");
        return Err(ReportError::Write { path: path.to_owned(), source });
    }
    file::write_whole(path, text.as_bytes())
}
