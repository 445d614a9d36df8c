//! All files of a study, the record last.

use crate::record::FileHash;
use crate::record::Record;
use crate::record::SurfaceTable;
use crate::record::sha256;
use crate::record::store;
use crate::report::Printing;
use crate::report::ReportError;
use crate::report::answers;
use crate::report::csv;
use crate::report::file;
use crate::report::netlist;
use crate::report::vtu;
use std::io;
use std::path::Path;
use std::path::PathBuf;

/// Where the files of a study go.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Targets {
    /// The record.
    pub record: PathBuf,
    /// The surface file, beside the record.
    pub surface: PathBuf,
    /// The answer sheet.
    pub answers: Option<PathBuf>,
    /// The matrices: square at this path, long form beside it with `_long` before the ending.
    pub matrix: Option<PathBuf>,
    /// The subcircuit.
    pub netlist: Option<PathBuf>,
}

impl Targets {
    /// Every file that [`deliver`] writes, the long form of the matrices among them.
    pub fn paths(&self) -> Vec<PathBuf> {
        let long = self.matrix.as_deref().map(long_name);
        let optional = [self.answers.clone(), self.matrix.clone(), long, self.netlist.clone()];
        [self.record.clone(), self.surface.clone()]
            .into_iter()
            .chain(optional.into_iter().flatten())
            .collect()
    }
}

/// Writes every file asked for and says which, in the order written.
///
/// The surface file is hashed into `record.surface_file`.  All texts are made before the first file
/// is written, so a record that cannot be stored leaves nothing behind; the record is written last,
/// so a record always stands beside the files it names.
///
/// # Errors
/// [`ReportError`], with the path; files written before it stay, each of them whole.
pub fn deliver(
    record: &mut Record,
    surface: &SurfaceTable,
    targets: &Targets,
    printing: &Printing,
) -> Result<Vec<PathBuf>, ReportError> {
    distinct(targets)?;
    let mut files = vec![(targets.surface.clone(), surface_bytes(surface, &targets.surface)?)];
    record.surface_file = FileHash { path: bare_name(&targets.surface), sha256: sha256(&files[0].1) };
    if let Some(path) = &targets.answers {
        files.push((path.clone(), answers::sheet(record, printing).into_bytes()));
    }
    if let Some(path) = &targets.matrix {
        files.push((path.clone(), in_memory(path, |out| csv::square(record, csv::Form::Maxwell, out))?));
        let long = long_name(path);
        files.push((long.clone(), in_memory(&long, |out| csv::long(record, out))?));
    }
    if let Some(path) = &targets.netlist {
        let options = netlist::Options { name: netlist::subcircuit_name(record, &stem(path)), bleeds: true };
        files.push((path.clone(), in_memory(path, |out| netlist::write(record, &options, out))?));
    }
    let mut bytes = Vec::new();
    store::write(record, &mut bytes)
        .map_err(|source| ReportError::Record { path: targets.record.clone(), source })?;
    files.push((targets.record.clone(), bytes));
    for (path, bytes) in &files {
        file::write_whole(path, bytes)?;
    }
    Ok(files.into_iter().map(|(path, _)| path).collect())
}

/// Path of the long form of the matrices: `_long` before the ending.
pub fn long_name(square: &Path) -> PathBuf {
    let mut name = stem(square) + "_long";
    if let Some(ending) = square.extension() {
        name = format!("{name}.{}", ending.to_string_lossy());
    }
    square.with_file_name(name)
}

fn surface_bytes(surface: &SurfaceTable, path: &Path) -> Result<Vec<u8>, ReportError> {
    vtu::check(surface).map_err(|problem| ReportError::Table { path: path.to_owned(), problem })?;
    in_memory(path, |out| vtu::write(surface, out))
}

fn in_memory(
    path: &Path,
    write: impl FnOnce(&mut dyn io::Write) -> io::Result<()>,
) -> Result<Vec<u8>, ReportError> {
    let mut bytes = Vec::new();
    write(&mut bytes).map_err(|source| ReportError::Write { path: path.to_owned(), source })?;
    Ok(bytes)
}

/// Refuses two outputs under one name: the second would silently replace the first.
fn distinct(targets: &Targets) -> Result<(), ReportError> {
    let names = targets.paths();
    for (i, path) in names.iter().enumerate() {
        if names[..i].contains(path) {
            return Err(ReportError::SameName { path: path.clone() });
        }
    }
    Ok(())
}

fn bare_name(path: &Path) -> String {
    path.file_name().map_or(String::new(), |name| name.to_string_lossy().into_owned())
}

fn stem(path: &Path) -> String {
    path.file_stem().map_or(String::new(), |name| name.to_string_lossy().into_owned())
}
