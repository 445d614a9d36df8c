//! Unit names to SI factors, and quantities such as `100 kV` to numbers.
//!
//! Names are written as the SI Brochure (BIPM, 9th edition, 2019) writes them; `µ` may also be typed
//! as `u`.  Upper and lower case differ: `mV` is not `MV`.

use std::fmt;

/// What a quantity measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimension {
    /// Length [m].
    Length,
    /// Potential [V].
    Potential,
    /// Capacitance [F].
    Capacitance,
    /// Charge [C].
    Charge,
    /// Electric field strength [V/m].
    Field,
    /// Time [s].
    Time,
    /// Memory [B].
    Memory,
    /// Plane angle [rad].
    Angle,
    /// A share of something [1].
    Ratio,
}

/// Why a text is no quantity.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum UnitError {
    /// Nothing was written.
    #[error("no {dimension} given; write a number and a unit, one of {}", names(*.dimension))]
    Empty {
        /// What was expected.
        dimension: Dimension,
    },
    /// The text does not start with a number.
    #[error(
        "`{text}` does not start with a number; write a {dimension} as a number with a decimal point and a unit, one of {}",
        names(*.dimension)
    )]
    NoNumber {
        /// The text.
        text: String,
        /// What was expected.
        dimension: Dimension,
    },
    /// A number without a unit.
    #[error("`{text}` has no unit; a {dimension} takes one of {}", names(*.dimension))]
    NoUnit {
        /// The text.
        text: String,
        /// What was expected.
        dimension: Dimension,
    },
    /// A comma where a point belongs.
    #[error("`{text}` holds a comma; write the decimal point as `.`, and no separators between digits")]
    Comma {
        /// The text.
        text: String,
    },
    /// The unit is not one of this dimension.
    #[error("`{unit}` is no unit of {dimension} here; accepted are {}", names(*.dimension))]
    UnknownUnit {
        /// The unit as written.
        unit: String,
        /// What was expected.
        dimension: Dimension,
    },
    /// The number is too large for a double.
    #[error("`{text}` is not a finite number")]
    NotFinite {
        /// The text.
        text: String,
    },
}

/// SI value of a quantity such as `100 kV` [SI unit of `dimension`].
///
/// A number with a decimal point, optional blanks, a unit name of [`accepted`].
///
/// # Errors
/// [`UnitError`], which lists the accepted units.
pub fn parse_quantity(text: &str, dimension: Dimension) -> Result<f64, UnitError> {
    let text = text.trim();
    if text.is_empty() {
        return Err(UnitError::Empty { dimension });
    }
    let (number, unit) = text.split_at(number_length(text));
    let unit = unit.trim_start();
    if unit.starts_with(',') || number.is_empty() && text.contains(',') {
        return Err(UnitError::Comma { text: text.to_owned() });
    }
    let Ok(number) = number.parse::<f64>() else {
        return Err(UnitError::NoNumber { text: text.to_owned(), dimension });
    };
    if unit.is_empty() {
        return Err(UnitError::NoUnit { text: text.to_owned(), dimension });
    }
    let value = number * factor(unit, dimension)?;
    if !value.is_finite() {
        return Err(UnitError::NotFinite { text: text.to_owned() });
    }
    Ok(value)
}

/// SI value of one unit of that name [SI unit of `dimension`].
///
/// # Errors
/// [`UnitError::UnknownUnit`], which lists the accepted units.
pub fn factor(name: &str, dimension: Dimension) -> Result<f64, UnitError> {
    // Three characters are in use: micro sign U+00B5, Greek mu U+03BC and the letter u.
    let plain = name.replace(['µ', 'μ'], "u");
    accepted(dimension)
        .iter()
        .find(|(known, _)| *known == plain)
        .map(|(_, factor)| *factor)
        .ok_or_else(|| UnitError::UnknownUnit { unit: name.to_owned(), dimension })
}

