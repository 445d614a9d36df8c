//! What can be wrong with a case file, and where.

use crate::base::units::UnitError;
use std::fmt;
use std::io;
use std::ops::Range;
use std::path::PathBuf;

/// Why a case could not be loaded.
#[derive(Debug, thiserror::Error)]
pub enum CaseError {
    /// The case file could not be read.
    #[error("{}: {source}; give the path of a case file (TOML)", .path.display())]
    Unread {
        /// The path as given.
        path: PathBuf,
        /// Why.
        source: io::Error,
    },
    /// Shape files that could not be read, all of them.
    #[error("{}", told_shapes(.0))]
    UnreadShapes(Vec<UnreadShape>),
    /// The file was read and is no valid case: all problems found, in file order.
    #[error("{}", told_problems(.path, .problems))]
    Invalid {
        /// The path as given.
        path: PathBuf,
        /// Each problem with its place.
        problems: Vec<Problem>,
    },
}

impl CaseError {
    /// Whether a file could not be read, rather than what it says being wrong.
    pub fn is_unread(&self) -> bool {
        !matches!(self, CaseError::Invalid { .. })
    }
}

/// A shape file that could not be read.
#[derive(Debug)]
pub struct UnreadShape {
    /// The path that was tried.
    pub path: PathBuf,
    /// Why it failed.
    pub source: io::Error,
}

/// One thing wrong, with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Problem {
    /// Line, counted from 1.
    pub line: usize,
    /// Column in characters, counted from 1.
    pub column: usize,
    /// Characters to underline.
    pub width: usize,
    /// The text of the line (its part around the column, where it is long).
    pub source: String,
    /// Column of the place within `source`, counted from 0.
    pub offset: usize,
    /// What is wrong.
    pub fault: Fault,
}

