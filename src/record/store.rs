//! `record.json`: written exactly, read back with every complaint placed.

use crate::record::Matrix;
use crate::record::Record;
use crate::record::SCHEMA;
use crate::record::agree::contradiction;
use serde::Deserialize;
use std::collections::BTreeMap;
use std::fs::File;
use std::io;
use std::io::Read;
use std::io::Write;
use std::path::Path;
use std::path::PathBuf;

/// Longest record read [B]: a record of three electrodes, two voltage cases and a look takes 10 kB and
/// a look point 200 B, so this is room for a million look points, and a wrong file cannot take the
/// memory.
const MAX_BYTES: u64 = 256 << 20;

/// Why a record was not written or read.
#[derive(Debug, thiserror::Error)]
pub enum RecordError {
    /// The file could not be opened or read.
    #[error("{}: cannot be read: {source}; give the path of a `record.json`", .path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// The writer failed.
    #[error("the record cannot be written: {0}")]
    Write(#[from] io::Error),
    /// The file is longer than a record can be.
    #[error("{}: longer than {MAX_BYTES} bytes; a `record.json` is accepted", .path.display())]
    TooLong {
        /// The file.
        path: PathBuf,
    },
    /// The text is no JSON, or a key is missing or of the wrong kind.
    #[error("{}: line {line}, at `{key}`: {problem}; a `record.json` of schema {SCHEMA} is accepted", .path.display())]
    Layout {
        /// The file.
        path: PathBuf,
        /// Line, counted from 1.
        line: usize,
        /// The key the reader stood at; empty at the top.
        key: String,
        /// What was found and expected.
        problem: String,
    },
    /// The schema number is another one.
    #[error("{}: line {line}, at `schema`: schema {found}; schema {SCHEMA} is accepted", .path.display())]
    Schema {
        /// The file.
        path: PathBuf,
        /// Line of the key.
        line: usize,
        /// The number or text found.
        found: String,
    },
    /// A matrix or list does not fit the number of rows.
    #[error("{}: line {line}, at `{key}`: does not fit the {expected} electrodes of the record", .path.display())]
    Size {
        /// The file.
        path: PathBuf,
        /// Line of the key.
        line: usize,
        /// The key.
        key: String,
        /// Number of electrodes.
        expected: usize,
    },
    /// Two keys of the record contradict each other: it was changed after it was written.
    #[error(
        "{}: line {line}, at `{key}`: {problem}; a `record.json` as it was written is accepted, solve the case again",
        .path.display()
    )]
    Contradiction {
        /// The file.
        path: PathBuf,
        /// Line of the key.
        line: usize,
        /// The key.
        key: String,
        /// What contradicts what.
        problem: String,
    },
    /// A record to be written has a matrix or list that does not fit the number of rows.
    #[error("the record does not fit its {expected} electrodes, at `{key}`; nothing was written")]
    Misfit {
        /// The key.
        key: &'static str,
        /// Number of electrodes.
        expected: usize,
    },
    /// A number to be written is infinite or not a number.
    #[error("the record holds a number that is not finite, at `{key}`; nothing was written")]
    NotFinite {
        /// The key.
        key: String,
    },
}

/// Writes the record as JSON, numbers with the digits that read back to the same double.
///
/// The text is read back before it is written, so what stands in the file is what was meant.
///
/// # Errors
/// [`RecordError::NotFinite`] for a number that JSON cannot hold, [`RecordError::Misfit`] for lists
/// that [`read`] would refuse, [`RecordError::Write`] of `out`.
pub fn write(record: &Record, out: &mut dyn Write) -> Result<(), RecordError> {
    if let Some(key) = misfit(record) {
        return Err(RecordError::Misfit { key, expected: record.electrodes.len() });
    }
    let mut text = serde_json::to_string_pretty(record)
        .map_err(|e| RecordError::NotFinite { key: format!("a key that is not text ({e})") })?;
    // JSON has no word for such numbers and `null` is written instead: it fails to read back, or,
    // where `null` has a meaning, differs.
    match serde_json::from_str::<Record>(&text) {
        Err(e) => return Err(RecordError::NotFinite { key: key_at(&text, e.line(), e.column()) }),
        Ok(back) if back != *record => return Err(RecordError::NotFinite { key: lost_maximum(record) }),
        Ok(_) => text.push('\n'),
    }
    out.write_all(text.as_bytes())?;
    Ok(())
}

