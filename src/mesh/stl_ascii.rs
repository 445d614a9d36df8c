//! ASCII STL: the gate that checks every word and number, and writes one clean solid at a time.

use crate::base::Finding;
use crate::base::Severity;
use crate::mesh::Solid;
use crate::mesh::Soup;
use crate::mesh::stl;
use crate::mesh::stl_error::StlError;
use crate::mesh::stl_error::excerpt;

/// Longest line that is read [bytes]: a statement with three numbers of 17 digits has 90; the
/// rest is for names and blanks.
const MAX_LINE: usize = 8192;

/// Reads all solids of an ASCII file; takes a byte order mark, blank lines, any case of the
/// words, nameless solids, and lines ended by LF, CRLF or CR.
///
/// # Errors
/// As [`stl::parse`].
pub(in crate::mesh) fn parse(bytes: &[u8], file: &str) -> Result<Soup, StlError> {
    let mut gate =
        Gate { file, line: 0, last: false, state: State::Outside, open: Open::default(), stray: None };
    let mut read = Read { soup: Soup { solids: Vec::new(), findings: Vec::new() }, opposed: 0, empty: 0 };
    let mut rest = without_mark(bytes);
    while !rest.is_empty() {
        let mut tokens = Tokens(gate.next_line(&mut rest)?);
        while let Some(token) = tokens.next() {
            if let Some(finished) = gate.take(token, &mut tokens)? {
                read.hand_over(finished, file)?;
            }
        }
    }
    match gate.state {
        State::Outside => {}
        State::Facet => read.hand_over(gate.close(Some(gate.line)), file)?,
        _ => {
            let expected = gate.state.expected();
            return Err(StlError::EndsEarly { file: file.to_owned(), line: gate.line, expected });
        }
    }
    read.finish(gate.stray, file)
}

/// The text behind a UTF-8 byte order mark.
pub(in crate::mesh) fn without_mark(bytes: &[u8]) -> &[u8] {
    bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes)
}

/// What the gate waits for.
#[derive(Clone, Copy)]
enum State {
    Outside,
    Facet,
    Loop,
    Corner(u8),
    EndLoop,
    EndFacet,
}

impl State {
    fn expected(self) -> &'static str {
        match self {
            State::Outside => "`solid`",
            State::Facet => "`facet normal` or `endsolid`",
            State::Loop => "`outer loop`",
            State::Corner(_) => "`vertex`",
            State::EndLoop => "`endloop`",
            State::EndFacet => "`endfacet`",
        }
    }
}

/// A solid on its way to the reader.
#[derive(Default)]
struct Open {
    name: String,
    /// The solid in the one form the reader takes.
    clean: Vec<u8>,
    facets: usize,
    /// Line at which `endsolid` was missed.
    unended: Option<usize>,
}

/// The words of a line, cut off one by one.
struct Tokens<'a>(&'a [u8]);

impl<'a> Iterator for Tokens<'a> {
    type Item = &'a [u8];

    fn next(&mut self) -> Option<&'a [u8]> {
        let text = self.0.trim_ascii_start();
        let end = text.iter().position(u8::is_ascii_whitespace).unwrap_or(text.len());
        let (token, rest) = text.split_at(end);
        self.0 = rest;
        (!token.is_empty()).then_some(token)
    }
}

struct Gate<'a> {
    file: &'a str,
    /// Number of the current line, from 1.
    line: usize,
    /// Whether the file ends with this line, without a line end.
    last: bool,
    state: State,
    open: Open,
    /// Line and text of the first words outside a solid.
    stray: Option<(usize, String)>,
}