/// What is wrong.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum Fault {
    /// Not UTF-8.
    #[error("this is not UTF-8 text{hint}; save the case as UTF-8")]
    NotText {
        /// What it looks like.
        hint: &'static str,
    },
    /// Not TOML.
    #[error("{message}")]
    Syntax {
        /// Message of the TOML reader.
        message: String,
    },
    /// A word no version knows.
    #[error("unknown word `{}` in {table}; {}", cut(.word), offer(.nearest.as_deref(), .known))]
    UnknownWord {
        /// As written.
        word: String,
        /// The table it stands in.
        table: &'static str,
        /// The known word most like it.
        nearest: Option<&'static str>,
        /// The known words.
        known: Vec<&'static str>,
    },
    /// A word of a later version.
    #[error(
        "`{word}` in {table} is planned but not available in this version; remove it, nothing stands in for it"
    )]
    Planned {
        /// As written.
        word: String,
        /// The table it stands in.
        table: &'static str,
    },
    /// A value of the wrong form.
    #[error("`{word}` takes {wanted}")]
    Form {
        /// The word.
        word: String,
        /// What is accepted.
        wanted: &'static str,
    },
    /// A number or text that makes no sense.
    #[error("`{word}` cannot be {}; it takes {wanted}", cut(.found))]
    Range {
        /// The word.
        word: String,
        /// As written.
        found: String,
        /// What is accepted.
        wanted: &'static str,
    },
    /// A compulsory word is not there.
    #[error("{table} has no `{word}`; it takes {wanted}")]
    Missing {
        /// The word.
        word: &'static str,
        /// Where it belongs.
        table: String,
        /// What is accepted.
        wanted: &'static str,
    },
    /// A quantity that cannot be read.
    #[error("`{word}`: {error}")]
    Quantity {
        /// The word.
        word: String,
        /// Why.
        error: UnitError,
    },
    /// A quantity written as a bare number.
    #[error(
        "`{word}` needs its unit in the value: write it as a text such as \"{example}\"; bare numbers stand only for coordinates, counts and factors"
    )]
    BareNumber {
        /// The word.
        word: String,
        /// What would be accepted.
        example: &'static str,
    },
    /// Not one of the words that can stand there.
    #[error("`{word}` cannot be `{}`; {}", cut(.found), offer(.nearest.as_deref(), .accepted))]
    Choice {
        /// The word.
        word: String,
        /// As written.
        found: String,
        /// The accepted word most like it.
        nearest: Option<&'static str>,
        /// The accepted words.
        accepted: Vec<&'static str>,
    },
    /// `role = "grounded"`.
    #[error("`{word}` cannot be `grounded`: use `earthed`")]
    Grounded {
        /// The word.
        word: String,
    },
    /// A field limit without its word.
    #[error("`field_limit` must end in `peak`, `rms` or `dc`, as in \"2.6 kV/mm peak\"")]
    LimitWord,
    /// A name that means the 0 V reference.
    #[error("`{}` cannot name {what}: `0`, `gnd` and `earth` stand for the 0 V reference", cut(.name))]
    Reserved {
        /// As written.
        name: String,
        /// What was to be named.
        what: &'static str,
    },
    /// The same name twice.
    #[error("the {what} `{}` is there twice; give each its own name", cut(.name))]
    Twice {
        /// What has the name.
        what: &'static str,
        /// As written.
        name: String,
    },
    /// A name that no electrode has.
    #[error("`{word}`: no electrode is called `{}`; {}", cut(.name), offer(.nearest.as_deref(), .known))]
    NoElectrode {
        /// The word it stands behind.
        word: String,
        /// As written.
        name: String,
        /// The name most like it.
        nearest: Option<String>,
        /// The names there are.
        known: Vec<String>,
    },
    /// Live electrodes for which a case says nothing.
    #[error(
        "voltage case `{}` gives no potential or charge for the live electrode{} {}; add {} to `potentials` or `charges`, or give another `role`",
        cut(.case), if .electrodes.len() == 1 { "" } else { "s" }, quoted(.electrodes), if .electrodes.len() == 1 { "it" } else { "them" }
    )]
    LiveWithout {
        /// The voltage case.
        case: String,
        /// All of them.
        electrodes: Vec<String>,
    },
    /// Both a potential and a charge.
    #[error("voltage case `{}` gives both a potential and a charge for {}; give one of them, the other follows", cut(.case), quoted(.electrodes))]
    Both {
        /// The voltage case.
        case: String,
        /// The electrode, or the bonded ones.
        electrodes: Vec<String>,
    },
    /// Bonded electrodes at different potentials.
    #[error("voltage case `{}` gives different potentials for {}, which are bonded; give one of them a potential", cut(.case), quoted(.electrodes))]
    BondSplit {
        /// The voltage case.
        case: String,
        /// The bonded electrodes.
        electrodes: Vec<String>,
    },
    /// A value for something bonded with earth.
    #[error("voltage case `{}` gives a value for `{}`, which is bonded with earth and so at 0 V; leave it out", cut(.case), cut(.electrode))]
    BondEarth {
        /// The voltage case.
        case: String,
        /// The electrode.
        electrode: String,
    },
    /// The joined name of a bond is taken.
    #[error("bonded electrodes that touch make one row, here named `{}`, but an electrode has that name; rename it", cut(.name))]
    BondName {
        /// The joined name.
        name: String,
    },
    /// Guards that follow each other.
    #[error("the guards follow each other in a ring: {}; let one follow an electrode with a state of its own, or `earth`", .chain.join(" → "))]
    Ring {
        /// The names, first one again at the end.
        chain: Vec<String>,
    },
    /// `follows` without `role = "guard"`.
    #[error("`follows` belongs to `role = \"guard\"` only; remove it or change the role")]
    FollowsWithoutGuard,
    /// None or several of words of which one is wanted.
    #[error("{table} takes exactly one of {wanted}; it has {found}")]
    ExactlyOne {
        /// Where.
        table: String,
        /// The words.
        wanted: &'static str,
        /// How many are there.
        found: usize,
    },
    /// A second earth plane.
    #[error(
        "only one [[earth_plane]] is available in this version (up to three at right angles are planned); remove this one"
    )]
    SecondPlane,
    /// Two outputs, or an output and an input, at one path.
    #[error("`{word}` would be written to {}, which is also {other}; give it another name", .path.display())]
    SamePath {
        /// The word.
        word: &'static str,
        /// The path.
        path: PathBuf,
        /// What else is there.
        other: &'static str,
    },
}

/// Faults and defaults met while resolving.
#[derive(Debug, Default)]
pub(super) struct Sink {
    faults: Vec<(Range<usize>, Fault)>,
    /// Each default used, as `key = value`.
    pub(super) defaults: Vec<String>,
}

impl Sink {
    /// Notes a fault at bytes of the text.
    pub(super) fn note(&mut self, span: Range<usize>, fault: Fault) {
        self.faults.push((span, fault));
    }

