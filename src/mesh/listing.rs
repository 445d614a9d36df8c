//! Findings of one kind: the first ones singly, the rest in one line.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;

/// Findings of one kind that are listed singly [1]; more than fill a screen help nobody.
pub(in crate::mesh) const LISTED: usize = 50;

/// A list of findings of one kind about one electrode.
pub(in crate::mesh) struct Listing<'a> {
    name: &'a str,
    severity: Severity,
    code: &'static str,
    found: Vec<Finding>,
    more: usize,
}

impl<'a> Listing<'a> {
    pub(in crate::mesh) fn new(name: &'a str, severity: Severity, code: &'static str) -> Self {
        Listing { name, severity, code, found: Vec::new(), more: 0 }
    }

    /// Adds one; `text` is made only if it is listed.
    pub(in crate::mesh) fn add(&mut self, place: Vec3, text: impl FnOnce() -> String) {
        if LISTED <= self.found.len() {
            self.more += 1;
            return;
        }
        let text = format!("`{}`: {}", self.name, text());
        self.found.push(Finding { severity: self.severity, code: self.code, text, place: Some(place) });
    }

    /// The findings, with a last line for those not listed.
    pub(in crate::mesh) fn finish(mut self) -> Vec<Finding> {
        if 0 < self.more {
            let text = format!("`{}`: {} more of the kind `{}`", self.name, self.more, self.code);
            self.found.push(Finding { severity: self.severity, code: self.code, text, place: None });
        }
        self.found
    }
}

/// A point for a message, in metres.
pub(in crate::mesh) fn at(x: &Vec3) -> String {
    format!("({}, {}, {}) m", short(x.x), short(x.y), short(x.z))
}

/// A length in metres with six digits, without trailing zeros.
pub(in crate::mesh) fn short(length: f64) -> String {
    if length == 0.0 {
        return "0".to_owned();
    }
    let magnitude = length.abs();
    if !(1e-4..1e6).contains(&magnitude) {
        return format!("{length:.5e}");
    }
    let digits = (5 - magnitude.log10().floor() as i32).max(0) as usize;
    let text = format!("{length:.digits$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}