impl Gate<'_> {
    /// Cuts the next line off `rest`.
    fn next_line<'b>(&mut self, rest: &mut &'b [u8]) -> Result<&'b [u8], StlError> {
        self.line += 1;
        let window = &rest[..rest.len().min(MAX_LINE + 1)];
        let end = window.iter().position(|&b| b == b'\n' || b == b'\r').unwrap_or(window.len());
        if MAX_LINE < end {
            return Err(StlError::LineTooLong {
                file: self.file.to_owned(),
                line: self.line,
                limit: MAX_LINE,
            });
        }
        let line = &rest[..end];
        self.last = end == rest.len();
        let ending = if rest[end..].starts_with(b"\r\n") { 2 } else { 1 };
        *rest = &rest[(end + ending).min(rest.len())..];
        Ok(line)
    }

    /// Takes one statement that begins with `token`; gives back a solid that ended with it.
    fn take(&mut self, token: &[u8], tokens: &mut Tokens<'_>) -> Result<Option<Open>, StlError> {
        let is = |word: &str| token.eq_ignore_ascii_case(word.as_bytes());
        let mut finished = None;
        self.state = match self.state {
            State::Outside if is("solid") => self.begin(tokens),
            State::Outside => {
                self.stray.get_or_insert_with(|| (self.line, excerpt(token)));
                tokens.0 = &[];
                State::Outside
            }
            State::Facet if is("solid") => {
                finished = Some(self.close(Some(self.line)));
                self.begin(tokens)
            }
            State::Facet if is("endsolid") => {
                tokens.0 = &[];
                finished = Some(self.close(None));
                State::Outside
            }
            State::Facet if is("facet") => self.facet(tokens)?,
            State::Loop if is("outer") => {
                self.word("loop", "`loop`", tokens)?;
                self.open.clean.extend_from_slice(b"outer loop\n");
                State::Corner(0)
            }
            State::Corner(k) if is("vertex") => self.corner(k, tokens)?,
            State::EndLoop if is("endloop") => {
                self.open.clean.extend_from_slice(b"endloop\n");
                State::EndFacet
            }
            State::EndLoop if is("vertex") => {
                return Err(StlError::TooManyCorners { file: self.file.to_owned(), line: self.line });
            }
            State::EndFacet if is("endfacet") => {
                self.open.clean.extend_from_slice(b"endfacet\n");
                self.open.facets += 1;
                State::Facet
            }
            // A word cut in two by the end of the file.
            state if self.last && tokens.0.is_empty() => return Err(self.line_ends(state.expected())),
            state => return Err(self.unexpected(token, state.expected())),
        };
        Ok(finished)
    }

    fn begin(&mut self, tokens: &mut Tokens<'_>) -> State {
        let name = tokens.0.trim_ascii();
        tokens.0 = &[];
        self.open.name = match std::str::from_utf8(name) {
            Ok(name) => name.to_owned(),
            // Latin-1: each byte is the character of that number.
            Err(_) => name.iter().map(|&b| char::from(b)).collect(),
        };
        self.open.clean.extend_from_slice(b"solid x\n");
        State::Facet
    }

    fn close(&mut self, unended: Option<usize>) -> Open {
        self.open.clean.extend_from_slice(b"endsolid x\n");
        self.open.unended = unended;
        std::mem::take(&mut self.open)
    }

    /// A stored normal is only compared, so one that is not finite is written as zero.
    fn facet(&mut self, tokens: &mut Tokens<'_>) -> Result<State, StlError> {
        self.word("normal", "`normal`", tokens)?;
        let mut normal = [b"0".as_slice(); 3];
        for slot in &mut normal {
            let (token, value) = self.number("three numbers of the normal", tokens)?;
            if value.is_finite() {
                *slot = token;
            }
        }
        self.write(b"facet normal", normal);
        Ok(State::Loop)
    }

    fn corner(&mut self, k: u8, tokens: &mut Tokens<'_>) -> Result<State, StlError> {
        let mut corner = [b"0".as_slice(); 3];
        for slot in &mut corner {
            let (token, value) = self.number("three coordinates of the corner", tokens)?;
            let (file, line) = (self.file.to_owned(), self.line);
            if !value.is_finite() {
                return Err(StlError::NotFiniteText { file, line, token: excerpt(token) });
            }
            if stl::ABSURD < f64::from(value.abs()) {
                return Err(StlError::AbsurdText { file, line, token: excerpt(token) });
            }
            *slot = token;
        }
        self.write(b"vertex", corner);
        Ok(if k < 2 { State::Corner(k + 1) } else { State::EndLoop })
    }

    fn write(&mut self, words: &[u8], numbers: [&[u8]; 3]) {
        let clean = &mut self.open.clean;
        clean.extend_from_slice(words);
        for number in numbers {
            clean.push(b' ');
            clean.extend_from_slice(number);
        }
        clean.push(b'\n');
    }

    fn word(&self, word: &str, expected: &'static str, tokens: &mut Tokens<'_>) -> Result<(), StlError> {
        match tokens.next() {
            Some(token) if token.eq_ignore_ascii_case(word.as_bytes()) => Ok(()),
            Some(token) => Err(self.unexpected(token, expected)),
            None => Err(self.line_ends(expected)),
        }
    }

    /// The next number of the line, as written and as single precision.
    fn number<'b>(
        &self,
        expected: &'static str,
        tokens: &mut Tokens<'b>,
    ) -> Result<(&'b [u8], f32), StlError> {
        let token = tokens.next().ok_or_else(|| self.line_ends(expected))?;
        match std::str::from_utf8(token).ok().and_then(|text| text.parse().ok()) {
            Some(value) => Ok((token, value)),
            // A number cut in two by the end of the file.
            None if self.last && tokens.0.is_empty() => Err(self.line_ends(expected)),
            None => Err(self.bad_number(token)),
        }
    }

    fn bad_number(&self, token: &[u8]) -> StlError {
        let (file, line, shown) = (self.file.to_owned(), self.line, excerpt(token));
        let upper = token.to_ascii_uppercase();
        let has = |word: &[u8]| upper.windows(word.len()).any(|w| w == word);
        let with_e: Vec<u8> = upper.iter().map(|&b| if b == b'D' { b'E' } else { b }).collect();
        let parses = |bytes: &[u8]| std::str::from_utf8(bytes).is_ok_and(|t| t.parse::<f32>().is_ok());
        if token.contains(&b',') {
            StlError::DecimalComma { file, line, token: shown }
        } else if upper.contains(&b'D') && parses(&with_e) {
            StlError::FortranExponent { file, line, token: shown }
        } else if has(b"#INF") || has(b"#IND") || has(b"#QNAN") || has(b"#SNAN") {
            StlError::NotFiniteText { file, line, token: shown }
        } else {
            StlError::BadNumber { file, line, token: shown }
        }
    }

    fn unexpected(&self, token: &[u8], expected: &'static str) -> StlError {
        StlError::Unexpected { file: self.file.to_owned(), line: self.line, token: excerpt(token), expected }
    }

    fn line_ends(&self, expected: &'static str) -> StlError {
        let (file, line) = (self.file.to_owned(), self.line);
        if self.last {
            StlError::EndsEarly { file, line, expected }
        } else {
            StlError::LineEnds { file, line, expected }
        }
    }
}

