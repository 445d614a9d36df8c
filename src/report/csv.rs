//! Matrices as comma-separated values: square, and one line an entry.
//!
//! Comment lines start with `#` and stand before the header; lines end with a line feed; numbers
//! have the digits that read back to the same double.  Layout:
//!
//! ```text
//! # Maxwell capacitance matrix (charge per volt)
//! row,charge_per_volt_ball_farad,charge_per_volt_tap_farad
//! ball,6.4155e-12,-1.237e-12
//! ```

use crate::record::Record;
use crate::record::cautions::ESTIMATE;
use crate::report::form::REFERENCE;
use crate::report::form::clean;
use crate::report::form::title;
use crate::report::tables::judged;
use std::io;
use std::io::Write;

pub use crate::report::form::Form;

/// Writes one line a row, row names and unit in the header; mutual capacitances with a column to
/// earth and the earth share.
///
/// # Errors
/// Those of `out`.
pub fn square(record: &Record, form: Form, out: &mut dyn Write) -> io::Result<()> {
    let unit = if form == Form::PotentialCoefficients { "per_farad" } else { "farad" };
    head(record, &[form], &unit.replace('_', " "), out)?;
    let mut header = vec!["row".to_owned()];
    header.extend(record.electrodes.iter().map(|name| format!("{}_{name}_{unit}", form.word())));
    if form == Form::Mutual {
        header.extend(["earth_farad", "earth_share"].map(str::to_owned));
    }
    let mut lines = vec![header];
    for (i, (name, values)) in record.electrodes.iter().zip(form.of(record).0).enumerate() {
        let mut line = vec![name.clone()];
        line.extend(values.iter().map(|v| number(*v)));
        if form == Form::Mutual {
            line.extend([number(record.earth_farad[i]), number(record.earth_share[i])]);
        }
        lines.push(line);
    }
    write_lines(&lines, out)
}

/// Writes one line an entry of every form, with its bar.
///
/// Columns `row, column, kind, value_farad, bar_farad`; potential coefficients stand in
/// `value_per_farad, bar_per_farad`, which other kinds leave empty.
///
/// # Errors
/// Those of `out`.
pub fn long(record: &Record, out: &mut dyn Write) -> io::Result<()> {
    head(record, &Form::ALL, "in the name of the column", out)?;
    let header = ["row", "column", "kind", "value_farad", "bar_farad", "value_per_farad", "bar_per_farad"];
    let mut lines = vec![header.map(str::to_owned).to_vec()];
    let names = &record.electrodes;
    for form in Form::ALL {
        let (values, bars) = form.of(record);
        for (i, row) in names.iter().enumerate() {
            for (j, column) in names.iter().enumerate() {
                // A mutual capacitance of an electrode with itself does not exist.
                if form == Form::Mutual && i == j {
                    continue;
                }
                let pair = [number(values[i][j]), number(bars[i][j])];
                lines.push(entry([row, column, form.word()], pair, form == Form::PotentialCoefficients));
            }
            if form == Form::Mutual {
                let pair = [number(record.earth_farad[i]), number(record.earth_bar_farad[i])];
                lines.push(entry([row, "earth", "earth"], pair, false));
            }
        }
    }
    write_lines(&lines, out)
}

fn entry(names: [&str; 3], pair: [String; 2], inverse: bool) -> Vec<String> {
    let none = [String::new(), String::new()];
    let (first, second) = if inverse { (none, pair) } else { (pair, none) };
    names.map(str::to_owned).into_iter().chain(first).chain(second).collect()
}

/// Title, kind, sign rule, reference, unit and cautions as comment lines.
fn head(record: &Record, forms: &[Form], unit: &str, out: &mut dyn Write) -> io::Result<()> {
    writeln!(out, "# {}", title(record))?;
    for form in forms {
        writeln!(out, "# {} [{}]: {}", form.kind(), form.word(), form.sign_rule())?;
    }
    writeln!(out, "# reference: {REFERENCE}")?;
    writeln!(out, "# unit: {unit}")?;
    writeln!(out, "# verdict {}: {ESTIMATE}", judged(&record.verdict.word))?;
    for caution in &record.cautions {
        writeln!(out, "# caution: {}", clean(caution))?;
    }
    writeln!(out, "# case sha256 {}", clean(&record.case.sha256))
}

fn write_lines(lines: &[Vec<String>], out: &mut dyn Write) -> io::Result<()> {
    let mut writer = ::csv::WriterBuilder::new().from_writer(out);
    for line in lines {
        writer.write_record(line).map_err(io::Error::from)?;
    }
    writer.flush()
}

fn number(value: f64) -> String {
    format!("{value:e}")
}
