//! Units of printed numbers.

use crate::record::Record;

/// Units of printed numbers: names, and the SI value of one unit.
#[derive(Clone, Debug, PartialEq)]
pub struct Printing {
    /// Name of the length unit.
    pub length_name: String,
    /// Metres in one printed unit [m].
    pub length: f64,
    /// Name of the capacitance unit.
    pub capacitance_name: String,
    /// Farads in one printed unit [F].
    pub capacitance: f64,
    /// Name of the field unit.
    pub field_name: String,
    /// Volts per metre in one printed unit [V/m].
    pub field: f64,
}

impl Default for Printing {
    /// Millimetres, picofarads, kilovolts per millimetre.
    fn default() -> Self {
        Printing {
            length_name: "mm".to_owned(),
            length: 1e-3,
            capacitance_name: "pF".to_owned(),
            capacitance: 1e-12,
            field_name: "kV/mm".to_owned(),
            field: 1e6,
        }
    }
}

/// The units the case of a record asked for; those of [`Printing::default`] where it names none.
///
/// Read from the words `units.length`, `units.capacitance` and `units.field` of the resolved case.
pub fn of_record(record: &Record) -> Printing {
    let mut printing = Printing::default();
    let word = |key: &str| record.case.resolved.get(key).map(|text| text.trim().trim_matches('"').to_owned());
    if let Some((name, si)) = word("units.length").and_then(|name| known(name, LENGTHS)) {
        (printing.length_name, printing.length) = (name, si);
    }
    if let Some((name, si)) = word("units.capacitance").and_then(|name| known(name, CAPACITANCES)) {
        (printing.capacitance_name, printing.capacitance) = (name, si);
    }
    if let Some((name, si)) = word("units.field").and_then(|name| known(name, FIELDS)) {
        (printing.field_name, printing.field) = (name, si);
    }
    printing
}

type Units = &'static [(&'static str, f64)];

const LENGTHS: Units =
    &[("m", 1.0), ("cm", 1e-2), ("mm", 1e-3), ("um", 1e-6), ("µm", 1e-6), ("nm", 1e-9), ("in", 25.4e-3)];
const CAPACITANCES: Units = &[
    ("F", 1.0),
    ("mF", 1e-3),
    ("uF", 1e-6),
    ("µF", 1e-6),
    ("nF", 1e-9),
    ("pF", 1e-12),
    ("fF", 1e-15),
    ("aF", 1e-18),
];
const FIELDS: Units = &[
    ("V/m", 1.0),
    ("kV/m", 1e3),
    ("MV/m", 1e6),
    ("V/cm", 1e2),
    ("kV/cm", 1e5),
    ("V/mm", 1e3),
    ("kV/mm", 1e6),
    ("V/um", 1e6),
    ("V/µm", 1e6),
];

fn known(name: String, units: Units) -> Option<(String, f64)> {
    let si = units.iter().find(|(known, _)| *known == name)?.1;
    Some((name, si))
}
