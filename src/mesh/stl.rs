//! STL bytes to facets: the gate that decides the format, and binary files.
//!
//! The size law decides: a file of 84 + 50·n bytes with n at byte 80 is binary, whatever its
//! header says.  The gate checks everything that `stl_io` takes silently or answers without a
//! place, and hands it one clean solid at a time.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::mesh::Solid;
use crate::mesh::Soup;
use crate::mesh::stl_ascii;
use crate::mesh::stl_error::StlError;
use crate::mesh::stl_error::excerpt;
use std::io::Cursor;

/// Bytes before the first facet of a binary file: a header of 80 and the count.
const HEAD: usize = 84;

/// Bytes of a facet in a binary file: normal, three corners, two bytes of attributes.
const FACET: usize = 50;

/// Largest magnitude of a coordinate that is taken for a length, in file units.
///
/// In micrometres, the smallest unit in use, it is a million kilometres.  Bytes that are no
/// coordinates (shifted by a byte, another byte order) decode to exponents spread over 1e±38, so
/// that a facet of nine of them passes below this bound with a probability of about 1 %, and the
/// fourth power of the bound is still far from overflow in double precision.
pub const ABSURD: f64 = 1e15;

/// Most facets that are read from one file.
///
/// A hundred times more than can be panelled; it keeps corner indices within `u32` and the
/// memory for the soup below 4 GB.
pub const MAX_FACETS: usize = 50_000_000;

/// Bytes at the start of a file that are looked at to tell text from numbers.
const PROBED: usize = 4096;

/// The facets of an STL file, binary or text, every solid kept, coordinates in file units.
///
/// Coordinates are single precision in both formats, widened to double.  `file` is the name
/// used in messages.  Memory stays within a small multiple of the size of `bytes`: nothing is
/// allocated from a count that the length does not bear out.
///
/// Bytes behind the last counted facet of a binary file give a finding, unless they could be
/// facets the count has forgotten: a whole number of them, or more than were counted.
///
/// # Errors
/// [`StlError`]: what is wrong, at which byte or line, and what would be accepted.
pub fn parse(bytes: &[u8], file: &str) -> Result<Soup, StlError> {
    match format_of(bytes, file)? {
        Format::Binary { facets } => binary(bytes, facets, file),
        Format::Text => stl_ascii::parse(bytes, file),
    }
}

/// What the gate decided.
enum Format {
    /// `facets` of them, all there.
    Binary { facets: usize },
    /// Begins with `solid`.
    Text,
}

fn format_of(bytes: &[u8], file: &str) -> Result<Format, StlError> {
    let file = || file.to_owned();
    if bytes.is_empty() {
        return Err(StlError::Empty { file: file() });
    }
    let counted = counted(bytes);
    if let Some(n) = counted
        && Some(bytes.len()) == length_of(n)
    {
        return binary_format(n, file());
    }
    if let Some(what) = foreign(bytes) {
        return Err(StlError::Foreign { file: file(), what });
    }
    if is_utf16(bytes) {
        return Err(StlError::Utf16 { file: file() });
    }
    let start = stl_ascii::without_mark(bytes);
    if is_text(start) {
        return if begins_with_solid(start) {
            Ok(Format::Text)
        } else {
            Err(StlError::NotStl { file: file(), begins: excerpt(start.trim_ascii_start()) })
        };
    }
    let Some(n) = counted else {
        return Err(StlError::TooShort { file: file(), length: bytes.len() });
    };
    mismatched(bytes, n, file())
}

/// Judges a binary file whose length is not the one its count asks for.
fn mismatched(bytes: &[u8], counted: usize, file: String) -> Result<Format, StlError> {
    let length = bytes.len();
    let held = (length - HEAD) / FACET;
    let swapped = u32::from_be_bytes([bytes[80], bytes[81], bytes[82], bytes[83]]) as usize;
    if Some(length) == length_of(swapped) && 0 < swapped {
        return Err(StlError::BigEndian { file, facets: swapped });
    }
    if held < counted {
        return Err(StlError::Truncated { file, counted, held, length });
    }
    let whole = (length - HEAD).is_multiple_of(FACET);
    if whole || 2 * counted <= held {
        return Err(StlError::CountTooSmall { file, counted, held, length });
    }
    binary_format(counted, file)
}

fn binary_format(facets: usize, file: String) -> Result<Format, StlError> {
    if facets == 0 {
        return Err(StlError::NoFacets { file });
    }
    if MAX_FACETS < facets {
        return Err(StlError::TooManyFacets { file, facets, limit: MAX_FACETS });
    }
    Ok(Format::Binary { facets })
}

/// The count of facets in the head of a binary file.
fn counted(bytes: &[u8]) -> Option<usize> {
    let field = bytes.get(80..HEAD)?;
    Some(u32::from_le_bytes([field[0], field[1], field[2], field[3]]) as usize)
}

fn length_of(facets: usize) -> Option<usize> {
    facets.checked_mul(FACET)?.checked_add(HEAD)
}

