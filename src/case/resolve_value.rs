//! Single values of a case file to numbers, texts and vectors in SI, faults noted on the way.

use crate::base::Vec3;
use crate::base::units;
use crate::base::units::Dimension;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::wire::Field;
use crate::case::wire::Value;
use crate::case::words::nearest;
use std::ops::Range;
use toml::Spanned;

/// A text that is not blank.
pub(super) fn text(field: &Field, word: &str, sink: &mut Sink) -> Option<String> {
    let value = field.as_ref()?;
    text_of(value, word, "a text in quotation marks, not a blank one", sink)
}

/// The text of a value; `wanted` says what it should be.
pub(super) fn text_of(
    value: &Spanned<Value>,
    word: &str,
    wanted: &'static str,
    sink: &mut Sink,
) -> Option<String> {
    match value.get_ref() {
        Value::Text(text) if !text.trim().is_empty() => Some(text.clone()),
        _ => {
            sink.note(value.span(), Fault::Form { word: word.to_owned(), wanted });
            None
        }
    }
}

/// Texts, written as one text or as a list.
pub(super) fn texts(
    field: &Field,
    word: &str,
    wanted: &'static str,
    sink: &mut Sink,
) -> Vec<(String, Range<usize>)> {
    let Some(value) = field else { return Vec::new() };
    let one = std::slice::from_ref(value);
    let items = match value.get_ref() {
        Value::List(items) => items.as_slice(),
        _ => one,
    };
    items.iter().filter_map(|item| Some((text_of(item, word, wanted, sink)?, item.span()))).collect()
}

/// A compulsory text; an empty one, with a fault, if it is not there.
pub(super) fn needed_text(
    field: &Field,
    word: &'static str,
    (table, span): (&str, Range<usize>),
    sink: &mut Sink,
) -> String {
    needed(field, word, "a text in quotation marks", (table, span), sink);
    text(field, word, sink).unwrap_or_default()
}

/// Notes a fault if a compulsory word is not there.
pub(super) fn needed(
    field: &Field,
    word: &'static str,
    wanted: &'static str,
    (table, span): (&str, Range<usize>),
    sink: &mut Sink,
) {
    if field.is_none() {
        sink.note(span, Fault::Missing { word, table: table.to_owned(), wanted });
    }
}

/// SI value of a quantity such as `"100 kV"` [SI unit of `dimension`].
pub(super) fn quantity(field: &Field, word: &str, dimension: Dimension, sink: &mut Sink) -> Option<f64> {
    quantity_of(field.as_ref()?, word, dimension, sink)
}

/// SI value of a quantity that must be above zero [SI unit of `dimension`].
pub(super) fn positive_quantity(
    field: &Field,
    word: &str,
    dimension: Dimension,
    sink: &mut Sink,
) -> Option<f64> {
    let value = quantity(field, word, dimension, sink)?;
    above_zero(value, field.as_ref()?, word, sink)
}

/// `number` if it is above zero, else none and a fault.
pub(super) fn above_zero(number: f64, at: &Spanned<Value>, word: &str, sink: &mut Sink) -> Option<f64> {
    if 0.0 < number && number.is_finite() {
        return Some(number);
    }
    let found = written(at.get_ref());
    sink.note(at.span(), Fault::Range { word: word.to_owned(), found, wanted: "a finite value above zero" });
    None
}

/// SI value of a quantity [SI unit of `dimension`].
pub(super) fn quantity_of(
    value: &Spanned<Value>,
    word: &str,
    dimension: Dimension,
    sink: &mut Sink,
) -> Option<f64> {
    let fault = match value.get_ref() {
        Value::Text(text) => match units::parse_quantity(text, dimension) {
            Ok(number) => return Some(number),
            Err(error) => Fault::Quantity { word: word.to_owned(), error },
        },
        Value::Whole(_) | Value::Number(_) => {
            Fault::BareNumber { word: word.to_owned(), example: example(dimension) }
        }
        _ => Fault::Form { word: word.to_owned(), wanted: "a text with a number and a unit" },
    };
    sink.note(value.span(), fault);
    None
}

/// A quantity of a dimension, for messages.
fn example(dimension: Dimension) -> &'static str {
    match dimension {
        Dimension::Length => "5 mm",
        Dimension::Potential => "100 kV",
        Dimension::Capacitance => "20 pF",
        Dimension::Charge => "1 nC",
        Dimension::Field => "2.6 kV/mm",
        Dimension::Time => "10 min",
        Dimension::Memory => "4 GB",
        Dimension::Angle => "30 deg",
        Dimension::Ratio => "0.5 %",
    }
}

