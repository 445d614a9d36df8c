//! The words a case file may hold, and the check of a parsed file against them.

use crate::case::fault::Fault;
use crate::case::fault::Sink;
use toml::Spanned;
use toml::de::DeArray;
use toml::de::DeTable;
use toml::de::DeValue;

/// What stands behind a word.
pub(super) enum Holds {
    /// A text, number, list or flag.
    Value,
    /// Free names with values.
    Map,
    /// A table.
    Table(&'static Words),
    /// A table or a list of tables, written inline.
    OneOrMany(&'static Words),
    /// Repeated tables, `[[word]]`.
    Tables(&'static Words),
}

/// The words of one table.
pub(super) struct Words {
    /// How messages name the table.
    pub(super) table: &'static str,
    /// Words that are read.
    pub(super) known: &'static [(&'static str, Holds)],
    /// Words of later versions: refused, and named as such.
    pub(super) planned: &'static [&'static str],
}

/// The file itself.
pub(super) static FILE: Words = Words {
    table: "the file",
    known: &[
        ("study", Holds::Table(&STUDY)),
        ("units", Holds::Table(&UNITS)),
        ("surroundings", Holds::Table(&SURROUNDINGS)),
        ("electrode", Holds::Tables(&ELECTRODE)),
        ("bond", Holds::Tables(&BOND)),
        ("earth_plane", Holds::Tables(&EARTH_PLANE)),
        ("voltage_case", Holds::Tables(&VOLTAGE_CASE)),
        ("look", Holds::Tables(&LOOK)),
        ("accuracy", Holds::Table(&ACCURACY)),
        ("deliver", Holds::Table(&DELIVER)),
    ],
    planned: &[
        "wire",
        "copies",
        "mirror",
        "dielectric",
        "node",
        "fitted_capacitor",
        "stack",
        "hookup",
        "inception_check",
        "spring",
        "tolerance",
        "sweep",
        "setpoint",
    ],
};

pub(super) static STUDY: Words = Words {
    table: "[study]",
    known: &[
        ("number", Holds::Value),
        ("issue", Holds::Value),
        ("title", Holds::Value),
        ("question", Holds::Value),
        ("prepared", Holds::Value),
        ("checked", Holds::Value),
        ("approved", Holds::Value),
        ("organisation", Holds::Value),
        ("left_out", Holds::Value),
    ],
    planned: &[],
};

pub(super) static UNITS: Words = Words {
    table: "[units]",
    known: &[("length", Holds::Value), ("capacitance", Holds::Value), ("field", Holds::Value)],
    planned: &[],
};

pub(super) static SURROUNDINGS: Words = Words {
    table: "[surroundings]",
    known: &[("relative_permittivity", Holds::Value)],
    planned: &["medium", "pressure", "temperature", "humidity", "altitude"],
};

pub(super) static ELECTRODE: Words = Words {
    table: "[[electrode]]",
    known: &[
        ("name", Holds::Value),
        ("shape", Holds::Value),
        ("shell", Holds::Value),
        ("role", Holds::Value),
        ("follows", Holds::Value),
        ("sheet", Holds::Value),
        ("crease_angle", Holds::Value),
        ("surface", Holds::Value),
        ("field_limit", Holds::Value),
        ("size_check", Holds::Value),
        ("place", Holds::Table(&PLACE)),
        ("drawing", Holds::Value),
    ],
    planned: &["edge_radius"],
};

pub(super) static PLACE: Words = Words {
    table: "place",
    known: &[("shift", Holds::Value), ("rotate", Holds::OneOrMany(&ROTATE)), ("scale", Holds::Value)],
    planned: &[],
};

pub(super) static ROTATE: Words =
    Words { table: "rotate", known: &[("axis", Holds::Value), ("angle", Holds::Value)], planned: &[] };

pub(super) static BOND: Words =
    Words { table: "[[bond]]", known: &[("members", Holds::Value)], planned: &[] };

pub(super) static EARTH_PLANE: Words = Words {
    table: "[[earth_plane]]",
    known: &[("name", Holds::Value), ("through", Holds::Value), ("facing", Holds::Value)],
    planned: &[],
};

pub(super) static VOLTAGE_CASE: Words = Words {
    table: "[[voltage_case]]",
    known: &[
        ("name", Holds::Value),
        ("value_is", Holds::Value),
        ("potentials", Holds::Map),
        ("charges", Holds::Map),
    ],
    planned: &["phases", "wave", "held"],
};

pub(super) static LOOK: Words = Words {
    table: "[[look]]",
    known: &[
        ("name", Holds::Value),
        ("point", Holds::Value),
        ("line", Holds::Table(&LINE)),
        ("sheet", Holds::Table(&SHEET)),
    ],
    planned: &[],
};

