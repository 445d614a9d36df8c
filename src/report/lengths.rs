//! Sentences of findings with their lengths in the unit of the drawing.

use crate::report::digits;
use crate::report::form::clean;

/// Significant digits of a length inside a sentence [1].
const DIGITS: usize = 5;

/// What the texts of findings write behind a length [m] or an area [m²], with its power.
const UNITS: [(&str, i32); 2] = [(" m²", 2), (" m", 1)];

/// A sentence with every `1.25e-1 m`, `(1, 2, 3) m` and `1 × 2 × 3 m` in a unit of `metres` [m], and
/// percentages without a power of ten.
///
/// Names between backquotes stay as they are.
pub fn in_unit(text: &str, name: &str, metres: f64) -> String {
    // Odd pieces are names.
    let pieces = text.split('`').enumerate();
    let shown = pieces.map(|(n, piece)| match n % 2 {
        0 => sentence(piece, name, metres),
        _ => piece.to_owned(),
    });
    shown.collect::<Vec<String>>().join("`")
}

/// The sentence of a finding in a unit of `metres` [m], and its place there; no place where the sentence
/// names one itself, as many do.
pub fn told(text: &str, place: Option<[f64; 3]>, name: &str, metres: f64) -> (String, Option<String>) {
    let text = in_unit(&clean(text), name, metres);
    let place = place.filter(|_| !text.contains(&format!(") {name}")));
    (text, place.map(|at| format!("at {} {name}", digits::place(&at, metres))))
}

fn sentence(text: &str, name: &str, metres: f64) -> String {
    let (mut done, mut rest) = (String::new(), text);
    while let Some((at, unit, power)) = next_unit(rest) {
        let (before, after) = (&rest[..at], &rest[at + unit.len()..]);
        let start = figures_start(before);
        done.push_str(&before[..start]);
        if power == 0 {
            done.push_str(&converted(&before[start..], 1.0, 3));
            done.push_str(unit);
        } else if start == at {
            done.push_str(unit);
        } else {
            let mark = if power == 2 { "²" } else { "" };
            done.push_str(&converted(&before[start..], metres.powi(power), DIGITS));
            done.push_str(&format!(" {name}{mark}"));
        }
        rest = after;
    }
    done + rest
}

/// The first unit in a text: where, as written, and the power of the length (0: a percentage).
fn next_unit(text: &str) -> Option<(usize, &'static str, i32)> {
    let ends =
        |at: usize| text[at..].chars().next().is_none_or(|c| !c.is_alphanumeric() && c != '/' && c != '²');
    let found = |unit: &'static str, power: i32| {
        let hit = text.match_indices(unit).map(|(at, _)| at).find(|at| ends(at + unit.len()));
        hit.map(|at| (at, unit, power))
    };
    let lengths = UNITS.iter().filter_map(|(unit, power)| found(unit, *power));
    lengths.chain(found(" %", 0)).min_by_key(|(at, ..)| *at)
}

/// Where the figures at the end of a text begin: one number, numbers joined by ` × `, or a tuple.
fn figures_start(text: &str) -> usize {
    if text.ends_with(')') {
        let open = text.rfind('(').unwrap_or(text.len());
        let inside = text.get(open + 1..text.len() - 1).unwrap_or("");
        let all = inside.split(", ").all(|part| part.parse::<f64>().is_ok());
        return if all { open } else { text.len() };
    }
    let mut start = text.len();
    loop {
        let before = text[..start].strip_suffix(" × ").unwrap_or(&text[..start]);
        if start < text.len() && before.len() == start {
            return start;
        }
        let word = before.rfind([' ', '(']).map_or(0, |at| at + 1);
        if before[word..].parse::<f64>().is_err() {
            return start;
        }
        start = word;
    }
}

/// Figures over `factor`, each with that many digits.
fn converted(figures: &str, factor: f64, digits: usize) -> String {
    let (mut text, mut number) = (String::new(), String::new());
    let flush = |number: &mut String, text: &mut String| {
        match number.parse::<f64>() {
            Ok(value) => text.push_str(&digits::significant(value / factor, digits)),
            Err(_) => text.push_str(number),
        }
        number.clear();
    };
    for c in figures.chars() {
        if c.is_ascii_digit() || "+-.e".contains(c) {
            number.push(c);
        } else {
            flush(&mut number, &mut text);
            text.push(c);
        }
    }
    flush(&mut number, &mut text);
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lengths_in_sentences_take_the_unit() {
        let mm = |text: &str| in_unit(text, "mm", 1e-3);
        assert_eq!(
            mm("`a 1 m` and `b` stand 1.0706e-4 m apart, 8.16e-2 % of the smaller one"),
            "`a 1 m` and `b` stand 0.10706 mm apart, 0.0816 % of the smaller one"
        );
        assert_eq!(
            mm("hole at (0.1, -2.5e-5, 0) m, along (1, 0, 0) m, (2, 0, 0) m; close it"),
            "hole at (100, -0.025, 0) mm, along (1000, 0, 0) mm, (2000, 0, 0) mm; close it"
        );
        assert_eq!(
            mm("size 0.1 × 0.2 × 0.3 m but 1 × 2 × 3 m"),
            "size 100 × 200 × 300 mm but 1000 × 2000 × 3000 mm"
        );
        assert_eq!(mm("facets (1.5000e-4 m²) lie"), "facets (150 mm²) lie");
        assert_eq!(
            mm("over 1 % and 2 % of 3 mm, 4 V/m, in m, 5 most"),
            "over 1 % and 2 % of 3 mm, 4 V/m, in m, 5 most"
        );
        assert_eq!(in_unit("at (1, 2, 3) m", "drawing units", 1.0), "at (1, 2, 3) drawing units");
        assert_eq!(mm(""), "");
        assert_eq!(mm("é (x) m × m) m"), "é (x) m × m) m");
    }
}
