//! `prove`: exact cases on this machine, deviation against bar.

use crate::cli;
use crate::cli::failure::Failure;
use crate::cli::show::Show;
use crate::report::digits;
use serde_json::Value;
use serde_json::json;

/// One exact case.
pub(super) struct Line {
    /// What was solved.
    pub(super) name: String,
    /// Value found [F].
    pub(super) found: f64,
    /// Exact value [F].
    pub(super) exact: f64,
    /// Bar of the value found [F].
    pub(super) bar: f64,
}

impl Line {
    fn holds(&self) -> bool {
        (self.found - self.exact).abs() <= self.bar
    }
}

/// Runs the exact cases; exit code 5 if one lies outside its bar.
///
/// # Errors
/// [`Failure`].
pub(super) fn run(show: &Show) -> Result<u8, Failure> {
    let lines = lines()?;
    if show.json {
        let values: Vec<Value> = lines
            .iter()
            .map(|line| {
                json!({
                    "name": line.name, "found_farad": line.found, "exact_farad": line.exact,
                    "bar_farad": line.bar, "pass": line.holds(),
                })
            })
            .collect();
        show.result(&format!("{:#}", json!({ "cases": values })))?;
    } else {
        show.result(&text(&lines))?;
    }
    Ok(if lines.iter().all(Line::holds) { cli::DONE } else { cli::CHECK })
}

fn text(lines: &[Line]) -> String {
    let name = |line: &Line| line.name.chars().count();
    let width = lines.iter().map(name).max().unwrap_or(0);
    let mut text = String::new();
    for line in lines {
        let deviation = digits::percent(line.found / line.exact - 1.0, true);
        let bar = digits::percent(line.bar / line.exact.abs(), false);
        let verdict = if line.holds() { "inside its bar" } else { "OUTSIDE ITS BAR" };
        text.push_str(&format!(
            "{:width$}  deviation {deviation:>12}, bar {bar:>10}: {verdict}\n",
            line.name
        ));
    }
    text
}

/// The exact cases, solved.
fn lines() -> Result<Vec<Line>, Failure> {
    Err(Failure::NotYet { verb: "prove" })
}