pub(super) static LINE: Words = Words {
    table: "line",
    known: &[("from", Holds::Value), ("to", Holds::Value), ("points", Holds::Value)],
    planned: &[],
};

pub(super) static SHEET: Words = Words {
    table: "sheet",
    known: &[
        ("corner", Holds::Value),
        ("along", Holds::Value),
        ("across", Holds::Value),
        ("points", Holds::Value),
    ],
    planned: &[],
};

pub(super) static ACCURACY: Words = Words {
    table: "[accuracy]",
    known: &[
        ("capacitance", Holds::Value),
        ("max_field", Holds::Value),
        ("max_panels", Holds::Value),
        ("time_limit", Holds::Value),
        ("memory_limit", Holds::Value),
        ("threads", Holds::Value),
    ],
    planned: &[],
};

pub(super) static DELIVER: Words = Words {
    table: "[deliver]",
    known: &[
        ("folder", Holds::Value),
        ("record", Holds::Value),
        ("answers", Holds::Value),
        ("matrix", Holds::Value),
        ("netlist", Holds::Value),
    ],
    planned: &["touchstone", "plots", "report"],
};

/// Similarity (Jaro and Winkler) from which a known word is offered [1].
///
/// Words with one letter dropped, doubled, swapped or wrong score 0.85 and more against the word
/// meant in all tables above; unrelated words of the same table stay below 0.75.
const NEAR_ENOUGH: f64 = 0.8;

/// The candidate most like `word`, if one is like it.
pub(super) fn nearest<'a>(word: &str, candidates: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    let plain = word.to_lowercase().replace(['-', ' '], "_");
    candidates
        .map(|known| (strsim::jaro_winkler(&plain, &known.to_lowercase()), known))
        .filter(|(likeness, _)| NEAR_ENOUGH <= *likeness)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, known)| known)
}

/// Takes out of `table` what is not in `words`, with a fault for each thing taken.
pub(super) fn prune<'i>(table: &mut DeTable<'i>, words: &'static Words, sink: &mut Sink) {
    for (key, mut value) in std::mem::replace(table, DeTable::new()) {
        let word: &str = key.get_ref();
        if let Some((known, holds)) = words.known.iter().find(|(known, _)| *known == word) {
            if fits(known, &mut value, holds, sink) {
                table.insert(key, value);
            }
            continue;
        }
        let fault = if words.planned.contains(&word) {
            Fault::Planned { word: word.to_owned(), table: words.table }
        } else {
            let known = words.known.iter().map(|(known, _)| *known);
            Fault::UnknownWord {
                word: word.to_owned(),
                table: words.table,
                nearest: nearest(word, known.clone()),
                known: known.collect(),
            }
        };
        sink.note(key.span(), fault);
    }
}

/// Whether `value` has the form of `holds`; what it holds is pruned in turn.
fn fits<'i>(
    word: &'static str,
    value: &mut Spanned<DeValue<'i>>,
    holds: &'static Holds,
    sink: &mut Sink,
) -> bool {
    let span = value.span();
    let wanted = match (holds, value.get_mut()) {
        (Holds::Value, DeValue::Table(_)) => "a text, a number or a list, not a table",
        (Holds::Value, _) | (Holds::Map, DeValue::Table(_)) => return true,
        (Holds::Table(words) | Holds::OneOrMany(words), DeValue::Table(table)) => {
            prune(table, words, sink);
            return true;
        }
        (Holds::Tables(words) | Holds::OneOrMany(words), DeValue::Array(list)) => {
            let items = std::mem::replace(list, DeArray::new());
            *list = items.into_iter().filter_map(|item| pruned_item(word, item, words, sink)).collect();
            return true;
        }
        (Holds::Map, _) => "a table such as { ball = \"100 kV\" }",
        (Holds::Table(words), _) if words.table.starts_with('[') => {
            "a table of its own: the word in brackets on one line, what it holds below"
        }
        (Holds::Table(_), _) => "a table in braces, { word = value, … }",
        (Holds::OneOrMany(_), _) => ROTATE_FORM,
        (Holds::Tables(_), _) => "tables with the word in double brackets, [[…]], one for each",
    };
    sink.note(span, Fault::Form { word: word.to_owned(), wanted });
    false
}

const ROTATE_FORM: &str = "a table { axis = [0, 0, 1], angle = \"30 deg\" }, or a list of such tables";

/// One item of a list of tables; none, with a fault, if it is no table.
fn pruned_item<'i>(
    word: &'static str,
    mut item: Spanned<DeValue<'i>>,
    words: &'static Words,
    sink: &mut Sink,
) -> Option<Spanned<DeValue<'i>>> {
    if let DeValue::Table(table) = item.get_mut() {
        prune(table, words, sink);
        return Some(item);
    }
    sink.note(item.span(), Fault::Form { word: word.to_owned(), wanted: "a list of tables only" });
    None
}