    /// Notes that a default was used.
    pub(super) fn assume(&mut self, key: &str, value: &str) {
        self.defaults.push(format!("{key} = {value}"));
    }

    /// Whether nothing is wrong so far.
    pub(super) fn is_clean(&self) -> bool {
        self.faults.is_empty()
    }

    /// The faults with their places in `text`, in file order.
    pub(super) fn problems(mut self, text: &str) -> Vec<Problem> {
        self.faults.sort_by_key(|(span, _)| span.start);
        self.faults.into_iter().map(|(span, fault)| placed(text, &span, fault)).collect()
    }
}

/// Characters of a source line that are shown.
const SHOWN_WIDTH: usize = 100;

/// A fault with the line and column of its bytes.
fn placed(text: &str, span: &Range<usize>, fault: Fault) -> Problem {
    let mut start = span.start.min(text.len());
    while !text.is_char_boundary(start) {
        start -= 1;
    }
    let line_start = text[..start].rfind('\n').map_or(0, |at| at + 1);
    let line_end = text[start..].find('\n').map_or(text.len(), |at| start + at);
    let line = text[line_start..line_end].trim_end_matches('\r');
    let column = text[line_start..start].chars().count();
    let end = span.end.clamp(start, line_start + line.len().max(start - line_start));
    let width = text.get(start..end).map_or(1, |part| part.chars().count()).max(1);
    let first = column.saturating_sub(SHOWN_WIDTH / 2);
    let source = line.chars().skip(first).take(SHOWN_WIDTH).map(|c| if c.is_control() { ' ' } else { c });
    let source: String = source.collect();
    let width = width.min(source.chars().count().saturating_sub(column - first).max(1));
    Problem {
        line: text[..start].matches('\n').count() + 1,
        column: column + 1,
        width,
        source,
        offset: column - first,
        fault,
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let margin = " ".repeat(self.line.to_string().len());
        writeln!(f, "line {}, column {}", self.line, self.column)?;
        writeln!(f, "{margin} |")?;
        writeln!(f, "{} | {}", self.line, self.source)?;
        writeln!(f, "{margin} | {}{}", " ".repeat(self.offset), "^".repeat(self.width))?;
        write!(f, "{}", self.fault)
    }
}

/// Problems told in one message; the rest is counted.
const TOLD: usize = 30;

fn told_problems(path: &std::path::Path, problems: &[Problem]) -> String {
    let mut text = match problems {
        [_] => format!("{}:", path.display()),
        _ => format!("{}: {} problems", path.display(), problems.len()),
    };
    for problem in problems.iter().take(TOLD) {
        text.push_str(&format!("\n{problem}\n"));
    }
    if TOLD < problems.len() {
        text.push_str(&format!("\nand {} more\n", problems.len() - TOLD));
    }
    text.truncate(text.trim_end().len());
    text
}

fn told_shapes(shapes: &[UnreadShape]) -> String {
    let lines: Vec<String> =
        shapes.iter().map(|shape| format!("{}: {}", shape.path.display(), shape.source)).collect();
    format!("{}; paths of shapes are relative to the case file", lines.join("\n"))
}

/// Characters of a word of the file that a message repeats.
const CUT: usize = 60;

/// `text` short enough for a message, on one line.
fn cut(text: &str) -> String {
    let mut short: String = text.chars().take(CUT).map(|c| if c.is_control() { ' ' } else { c }).collect();
    if text.chars().nth(CUT).is_some() {
        short.push('…');
    }
    short
}

/// What would be accepted: the nearest word first.
fn offer<T: AsRef<str>>(nearest: Option<&str>, known: &[T]) -> String {
    let known = quoted(known);
    match nearest {
        Some(word) => format!("did you mean `{}`? Accepted are {known}", cut(word)),
        None if known.is_empty() => "there are none".to_owned(),
        None => format!("accepted are {known}"),
    }
}

/// Words that one message lists.
const LISTED: usize = 40;

fn quoted<T: AsRef<str>>(words: &[T]) -> String {
    let mut quoted: Vec<String> =
        words.iter().take(LISTED).map(|word| format!("`{}`", cut(word.as_ref()))).collect();
    if LISTED < words.len() {
        quoted.push(format!("and {} more", words.len() - LISTED));
    }
    quoted.join(", ")
}
