//! Units of printed numbers.

use crate::base::units;
use crate::base::units::Dimension;
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
    let unit = |key: &str, dimension: Dimension| {
        let name = word(key)?;
        let si = units::factor(&name, dimension).ok()?;
        Some((name, si))
    };
    if let Some((name, si)) = unit("units.length", Dimension::Length) {
        (printing.length_name, printing.length) = (name, si);
    }
    if let Some((name, si)) = unit("units.capacitance", Dimension::Capacitance) {
        (printing.capacitance_name, printing.capacitance) = (name, si);
    }
    if let Some((name, si)) = unit("units.field", Dimension::Field) {
        (printing.field_name, printing.field) = (name, si);
    }
    printing
}