/// Reads a record; keys it does not know are passed over.
///
/// # Errors
/// [`RecordError`], with file, line and key, and what would be accepted.
pub fn read(path: &Path) -> Result<Record, RecordError> {
    let read_error = |source| RecordError::Read { path: path.to_owned(), source };
    let mut bytes = Vec::new();
    let file = File::open(path).map_err(read_error)?;
    file.take(MAX_BYTES + 1).read_to_end(&mut bytes).map_err(read_error)?;
    if MAX_BYTES < bytes.len() as u64 {
        return Err(RecordError::TooLong { path: path.to_owned() });
    }
    let text = String::from_utf8(bytes).map_err(|e| {
        let before = &e.as_bytes()[..e.utf8_error().valid_up_to()];
        RecordError::Layout {
            path: path.to_owned(),
            line: 1 + before.iter().filter(|b| **b == b'\n').count(),
            key: String::new(),
            problem: "not UTF-8 text".to_owned(),
        }
    })?;
    parse(&text, path)
}

/// The schema number alone, so that another number is named before anything else is complained of.
#[derive(Deserialize)]
struct Head {
    schema: Option<serde_json::Value>,
}

fn parse(text: &str, path: &Path) -> Result<Record, RecordError> {
    let layout = |e: &serde_json::Error| RecordError::Layout {
        path: path.to_owned(),
        line: e.line(),
        key: key_at(text, e.line(), e.column()),
        problem: bare(e),
    };
    let head: Head = serde_json::from_str(text).map_err(|e| layout(&e))?;
    match head.schema {
        Some(found) if found != serde_json::json!(SCHEMA) => {
            let (line, mut found) = (line_of(text, "schema"), found.to_string());
            found.truncate(found.char_indices().nth(40).map_or(found.len(), |(at, _)| at));
            return Err(RecordError::Schema { path: path.to_owned(), line, found });
        }
        _ => {}
    }
    let record: Record = serde_json::from_str(text).map_err(|e| layout(&e))?;
    if let Some(key) = misfit(&record) {
        return Err(RecordError::Size {
            path: path.to_owned(),
            line: line_of(text, key),
            key: key.to_owned(),
            expected: record.electrodes.len(),
        });
    }
    match contradiction(&record) {
        None => Ok(record),
        Some((key, problem)) => Err(RecordError::Contradiction {
            path: path.to_owned(),
            line: line_of(text, key),
            key: key.to_owned(),
            problem,
        }),
    }
}

/// The first key whose size does not fit the number of rows.
///
/// Held here once, so that nobody who prints a record can run over the end of a list.
pub fn misfit(record: &Record) -> Option<&'static str> {
    let n = record.electrodes.len();
    let square = |m: &Matrix| m.len() == n && m.iter().all(|row| row.len() == n);
    let by_row = |map: &BTreeMap<String, f64>| {
        map.len() == n && record.electrodes.iter().all(|name| map.contains_key(name))
    };
    let cases = |fits: &dyn Fn(&crate::record::VoltageCase) -> bool| record.voltage_cases.iter().all(fits);
    let looks_fit = record.looks.iter().all(|look| {
        let points = look.points_metre.len();
        look.medium.len() == points
            && look.potential_volt.values().all(|v| v.len() == points)
            && look.field_v_per_m.values().all(|v| v.len() == points)
    });
    [
        ("rows", record.rows.len() == n),
        ("capacitance_farad", square(&record.capacitance_farad)),
        ("capacitance_bar_farad", square(&record.capacitance_bar_farad)),
        ("mutual_farad", square(&record.mutual_farad)),
        ("mutual_bar_farad", square(&record.mutual_bar_farad)),
        ("earth_farad", record.earth_farad.len() == n),
        ("earth_bar_farad", record.earth_bar_farad.len() == n),
        ("earth_share", record.earth_share.len() == n),
        ("potential_coefficients_per_farad", square(&record.potential_coefficients_per_farad)),
        ("potential_coefficients_bar_per_farad", square(&record.potential_coefficients_bar_per_farad)),
        ("looks", looks_fit),
        ("potentials_volt", cases(&|case| by_row(&case.potentials_volt))),
        ("potentials_bar_volt", cases(&|case| by_row(&case.potentials_bar_volt))),
        ("charges_coulomb", cases(&|case| by_row(&case.charges_coulomb))),
        ("charges_bar_coulomb", cases(&|case| by_row(&case.charges_bar_coulomb))),
    ]
    .into_iter()
    .find(|(_, fits)| !fits)
    .map(|(key, _)| key)
}

