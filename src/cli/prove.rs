//! `prove`: exact cases on this machine, deviation against bar.

use crate::cli;
use crate::cli::failure::Failure;
use crate::cli::show::Show;
use crate::report::digits;
use crate::study;
use crate::study::ProveLine;
use serde_json::Value;
use serde_json::json;

/// Runs the exact cases; exit code 5 if one lies outside its bar.
///
/// # Errors
/// [`Failure`] where a case gives no result at all.
pub(super) fn run(show: &Show) -> Result<u8, Failure> {
    let lines = study::prove()?;
    if show.json {
        let values: Vec<Value> = lines.iter().map(as_json).collect();
        show.result(&format!("{:#}", json!({ "cases": values })))?;
    } else {
        show.result(&text(&lines))?;
    }
    // An empty list proves nothing.
    Ok(if !lines.is_empty() && lines.iter().all(|line| line.pass) { cli::DONE } else { cli::CHECK })
}

fn as_json(line: &ProveLine) -> Value {
    json!({
        "name": line.name, "source": line.source, "exact": line.exact, "found": line.found,
        "bar": line.bar, "pass": line.pass,
    })
}

fn text(lines: &[ProveLine]) -> String {
    let width = lines.iter().map(|line| line.name.chars().count()).max().unwrap_or(0);
    let mut text = String::new();
    for line in lines {
        let deviation = digits::percent(line.found / line.exact - 1.0, true);
        let bar = digits::percent(line.bar / line.exact.abs(), false);
        let verdict = if line.pass { "inside its bar" } else { "OUTSIDE ITS BAR" };
        text.push_str(&format!(
            "{:width$}  deviation {deviation:>12}  bar {bar:>10}  {verdict}  ({})\n",
            line.name, line.source
        ));
    }
    let failed = lines.iter().filter(|line| !line.pass).count();
    text + &format!("{} of {} inside their bars\n", lines.len() - failed, lines.len())
}
