//! What can be wrong with an STL file.

use std::io;

/// Why an STL file was refused; each says where and what would be accepted.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[expect(missing_docs, reason = "the message beside each variant says what its fields are")]
pub enum StlError {
    /// No bytes at all.
    #[error("{file}: the file is empty; an STL file with at least one facet is wanted")]
    Empty { file: String },
    /// A file of the right form without facets.
    #[error("{file}: no facets; an STL file with at least one facet is wanted")]
    NoFacets { file: String },
    /// More facets than are read.
    #[error("{file}: {facets} facets; at most {limit} are read from one file")]
    TooManyFacets { file: String, facets: usize, limit: usize },
    /// Another well-known kind of file.
    #[error("{file}: byte 0: this is {what}; binary or ASCII STL is wanted")]
    Foreign { file: String, what: &'static str },
    /// Text of two bytes a character.
    #[error("{file}: byte 0: text in UTF-16; save it as plain ASCII or UTF-8 STL, or as binary STL")]
    Utf16 { file: String },
    /// Text that does not begin with `solid`.
    #[error("{file}: line 1: begins with `{begins}`; ASCII STL begins with `solid`")]
    NotStl { file: String, begins: String },
    /// Neither text nor long enough for a binary head.
    #[error(
        "{file}: byte {length}: the file ends there; binary STL has a head of 84 bytes and 50 bytes a facet, \
         ASCII STL begins with `solid`"
    )]
    TooShort { file: String, length: usize },
    /// The count makes sense in the other byte order.
    #[error(
        "{file}: byte 80: the count is big-endian ({facets} facets); binary STL is little-endian, export it so"
    )]
    BigEndian { file: String, facets: usize },
    /// Fewer facets than the count says.
    #[error(
        "{file}: byte {length}: the file ends there with {held} whole facets of the {counted} counted at byte \
         80; a whole file is wanted (84 + 50 bytes a facet)"
    )]
    Truncated { file: String, counted: usize, held: usize, length: usize },
    /// More facets than the count says.
    #[error(
        "{file}: byte 80: the count says {counted} facets but the length of {length} bytes has room for {held}; \
         part of the body may be lost: the count must match (84 + 50 bytes a facet)"
    )]
    CountTooSmall { file: String, counted: usize, held: usize, length: usize },
    /// Infinite or not a number, in a binary file.
    #[error("{file}: byte {offset}: {value} as a coordinate of facet {facet}; finite numbers are wanted")]
    NotFinite { file: String, offset: usize, facet: usize, value: f32 },
    /// Beyond any length, in a binary file.
    #[error(
        "{file}: byte {offset}: {value:e} as a coordinate of facet {facet}; at most 1e15 in magnitude is taken \
         for a length"
    )]
    Absurd { file: String, offset: usize, facet: usize, value: f32 },
    /// A line longer than any of STL.
    #[error("{file}: line {line}: longer than {limit} bytes; ASCII STL has one statement a line")]
    LineTooLong { file: String, line: usize, limit: usize },
    /// A word in the wrong place.
    #[error("{file}: line {line}: `{token}` where {expected} is wanted")]
    Unexpected { file: String, line: usize, token: String, expected: &'static str },
    /// A line that ends too early.
    #[error("{file}: line {line}: the line ends where {expected} is wanted")]
    LineEnds { file: String, line: usize, expected: &'static str },
    /// Text that ends inside a facet or a word.
    #[error("{file}: line {line}: the file ends where {expected} is wanted; a whole file is wanted")]
    EndsEarly { file: String, line: usize, expected: &'static str },
    /// A fourth corner.
    #[error("{file}: line {line}: a facet with more than three corners; triangles are wanted")]
    TooManyCorners { file: String, line: usize },
    /// A comma in a number.
    #[error(
        "{file}: line {line}: a comma in `{token}`; numbers need a decimal point, such as 1.5, and blanks between them"
    )]
    DecimalComma { file: String, line: usize, token: String },
    /// A Fortran exponent.
    #[error("{file}: line {line}: exponent with D in `{token}`; write E, such as 1.5E-3")]
    FortranExponent { file: String, line: usize, token: String },
    /// Not a number at all.
    #[error("{file}: line {line}: `{token}` is not a number; such as 1.5 or 1.5e-3 is wanted")]
    BadNumber { file: String, line: usize, token: String },
    /// Infinite, not a number, or beyond single precision.
    #[error("{file}: line {line}: `{token}` as a coordinate; finite numbers in single precision are wanted")]
    NotFiniteText { file: String, line: usize, token: String },
    /// Beyond any length.
    #[error(
        "{file}: line {line}: `{token}` as a coordinate; at most 1e15 in magnitude is taken for a length"
    )]
    AbsurdText { file: String, line: usize, token: String },
    /// The reader refused what the gate had let through.
    #[error(
        "{file}: the STL reader refused a solid that had passed all checks ({kind}); save the file again as binary STL"
    )]
    Reader { file: String, kind: io::ErrorKind },
    /// The reader found another number of facets than the gate.
    #[error("{file}: {read} facets read of {expected} counted; save the file again as binary STL")]
    Disagreement { file: String, expected: usize, read: usize },
}

/// The first 40 characters of some bytes, fit for a message.
pub(in crate::mesh) fn excerpt(bytes: &[u8]) -> String {
    let line = bytes.split(|&b| b == b'\n' || b == b'\r').next().unwrap_or_default();
    let short = &line[..line.len().min(40)];
    let text: String = short.iter().map(|&b| char::from(b)).flat_map(char::escape_default).collect();
    if short.len() < line.len() { text + "…" } else { text }
}
