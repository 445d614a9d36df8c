//! One file at a time, whole or absent.

use crate::report::ReportError;
use std::io;
use std::io::Write;
use std::path::Path;
use std::path::PathBuf;
use std::sync::Mutex;
use std::sync::PoisonError;

/// Held while a file is written and renamed; who ends the process on an interrupt takes it first,
/// so that neither half a file nor a leftover beside it stays behind.
pub static WRITING: Mutex<()> = Mutex::new(());

/// Writes `bytes` to a new file beside `path`, brings it to the disk and renames it to `path`.
///
/// Folders are made.  Permissions are those of any new file (0666 less the mask of the process).
///
/// # Errors
/// [`ReportError::Folder`], [`ReportError::Write`]; what stood at `path` then still stands.
pub fn write_whole(path: &Path, bytes: &[u8]) -> Result<(), ReportError> {
    let folder = folder_of(path);
    let _held = WRITING.lock().unwrap_or_else(PoisonError::into_inner);
    std::fs::create_dir_all(&folder)
        .map_err(|source| ReportError::Folder { path: folder.clone(), source })?;
    write_and_rename(&folder, path, bytes)
        .map_err(|source| ReportError::Write { path: path.to_owned(), source })
}

fn write_and_rename(folder: &Path, path: &Path, bytes: &[u8]) -> io::Result<()> {
    if path.file_name().is_none() || path.is_dir() {
        return Err(io::Error::new(io::ErrorKind::IsADirectory, "a folder stands there"));
    }
    let mut builder = tempfile::Builder::new();
    builder.prefix(".part-");
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let mut file = builder.tempfile_in(folder)?;
    file.write_all(bytes)?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|e| e.error)?;
    Ok(())
}

/// The folder a path lies in; `.` for a bare name.
fn folder_of(path: &Path) -> PathBuf {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
        _ => PathBuf::from("."),
    }
}