/// What a file is that begins like another well-known kind of file.
fn foreign(bytes: &[u8]) -> Option<&'static str> {
    const KINDS: &[(&[u8], &str)] = &[
        (b"\x89PNG\r\n\x1a\n", "a PNG picture"),
        (b"\xff\xd8\xff", "a JPEG picture"),
        (b"GIF8", "a GIF picture"),
        (b"%PDF", "a PDF document"),
        (b"PK\x03\x04", "a ZIP archive; unpack it first"),
        (b"\x1f\x8b", "a gzip archive; unpack it first"),
        (b"7z\xbc\xaf\x27\x1c", "a 7z archive; unpack it first"),
        (b"ISO-10303-21", "a STEP model; export it as STL"),
        (b"<?xml", "an XML file"),
        (b"ply", "a PLY mesh; export it as STL"),
    ];
    KINDS.iter().find(|(magic, _)| bytes.starts_with(magic)).map(|&(_, what)| what)
}

fn is_utf16(bytes: &[u8]) -> bool {
    let text = bytes.trim_ascii_start();
    [b"\xff\xfe".as_slice(), b"\xfe\xff", b"s\0o\0l\0", b"\0s\0o\0l"].iter().any(|m| text.starts_with(m))
}

/// Whether the start of a file is text: no control bytes, or the words of STL among them.
fn is_text(bytes: &[u8]) -> bool {
    let start = &bytes[..bytes.len().min(PROBED)];
    let control = start.iter().any(|&b| b < 0x20 && !b"\t\n\r\x0b\x0c".contains(&b));
    let words = || {
        let lower = start.to_ascii_lowercase();
        [b"facet".as_slice(), b"vertex"].iter().all(|word| lower.windows(word.len()).any(|w| w == *word))
    };
    !control || begins_with_solid(bytes) && words()
}

fn begins_with_solid(bytes: &[u8]) -> bool {
    let text = bytes.trim_ascii_start();
    text.len() >= 5 && text[..5].eq_ignore_ascii_case(b"solid")
}

fn binary(bytes: &[u8], facets: usize, file: &str) -> Result<Soup, StlError> {
    let end = HEAD + FACET * facets;
    check_coordinates(&bytes[HEAD..end], file)?;
    // The line feed at once ends the reader's search for the word `solid`.
    let mut clean = vec![0; HEAD];
    clean[0] = b'\n';
    clean[80..HEAD].copy_from_slice(&bytes[80..HEAD]);
    clean.extend_from_slice(&bytes[HEAD..end]);
    let (facets, opposed) = read_clean(clean, facets, file)?;
    let mut findings = Vec::new();
    if end < bytes.len() {
        let text = format!(
            "{file}: {} bytes behind the last facet, from byte {end} on, are ignored",
            bytes.len() - end
        );
        findings.push(Finding { severity: Severity::Warning, code: "stl_trailing_bytes", text, place: None });
    }
    findings.extend(opposed_finding(opposed, facets.len(), file));
    Ok(Soup { solids: vec![Solid { name: String::new(), facets }], findings })
}

fn check_coordinates(facets: &[u8], file: &str) -> Result<(), StlError> {
    for (n, facet) in facets.chunks_exact(FACET).enumerate() {
        for (k, field) in facet[12..48].chunks_exact(4).enumerate() {
            let value = f32::from_le_bytes([field[0], field[1], field[2], field[3]]);
            let offset = HEAD + FACET * n + 12 + 4 * k;
            if !value.is_finite() {
                return Err(StlError::NotFinite { file: file.to_owned(), offset, facet: n + 1, value });
            }
            if ABSURD < f64::from(value.abs()) {
                return Err(StlError::Absurd { file: file.to_owned(), offset, facet: n + 1, value });
            }
        }
    }
    Ok(())
}

/// The facets of one clean solid, and how many stored normals point against the corners.
pub(in crate::mesh) fn read_clean(
    clean: Vec<u8>,
    expected: usize,
    file: &str,
) -> Result<(Vec<[Vec3; 3]>, usize), StlError> {
    let mesh = stl_io::read_stl(&mut Cursor::new(clean))
        .map_err(|e| StlError::Reader { file: file.to_owned(), kind: e.kind() })?;
    if mesh.faces.len() != expected {
        return Err(StlError::Disagreement { file: file.to_owned(), expected, read: mesh.faces.len() });
    }
    let wide = |v: [f32; 3]| Vec3::from(v.map(f64::from));
    let mut opposed = 0;
    let facets = mesh
        .faces
        .iter()
        .map(|face| {
            let corners = face.vertices.map(|v| wide(mesh.vertices[v].0));
            let [a, b, c] = corners;
            if (b - a).cross(&(c - a)).dot(&wide(face.normal.0)) < 0.0 {
                opposed += 1;
            }
            corners
        })
        .collect();
    Ok((facets, opposed))
}

/// A note where stored normals contradict the order of the corners, which decides.
pub(in crate::mesh) fn opposed_finding(opposed: usize, facets: usize, file: &str) -> Option<Finding> {
    (0 < opposed).then(|| Finding {
        severity: Severity::Note,
        code: "stl_stored_normals",
        text: format!(
            "{file}: the stored normals of {opposed} of {facets} facets point against the order of their \
             corners; the order of the corners is used"
        ),
        place: None,
    })
}