/// Which maximum holds a number that `null` would hide.
fn lost_maximum(record: &Record) -> String {
    let lost = |value: Option<f64>| value.is_some_and(|v| !v.is_finite());
    for (i, case) in record.voltage_cases.iter().enumerate() {
        for (j, m) in case.maxima.iter().enumerate() {
            let fields = [
                ("field_v_per_m", lost(m.field_v_per_m)),
                ("bar_v_per_m", lost(m.bar_v_per_m)),
                ("smooth_v_per_m", lost(m.smooth_v_per_m)),
                ("limit_v_per_m", lost(m.limit_v_per_m)),
                ("margin", lost(m.margin)),
            ];
            if let Some((key, _)) = fields.iter().find(|(_, lost)| *lost) {
                return format!("voltage_cases[{i}].maxima[{j}].{key}");
            }
        }
    }
    "findings or voltage_cases".to_owned()
}

/// The reader's complaint without its own "at line … column …".
fn bare(e: &serde_json::Error) -> String {
    let text = e.to_string();
    text.rfind(" at line ").map_or(text.clone(), |at| text[..at].to_owned())
}

/// Line of the first mention of a key, 1 if there is none.
fn line_of(text: &str, key: &str) -> usize {
    let quoted = format!("\"{key}\"");
    text.find(&quoted).map_or(1, |at| 1 + text[..at].matches('\n').count())
}

/// One open bracket on the way to a place in JSON text.
enum Open {
    /// An object and the key last read in it.
    Object(String),
    /// An array and the index of the current item.
    Array(usize),
}

/// The path of keys at a line and column (in bytes) of JSON text, such as `shapes[0].path`.
fn key_at(text: &str, line: usize, column: usize) -> String {
    let start: usize = text.split_inclusive('\n').take(line.saturating_sub(1)).map(str::len).sum();
    let bytes = &text.as_bytes()[..(start + column).min(text.len())];
    let (mut open, mut at): (Vec<Open>, usize) = (Vec::new(), 0);
    while at < bytes.len() {
        match bytes[at] {
            b'"' => {
                let end = string_end(bytes, at + 1);
                if let (Some(Open::Object(key)), true) = (open.last_mut(), followed_by_colon(bytes, end)) {
                    *key = String::from_utf8_lossy(&bytes[at + 1..end]).into_owned();
                }
                at = end;
            }
            b'{' => open.push(Open::Object(String::new())),
            b'[' => open.push(Open::Array(0)),
            // What follows closes is the place just behind it: an object that lacks a key is named.
            b'}' | b']' if at + 1 < bytes.len() => drop(open.pop()),
            b',' => {
                if let Some(Open::Array(index)) = open.last_mut() {
                    *index += 1;
                }
            }
            _ => {}
        }
        at += 1;
    }
    let mut path = String::new();
    for level in &open {
        match level {
            Open::Object(key) if path.is_empty() => path.push_str(key),
            Open::Object(key) if key.is_empty() => {}
            Open::Object(key) => path.push_str(&format!(".{key}")),
            Open::Array(index) => path.push_str(&format!("[{index}]")),
        }
    }
    path
}

/// Index of the quote that ends the string starting at `at`, or the length.
fn string_end(bytes: &[u8], mut at: usize) -> usize {
    while at < bytes.len() && bytes[at] != b'"' {
        at += if bytes[at] == b'\\' { 2 } else { 1 };
    }
    at.min(bytes.len())
}

fn followed_by_colon(bytes: &[u8], quote: usize) -> bool {
    bytes.iter().skip(quote + 1).find(|b| !b.is_ascii_whitespace()) == Some(&b':')
}
