//! Reads the case file and its shapes.

use crate::case::Case;
use crate::case::ShapeFile;
use crate::case::Shapes;
use crate::case::fault::CaseError;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::fault::UnreadShape;
use crate::case::resolve;
use crate::case::wire;
use crate::case::words;
use std::fs::File;
use std::io;
use std::io::Read;
use std::path::Path;
use std::path::PathBuf;
use toml::de::DeTable;

/// Longest case file [B]: 10,000 electrodes with every word given take 5 MB.
const LONGEST_CASE: u64 = 16 << 20;

/// Longest shape file [B]: 20 million facets, far more than any solver here takes.
const LONGEST_SHAPE: u64 = 1 << 30;

/// The case of a file in SI, and the bytes of its shapes, each file read once.
///
/// # Errors
/// [`CaseError`]: the file, or shapes it names, cannot be read, or what it says makes no sense; all
/// problems found are in the error.
pub fn load(path: &Path) -> Result<(Case, Shapes), CaseError> {
    let unread = |source| CaseError::Unread { path: path.to_owned(), source };
    let bytes = read(path, LONGEST_CASE).map_err(unread)?;
    let text = match String::from_utf8(bytes) {
        Ok(text) => text,
        Err(error) => return Err(not_text(path, &error)),
    };
    let case = parse(&text, path)?;
    let base = path.parent().unwrap_or(Path::new(""));
    let shapes = read_shapes(&case.shape_paths, base)?;
    Ok((case, shapes))
}

/// The case of a text in SI; `path` is where it stands, for messages and relative paths.
///
/// # Errors
/// [`CaseError::Invalid`] with all problems found.
pub fn parse(text: &str, path: &Path) -> Result<Case, CaseError> {
    let body = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut sink = Sink::default();
    let case = parse_body(body, text, path, &mut sink);
    match case {
        Some(case) if sink.is_clean() => Ok(case),
        _ => Err(CaseError::Invalid { path: path.to_owned(), problems: sink.problems(body) }),
    }
}

fn parse_body(body: &str, text: &str, path: &Path, sink: &mut Sink) -> Option<Case> {
    let (mut table, errors) = DeTable::parse_recoverable(body);
    for error in &errors {
        note_syntax(error, sink);
    }
    if !errors.is_empty() {
        return None;
    }
    words::prune(table.get_mut(), &words::FILE, sink);
    match wire::parse(table) {
        Ok(file) => Some(resolve::resolve(&file, text, path, sink)),
        Err(error) => {
            note_syntax(&error, sink);
            None
        }
    }
}

fn note_syntax(error: &toml::de::Error, sink: &mut Sink) {
    let message = error.message().to_owned();
    sink.note(error.span().unwrap_or(0..0), Fault::Syntax { message });
}

/// The bytes of shape files, paths relative to `base`.
///
/// # Errors
/// [`CaseError::UnreadShapes`] with every file that cannot be read.
pub fn read_shapes(paths: &[String], base: &Path) -> Result<Shapes, CaseError> {
    let (mut files, mut unread) = (Vec::new(), Vec::new());
    for path in paths {
        let place: PathBuf = resolve::plain(&base.join(path));
        match read(&place, LONGEST_SHAPE) {
            Ok(bytes) => files.push(ShapeFile { path: path.clone(), bytes }),
            Err(source) => unread.push(UnreadShape { path: place, source }),
        }
    }
    if unread.is_empty() { Ok(Shapes { files }) } else { Err(CaseError::UnreadShapes(unread)) }
}

/// The bytes of a file of at most `longest` bytes.
fn read(path: &Path, longest: u64) -> io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    File::open(path)?.take(longest + 1).read_to_end(&mut bytes)?;
    // A file that fills the allowance has at least one byte more than is accepted.
    if bytes.len() as u64 == longest + 1 {
        let text = format!("the file is longer than {longest} bytes");
        return Err(io::Error::new(io::ErrorKind::FileTooLarge, text));
    }
    Ok(bytes)
}

fn not_text(path: &Path, error: &std::string::FromUtf8Error) -> CaseError {
    let bytes = error.as_bytes();
    let at = error.utf8_error().valid_up_to();
    let hint = match bytes {
        [0xff, 0xfe, ..] | [0xfe, 0xff, ..] => " but looks like UTF-16",
        _ => "",
    };
    let mut sink = Sink::default();
    sink.note(at..at + 1, Fault::NotText { hint });
    CaseError::Invalid { path: path.to_owned(), problems: sink.problems(&String::from_utf8_lossy(bytes)) }
}
