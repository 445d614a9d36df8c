//! `key`: the sign and naming rules of the tables.

use crate::cli;
use crate::cli::failure::Failure;
use crate::cli::help;
use crate::cli::show::Show;
use crate::record::CAUTIONS;
use serde_json::Value;
use serde_json::json;

/// Prints the rules.
///
/// # Errors
/// [`Failure::Output`].
pub(super) fn run(show: &Show) -> Result<u8, Failure> {
    if show.json {
        let rules: Vec<Value> =
            help::KEY.iter().map(|(name, rule)| json!({ "name": name, "rule": rule })).collect();
        show.result(&format!("{:#}", json!({ "rules": rules, "cautions": CAUTIONS })))?;
        return Ok(cli::DONE);
    }
    let mut text = String::new();
    for (name, rule) in help::KEY {
        text.push_str(&format!("{name}\n{}\n", wrapped(rule)));
    }
    text.push_str("Cautions\n");
    for caution in CAUTIONS {
        text.push_str(&wrapped(caution));
    }
    show.result(&text)?;
    Ok(cli::DONE)
}

/// Characters of a line of running text.
const WIDTH: usize = 96;

/// `text` in indented lines.
fn wrapped(text: &str) -> String {
    let (mut lines, mut line) = (String::new(), String::new());
    for word in text.split_whitespace() {
        if !line.is_empty() && WIDTH < line.chars().count() + 1 + word.chars().count() {
            lines.push_str(&format!("   {line}\n"));
            line.clear();
        }
        line.push(' ');
        line.push_str(word);
    }
    lines + &format!("   {line}\n")
}
