//! The three forms of the matrix, with the words that go over every table of them.

use crate::record::Matrix;
use crate::record::Record;

/// What every table is counted from.
pub const REFERENCE: &str = "earth planes and infinity are the 0 V reference";

/// A form of the capacitance matrix.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// Charge per volt, the other electrodes at 0 V.
    Maxwell,
    /// Two-terminal capacitances and those to earth.
    Mutual,
    /// Potential per charge, the others uncharged.
    PotentialCoefficients,
}

impl Form {
    /// All forms.
    pub const ALL: [Form; 3] = [Form::Maxwell, Form::Mutual, Form::PotentialCoefficients];

    /// The word for it on a command line and in JSON: `charge_per_volt`, `mutual`, `potential`.
    pub fn word(self) -> &'static str {
        match self {
            Form::Maxwell => "charge_per_volt",
            Form::Mutual => "mutual",
            Form::PotentialCoefficients => "potential",
        }
    }

    /// The form of that [`Form::word`].
    pub fn from_word(word: &str) -> Option<Form> {
        Form::ALL.into_iter().find(|form| form.word() == word)
    }

    /// Name of the kind, as printed over a table.
    pub fn kind(self) -> &'static str {
        match self {
            Form::Maxwell => "Maxwell capacitance matrix (charge per volt)",
            Form::Mutual => "Mutual (two-terminal) capacitances, with those to earth and surroundings",
            Form::PotentialCoefficients => "Potential coefficients (volt per charge)",
        }
    }

    /// The sign rule, as printed over a table.
    pub fn sign_rule(self) -> &'static str {
        match self {
            Form::Maxwell => "Q_i = sum over j of C_ij V_j, row i carries the charge; C_ii > 0, C_ij <= 0",
            Form::Mutual => {
                "c_ij = -C_ij >= 0 between two electrodes; to earth c_i0 = sum over j of C_ij >= 0"
            }
            Form::PotentialCoefficients => {
                "V_i = sum over j of p_ij Q_j, the inverse of the Maxwell capacitance matrix (charge per volt); p_ij >= 0"
            }
        }
    }

    /// The matrix of this form and its bars [F, or 1/F].
    pub fn of(self, record: &Record) -> (&Matrix, &Matrix) {
        match self {
            Form::Maxwell => (&record.capacitance_farad, &record.capacitance_bar_farad),
            Form::Mutual => (&record.mutual_farad, &record.mutual_bar_farad),
            Form::PotentialCoefficients => {
                (&record.potential_coefficients_per_farad, &record.potential_coefficients_bar_per_farad)
            }
        }
    }
}

/// A text from a case without line breaks or other control characters, so that it cannot end a
/// comment or a table line.
pub fn clean(text: &str) -> String {
    text.chars().map(|c| if c.is_control() || c == '\u{2028}' || c == '\u{2029}' { ' ' } else { c }).collect()
}

/// Title of a study: its title, number and issue as far as given.
pub fn title(record: &Record) -> String {
    let word = |key: &str| record.case.resolved.get(key).map(|t| clean(t)).filter(|t| !t.trim().is_empty());
    let mut title = word("study.title").unwrap_or_else(|| "Untitled study".to_owned());
    if let Some(number) = word("study.number") {
        title = format!("{number}  {title}");
    }
    if let Some(issue) = word("study.issue") {
        title = format!("{title} (issue {issue})");
    }
    title
}