/// The units of a dimension: name and SI factor [SI unit of `dimension`].
pub fn accepted(dimension: Dimension) -> &'static [(&'static str, f64)] {
    match dimension {
        // The inch is 25.4 mm exactly (international yard and pound agreement, 1959).
        Dimension::Length => &[
            ("m", 1.0),
            ("cm", 1e-2),
            ("mm", 1e-3),
            ("um", 1e-6),
            ("nm", 1e-9),
            ("km", 1e3),
            ("in", 25.4e-3),
        ],
        Dimension::Potential => &[("V", 1.0), ("kV", 1e3), ("MV", 1e6), ("mV", 1e-3), ("uV", 1e-6)],
        Dimension::Capacitance => &[
            ("F", 1.0),
            ("mF", 1e-3),
            ("uF", 1e-6),
            ("nF", 1e-9),
            ("pF", 1e-12),
            ("fF", 1e-15),
            ("aF", 1e-18),
        ],
        Dimension::Charge => &[
            ("C", 1.0),
            ("mC", 1e-3),
            ("uC", 1e-6),
            ("nC", 1e-9),
            ("pC", 1e-12),
            ("fC", 1e-15),
            ("aC", 1e-18),
        ],
        Dimension::Field => &[
            ("V/m", 1.0),
            ("kV/m", 1e3),
            ("MV/m", 1e6),
            ("V/cm", 1e2),
            ("kV/cm", 1e5),
            ("MV/cm", 1e8),
            ("V/mm", 1e3),
            ("kV/mm", 1e6),
            ("V/um", 1e6),
        ],
        Dimension::Time => &[("s", 1.0), ("ms", 1e-3), ("min", 60.0), ("h", 3600.0), ("d", 86400.0)],
        // Decimal prefixes as the SI has them, binary ones as IEC 80000-13 has them.
        Dimension::Memory => &[
            ("B", 1.0),
            ("kB", 1e3),
            ("MB", 1e6),
            ("GB", 1e9),
            ("TB", 1e12),
            ("KiB", 1024.0),
            ("MiB", 1_048_576.0),
            ("GiB", 1_073_741_824.0),
            ("TiB", 1_099_511_627_776.0),
        ],
        Dimension::Angle => &[
            ("deg", std::f64::consts::PI / 180.0),
            ("°", std::f64::consts::PI / 180.0),
            ("rad", 1.0),
            ("mrad", 1e-3),
        ],
        Dimension::Ratio => &[("%", 1e-2), ("ppm", 1e-6)],
    }
}

/// The accepted unit names of a dimension, joined for a message.
pub fn names(dimension: Dimension) -> String {
    let names: Vec<String> = accepted(dimension).iter().map(|(name, _)| format!("`{name}`")).collect();
    names.join(", ")
}

impl fmt::Display for Dimension {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Dimension::Length => "length",
            Dimension::Potential => "potential",
            Dimension::Capacitance => "capacitance",
            Dimension::Charge => "charge",
            Dimension::Field => "field",
            Dimension::Time => "time",
            Dimension::Memory => "memory size",
            Dimension::Angle => "angle",
            Dimension::Ratio => "ratio",
        })
    }
}

/// Bytes of the decimal number at the start of `text`; 0 if there is none.
///
/// An `e` counts as an exponent only before digits, so that a unit may start with that letter.
fn number_length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digits = |from: usize| bytes[from..].iter().take_while(|b| b.is_ascii_digit()).count();
    let sign = |at: usize| usize::from(matches!(bytes.get(at), Some(b'+' | b'-')));
    let mut end = sign(0);
    let whole = digits(end);
    end += whole;
    let mut fraction = 0;
    if bytes.get(end) == Some(&b'.') {
        fraction = digits(end + 1);
        end += 1 + fraction;
    }
    if whole + fraction == 0 {
        return 0;
    }
    if let Some(b'e' | b'E') = bytes.get(end) {
        let start = end + 1 + sign(end + 1);
        let exponent = digits(start);
        if exponent != 0 {
            end = start + exponent;
        }
    }
    end
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    #[expect(clippy::float_cmp, reason = "one product of a number and a factor, rounded once")]
    fn quantities_become_si() {
        let read = |text, dimension| parse_quantity(text, dimension).unwrap();
        assert_eq!(read("100 kV", Dimension::Potential), 1e5);
        assert_eq!(read("-1.5e2kV", Dimension::Potential), -1.5e5);
        assert_eq!(read(" 2.6  kV/mm ", Dimension::Field), 2.6e6);
        assert_eq!(read("10 min", Dimension::Time), 600.0);
        assert_eq!(read("4 GB", Dimension::Memory), 4e9);
        assert_eq!(read("3 µC", Dimension::Charge), read("3 uC", Dimension::Charge));
        assert_eq!(read("3 μC", Dimension::Charge), read("3 uC", Dimension::Charge));
        assert_eq!(read("0.5 %", Dimension::Ratio), 0.005);
        assert!((read("180 deg", Dimension::Angle) - std::f64::consts::PI).abs() < 1e-15);
    }

    #[test]
    fn what_is_no_quantity_is_told_apart() {
        let why = |text: &str| parse_quantity(text, Dimension::Potential).unwrap_err().to_string();
        assert!(why("").contains("no potential given"), "{}", why(""));
        assert!(why("kV").contains("start with a number"), "{}", why("kV"));
        assert!(why("100").contains("has no unit"), "{}", why("100"));
        assert!(why("0,5 kV").contains("comma"), "{}", why("0,5 kV"));
        assert!(why("5 KV").contains("`kV`"), "{}", why("5 KV"));
        assert!(why("1e999 kV").contains("finite"), "{}", why("1e999 kV"));
        for text in ["nan kV", "inf kV", "+", ".", "-.e5", "e", "1e", "−5 kV", "💡"] {
            assert!(parse_quantity(text, Dimension::Potential).is_err(), "{text}");
        }
    }
}
