//! What goes to standard output and what to standard error.

use crate::base::Finding;
use crate::cli::failure::Failure;
use crate::report::lengths;
use serde_json::Value;
use serde_json::json;
use std::io;
use std::io::Write;

/// How results and messages are shown.
#[derive(Clone, Copy, Debug)]
pub(super) struct Show {
    /// Results as JSON.
    pub(super) json: bool,
    /// Nothing on standard error but errors.
    pub(super) quiet: bool,
}

impl Show {
    /// A result, to standard output.
    ///
    /// # Errors
    /// [`Failure::Output`]; a reader that has read enough and closed the pipe is no error.
    pub(super) fn result(&self, text: &str) -> Result<(), Failure> {
        let mut out = io::stdout().lock();
        let end = if text.ends_with('\n') { "" } else { "\n" };
        match write!(out, "{text}{end}").and_then(|()| out.flush()) {
            Err(error) if error.kind() != io::ErrorKind::BrokenPipe => Err(Failure::Output(error)),
            _ => Ok(()),
        }
    }

    /// A remark, to standard error, unless it is to be quiet.
    pub(super) fn remark(&self, text: &str) {
        if !self.quiet {
            to_stderr(text);
        }
    }

    /// An error with its findings: text to standard error, and JSON to standard output if asked for.
    pub(super) fn failure(&self, failure: &Failure) {
        for finding in failure.findings() {
            to_stderr(&finding_text(finding, failure.unit()));
        }
        to_stderr(&format!("error: {failure}"));
        if self.json {
            let findings: Vec<Value> = failure.findings().iter().map(finding_json).collect();
            let error = json!({
                "error": { "exit_code": failure.code(), "text": failure.to_string(), "findings": findings }
            });
            // The error has been told on standard error; there is no third place.
            let _ = self.result(&format!("{error:#}"));
        }
    }
}

/// Writes a line to standard error; where there is none, nobody is listening.
pub(super) fn to_stderr(text: &str) {
    let _ = writeln!(io::stderr().lock(), "{text}");
}

/// A unit of length for places: name and metres per unit.
pub(super) type LengthUnit<'a> = (&'a str, f64);

/// A finding on one line, its place in `unit`.
pub(super) fn finding_text(finding: &Finding, (name, metres): LengthUnit<'_>) -> String {
    let (text, place) = lengths::told(&finding.text, finding.place.map(Into::into), name, metres);
    let place = place.map_or_else(String::new, |place| format!(", {place}"));
    format!("{}: {text}{place}", finding.severity.word())
}

/// A finding as JSON; its place in metres, or in the unit of the drawing where no case gives one.
pub(super) fn finding_json(finding: &Finding) -> Value {
    json!({
        "severity": finding.severity.word(),
        "code": finding.code,
        "text": finding.text,
        "where_metre": finding.place.map(|at| [at.x, at.y, at.z]),
    })
}