/// What the reader has given back so far.
struct Read {
    soup: Soup,
    opposed: usize,
    /// Solids without facets.
    empty: usize,
}

impl Read {
    fn hand_over(&mut self, open: Open, file: &str) -> Result<(), StlError> {
        if let Some(line) = open.unended {
            self.note(
                Severity::Warning,
                "stl_no_endsolid",
                format!("{file}: line {line}: `endsolid` is missing"),
            );
        }
        if open.facets == 0 {
            self.empty += 1;
            return Ok(());
        }
        let so_far: usize = self.soup.solids.iter().map(|s| s.facets.len()).sum();
        if stl::MAX_FACETS < so_far + open.facets {
            let facets = so_far + open.facets;
            return Err(StlError::TooManyFacets { file: file.to_owned(), facets, limit: stl::MAX_FACETS });
        }
        let (facets, opposed) = stl::read_clean(open.clean, open.facets, file)?;
        self.opposed += opposed;
        self.soup.solids.push(Solid { name: open.name, facets });
        Ok(())
    }

    fn note(&mut self, severity: Severity, code: &'static str, text: String) {
        self.soup.findings.push(Finding { severity, code, text, place: None });
    }

    fn finish(mut self, stray: Option<(usize, String)>, file: &str) -> Result<Soup, StlError> {
        if self.soup.solids.is_empty() {
            return Err(StlError::NoFacets { file: file.to_owned() });
        }
        if let Some((line, text)) = stray {
            let text = format!("{file}: line {line}: `{text}` outside a solid is ignored");
            self.note(Severity::Warning, "stl_trailing_text", text);
        }
        if 0 < self.empty {
            let text = format!("{file}: {} solids without facets are left out", self.empty);
            self.note(Severity::Note, "stl_empty_solid", text);
        }
        let total = self.soup.solids.iter().map(|s| s.facets.len()).sum();
        self.soup.findings.extend(stl::opposed_finding(self.opposed, total, file));
        Ok(self.soup)
    }
}