/// A finite bare number [unit of the word].
pub(super) fn number_of(
    value: &Spanned<Value>,
    word: &str,
    wanted: &'static str,
    sink: &mut Sink,
) -> Option<f64> {
    let number = match value.get_ref() {
        // Whole numbers of a case file (coordinates, counts) are far below 2⁵³.
        Value::Whole(whole) => *whole as f64,
        Value::Number(number) => *number,
        _ => f64::NAN,
    };
    if number.is_finite() {
        return Some(number);
    }
    sink.note(value.span(), Fault::Form { word: word.to_owned(), wanted });
    None
}

/// A whole number from `least` to `most` [1].
pub(super) fn count(
    field: &Field,
    word: &str,
    (least, most, wanted): (usize, usize, &'static str),
    sink: &mut Sink,
) -> Option<usize> {
    count_of(field.as_ref()?, word, (least, most, wanted), sink)
}

/// A whole number from `least` to `most` [1].
pub(super) fn count_of(
    value: &Spanned<Value>,
    word: &str,
    (least, most, wanted): (usize, usize, &'static str),
    sink: &mut Sink,
) -> Option<usize> {
    if let Value::Whole(whole) = value.get_ref()
        && let Ok(count) = usize::try_from(*whole)
        && (least..=most).contains(&count)
    {
        return Some(count);
    }
    let found = written(value.get_ref());
    sink.note(value.span(), Fault::Range { word: word.to_owned(), found, wanted });
    None
}

/// `true` or `false`.
pub(super) fn flag(field: &Field, word: &str, sink: &mut Sink) -> Option<bool> {
    let value = field.as_ref()?;
    match value.get_ref() {
        Value::Flag(flag) => Some(*flag),
        _ => {
            sink.note(
                value.span(),
                Fault::Form { word: word.to_owned(), wanted: "true or false, without quotation marks" },
            );
            None
        }
    }
}

/// What three coordinates look like.
const COORDINATES: &str = "three bare numbers in the declared length unit, as in [0, 0, 400]";

/// Three coordinates, times `unit` [m if `unit` is metres per unit of length].
pub(super) fn vector(field: &Field, word: &str, unit: f64, sink: &mut Sink) -> Option<Vec3> {
    vector_of(field.as_ref()?, word, unit, sink)
}

/// Three coordinates, times `unit` [m if `unit` is metres per unit of length].
pub(super) fn vector_of(value: &Spanned<Value>, word: &str, unit: f64, sink: &mut Sink) -> Option<Vec3> {
    let Value::List(items) = value.get_ref() else {
        sink.note(value.span(), Fault::Form { word: word.to_owned(), wanted: COORDINATES });
        return None;
    };
    if items.len() != 3 {
        sink.note(value.span(), Fault::Form { word: word.to_owned(), wanted: COORDINATES });
        return None;
    }
    let numbers: Vec<f64> =
        items.iter().filter_map(|item| number_of(item, word, COORDINATES, sink)).collect();
    (numbers.len() == 3).then(|| Vec3::new(numbers[0], numbers[1], numbers[2]) * unit)
}

/// A direction as a unit vector [1].
pub(super) fn direction(field: &Field, word: &str, sink: &mut Sink) -> Option<Vec3> {
    let vector = vector(field, word, 1.0, sink)?;
    // Scaled first, so that neither tiny nor huge components leave the range of a double.
    let unit = (vector / vector.amax()).try_normalize(0.0).filter(|unit| unit.norm().is_finite());
    if unit.is_none() {
        let (found, wanted) = (written_vector(&vector), "a direction that is not [0, 0, 0]");
        sink.note(field.as_ref()?.span(), Fault::Range { word: word.to_owned(), found, wanted });
    }
    unit
}

/// One of a few words; none and a fault for any other.
pub(super) fn choice<T: Copy>(
    field: &Field,
    word: &str,
    accepted: &[(&'static str, T)],
    sink: &mut Sink,
) -> Option<T> {
    let value = field.as_ref()?;
    let found = text_of(value, word, "one of a few words in quotation marks", sink)?;
    if let Some((_, meaning)) = accepted.iter().find(|(name, _)| *name == found) {
        return Some(*meaning);
    }
    let word = word.to_owned();
    let fault = if found == "grounded" {
        Fault::Grounded { word }
    } else {
        let names = accepted.iter().map(|(name, _)| *name);
        Fault::Choice { word, nearest: nearest(&found, names.clone()), accepted: names.collect(), found }
    };
    sink.note(value.span(), fault);
    None
}

/// The value as it was written, nearly.
pub(super) fn written(value: &Value) -> String {
    match value {
        Value::Text(text) => format!("\"{text}\""),
        Value::Whole(whole) => whole.to_string(),
        Value::Number(number) => number.to_string(),
        Value::Flag(flag) => flag.to_string(),
        Value::List(_) => "a list".to_owned(),
        Value::Other => "a date or a table".to_owned(),
    }
}

fn written_vector(v: &Vec3) -> String {
    format!("[{}, {}, {}]", v.x, v.y, v.z)
}
