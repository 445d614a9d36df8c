//! The case file as written: every word optional, every value with its place in the text.
//!
//! Which words are compulsory, and which values make sense, is decided in `resolve`, so that all that
//! is wrong with a file can be told at once.

use serde::Deserialize;
use serde::Deserializer;
use serde::de;
use std::fmt;
use toml::Spanned;

/// A value with its place, if the word was written.
pub(super) type Field = Option<Spanned<Value>>;

/// Any value but a table.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Value {
    /// `"text"`.
    Text(String),
    /// `5`.
    Whole(i64),
    /// `0.5`, `nan`, `inf`.
    Number(f64),
    /// `true`.
    Flag(bool),
    /// `[1, 2]`.
    List(Vec<Spanned<Value>>),
    /// A date, time, or table.
    Other,
}

/// Names with values, in file order.
#[derive(Debug, Default)]
pub(super) struct Pairs(pub(super) Vec<(Spanned<String>, Spanned<Value>)>);

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct File {
    pub(super) study: Option<Study>,
    pub(super) units: Option<Spanned<Units>>,
    pub(super) surroundings: Option<Surroundings>,
    #[serde(default)]
    pub(super) electrode: Vec<Spanned<Electrode>>,
    #[serde(default)]
    pub(super) bond: Vec<Spanned<Bond>>,
    #[serde(default)]
    pub(super) earth_plane: Vec<Spanned<EarthPlane>>,
    #[serde(default)]
    pub(super) voltage_case: Vec<Spanned<VoltageCase>>,
    #[serde(default)]
    pub(super) look: Vec<Spanned<Look>>,
    pub(super) accuracy: Option<Accuracy>,
    pub(super) deliver: Option<Deliver>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Study {
    pub(super) number: Field,
    pub(super) issue: Field,
    pub(super) title: Field,
    pub(super) question: Field,
    pub(super) prepared: Field,
    pub(super) checked: Field,
    pub(super) approved: Field,
    pub(super) organisation: Field,
    pub(super) left_out: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Units {
    pub(super) length: Field,
    pub(super) capacitance: Field,
    pub(super) field: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Surroundings {
    pub(super) relative_permittivity: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Electrode {
    pub(super) name: Field,
    pub(super) shape: Field,
    pub(super) shell: Field,
    pub(super) role: Field,
    pub(super) follows: Field,
    pub(super) sheet: Field,
    pub(super) crease_angle: Field,
    pub(super) surface: Field,
    pub(super) field_limit: Field,
    pub(super) size_check: Field,
    pub(super) place: Option<Place>,
    pub(super) drawing: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Place {
    pub(super) shift: Field,
    #[serde(default)]
    pub(super) rotate: Rotations,
    pub(super) scale: Field,
}

/// One rotation or a list of them.
#[derive(Debug, Default)]
pub(super) struct Rotations(pub(super) Vec<Spanned<Rotate>>);

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Rotate {
    pub(super) axis: Field,
    pub(super) angle: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Bond {
    pub(super) members: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct EarthPlane {
    pub(super) name: Field,
    pub(super) through: Field,
    pub(super) facing: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct VoltageCase {
    pub(super) name: Field,
    pub(super) value_is: Field,
    #[serde(default)]
    pub(super) potentials: Pairs,
    #[serde(default)]
    pub(super) charges: Pairs,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Look {
    pub(super) name: Field,
    pub(super) point: Field,
    pub(super) line: Option<Spanned<Line>>,
    pub(super) sheet: Option<Spanned<Sheet>>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Line {
    pub(super) from: Field,
    pub(super) to: Field,
    pub(super) points: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Sheet {
    pub(super) corner: Field,
    pub(super) along: Field,
    pub(super) across: Field,
    pub(super) points: Field,
}

#[derive(Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Accuracy {
    pub(super) capacitance: Field,
    pub(super) max_field: Field,
    pub(super) max_panels: Field,
    pub(super) time_limit: Field,
    pub(super) memory_limit: Field,
    pub(super) threads: Field,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Deliver {
    pub(super) folder: Field,
    pub(super) record: Field,
    pub(super) answers: Field,
    pub(super) matrix: Field,
    pub(super) netlist: Field,
}

/// The file as written; `table` holds known words only.
///
/// # Errors
/// Those of `toml`, with their place in the text.
pub(super) fn parse(table: Spanned<toml::de::DeTable<'_>>) -> Result<File, toml::de::Error> {
    File::deserialize(toml::Deserializer::from(table))
}

impl<'de> Deserialize<'de> for Value {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(ValueVisitor)
    }
}

struct ValueVisitor;

impl<'de> de::Visitor<'de> for ValueVisitor {
    type Value = Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a text, a number, a list or a flag")
    }

    fn visit_str<E>(self, text: &str) -> Result<Value, E> {
        Ok(Value::Text(text.to_owned()))
    }

    fn visit_i64<E>(self, number: i64) -> Result<Value, E> {
        Ok(Value::Whole(number))
    }

    fn visit_f64<E>(self, number: f64) -> Result<Value, E> {
        Ok(Value::Number(number))
    }

    fn visit_bool<E>(self, flag: bool) -> Result<Value, E> {
        Ok(Value::Flag(flag))
    }

    fn visit_seq<A: de::SeqAccess<'de>>(self, mut seq: A) -> Result<Value, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = seq.next_element()? {
            list.push(item);
        }
        Ok(Value::List(list))
    }

    fn visit_map<A: de::MapAccess<'de>>(self, mut map: A) -> Result<Value, A::Error> {
        while map.next_entry::<de::IgnoredAny, de::IgnoredAny>()?.is_some() {}
        Ok(Value::Other)
    }
}

impl<'de> Deserialize<'de> for Pairs {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_map(PairsVisitor)
    }
}

struct PairsVisitor;

impl<'de> de::Visitor<'de> for PairsVisitor {
    type Value = Pairs;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a table of names with values")
    }

    fn visit_map<A: de::MapAccess<'de>>(self, mut map: A) -> Result<Pairs, A::Error> {
        let mut pairs: Vec<(Spanned<String>, Spanned<Value>)> = Vec::new();
        while let Some(entry) = map.next_entry()? {
            pairs.push(entry);
        }
        pairs.sort_by_key(|(name, _)| name.span().start);
        Ok(Pairs(pairs))
    }
}

impl<'de> Deserialize<'de> for Rotations {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        let value: Spanned<OneOrMany> = Deserialize::deserialize(deserializer)?;
        let span = value.span();
        Ok(Rotations(match value.into_inner() {
            OneOrMany::One(rotate) => vec![Spanned::new(span, rotate)],
            OneOrMany::Many(list) => list,
        }))
    }
}

enum OneOrMany {
    One(Rotate),
    Many(Vec<Spanned<Rotate>>),
}

impl<'de> Deserialize<'de> for OneOrMany {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(RotationsVisitor)
    }
}

struct RotationsVisitor;

impl<'de> de::Visitor<'de> for RotationsVisitor {
    type Value = OneOrMany;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a rotation or a list of rotations")
    }

    fn visit_seq<A: de::SeqAccess<'de>>(self, seq: A) -> Result<OneOrMany, A::Error> {
        Deserialize::deserialize(de::value::SeqAccessDeserializer::new(seq)).map(OneOrMany::Many)
    }

    fn visit_map<A: de::MapAccess<'de>>(self, map: A) -> Result<OneOrMany, A::Error> {
        Deserialize::deserialize(de::value::MapAccessDeserializer::new(map)).map(OneOrMany::One)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::case::words;
    use std::collections::BTreeSet;

    /// The words serde expects, taken from its own message about an unknown one.
    fn expected<T: for<'a> Deserialize<'a>>() -> BTreeSet<String> {
        let message = match toml::from_str::<T>("zz_zz = 1") {
            Ok(_) => panic!("an unknown word must be refused"),
            Err(error) => error.message().to_owned(),
        };
        message.split('`').skip(3).step_by(2).map(str::to_owned).collect()
    }

    fn agree<T: for<'a> Deserialize<'a>>(words: &words::Words) {
        let table: BTreeSet<String> = words.known.iter().map(|(word, _)| (*word).to_owned()).collect();
        assert_eq!(table, expected::<T>(), "{}", words.table);
    }

    #[test]
    fn the_key_tables_are_the_wire_types() {
        agree::<File>(&words::FILE);
        agree::<Study>(&words::STUDY);
        agree::<Units>(&words::UNITS);
        agree::<Surroundings>(&words::SURROUNDINGS);
        agree::<Electrode>(&words::ELECTRODE);
        agree::<Place>(&words::PLACE);
        agree::<Rotate>(&words::ROTATE);
        agree::<Bond>(&words::BOND);
        agree::<EarthPlane>(&words::EARTH_PLANE);
        agree::<VoltageCase>(&words::VOLTAGE_CASE);
        agree::<Look>(&words::LOOK);
        agree::<Line>(&words::LINE);
        agree::<Sheet>(&words::SHEET);
        agree::<Accuracy>(&words::ACCURACY);
        agree::<Deliver>(&words::DELIVER);
    }
}
