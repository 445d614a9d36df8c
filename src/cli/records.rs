//! The verbs that answer from a record: `matrix`, `stress`, `netlist`.

use crate::cli;
use crate::cli::args;
use crate::cli::failure::Failure;
use crate::cli::show::Show;
use crate::record::Record;
use crate::record::cautions;
use crate::record::store;
use crate::report::Form;
use crate::report::csv;
use crate::report::digits;
use crate::report::file;
use crate::report::json;
use crate::report::netlist;
use crate::report::printing;
use crate::report::tables;
use serde_json::Value;
use std::io;
use std::path::Path;

/// Prints one form of the matrix, or all.
///
/// # Errors
/// [`Failure`]: the record cannot be read, or standard output not written.
pub(super) fn matrix(args: &args::Matrix, show: &Show) -> Result<u8, Failure> {
    let record = store::read(&args.record)?;
    let forms = args.form.map_or(Form::ALL.to_vec(), |word| vec![word.form()]);
    if show.json {
        let texts = forms.iter().map(|form| json::matrix_json(&record, *form));
        let values: Vec<Value> = texts.filter_map(|text| serde_json::from_str(&text).ok()).collect();
        let value = match <[Value; 1]>::try_from(values) {
            Ok([only]) => only,
            Err(values) => Value::Array(values),
        };
        show.result(&format!("{value:#}"))?;
    } else if args.csv {
        let text = in_memory(|out| match args.form {
            Some(word) => csv::square(&record, word.form(), out),
            None => csv::long(&record, out),
        })?;
        show.result(&text)?;
    } else {
        let printing = printing::of_record(&record);
        let tables = forms.iter().map(|form| tables::matrix_text(&record, *form, &printing));
        let tables = tables.collect::<Vec<String>>().join("\n");
        show.result(&format!("{}{tables}", tables::head_text(&record)))?;
    }
    if show.json || args.csv {
        say_cautions(&record, show);
    }
    Ok(cli::DONE)
}

/// Prints the highest surface fields.
///
/// # Errors
/// [`Failure`]: the record cannot be read, or standard output not written.
pub(super) fn stress(args: &args::Stress, show: &Show) -> Result<u8, Failure> {
    let record = store::read(&args.record)?;
    if show.json {
        show.result(&json::stress_json(&record))?;
        say_cautions(&record, show);
    } else {
        if record.voltage_cases.is_empty() {
            show.remark(
                "the record has no voltage case, so no field; give the case a [[voltage_case]] and solve it",
            );
        }
        let table = tables::stress_text(&record, &printing::of_record(&record));
        show.result(&format!("{}{table}", tables::head_text(&record)))?;
    }
    Ok(verdict_code(&record, &[cli::CHECK, cli::LIMIT]))
}

/// Prints or writes the subcircuit.
///
/// # Errors
/// [`Failure`]: the record cannot be read, or the netlist not written.
pub(super) fn netlist(args: &args::Netlist, show: &Show) -> Result<u8, Failure> {
    let record = store::read(&args.record)?;
    let stem = args.output.as_deref().and_then(Path::file_stem);
    let stem = stem.map_or("netlist".to_owned(), |stem| stem.to_string_lossy().into_owned());
    let name = netlist::subcircuit_name(&record, &stem);
    let options = netlist::Options { name, bleeds: !args.no_bleed };
    let text = in_memory(|out| netlist::write(&record, &options, out))?;
    if let Some(path) = &args.output {
        if path.exists() && !args.overwrite {
            return Err(Failure::Exists { path: path.clone() });
        }
        file::write_whole(path, text.as_bytes())?;
        show.remark(&format!("written: {}", path.display()));
    }
    if show.json {
        let mut pins = netlist::pins(&record.electrodes);
        pins.push("earth".to_owned());
        let mut value = json::head(&record);
        value["netlist"] = Value::from(text);
        value["electrodes"] = Value::from(record.electrodes.clone());
        value["pins"] = Value::from(pins);
        show.result(&format!("{value:#}"))?;
    } else if args.output.is_none() {
        show.result(&text)?;
    }
    say_cautions(&record, show);
    Ok(cli::DONE)
}

/// The cautions that go with a record, as remarks: results piped on keep their own copies.
pub(super) fn say_cautions(record: &Record, show: &Show) {
    show.remark(&format!("caution: {}", cautions::ESTIMATE));
    for case in &record.voltage_cases {
        for name in &case.floating {
            let bar = case.potentials_bar_volt.get(name).copied().unwrap_or(0.0);
            let Some(volts) = case.potentials_volt.get(name) else { continue };
            let at = cautions::floats_at(&digits::engineering(*volts, bar, "V"));
            show.remark(&format!("caution: {name}, {}: {at}", case.name));
        }
    }
    if !record.voltage_cases.is_empty() {
        show.remark(&format!("caution: {}", cautions::CHARGED));
    }
}

/// The first of `codes`, most severe first, that the verdict of a record holds.
pub(super) fn verdict_code(record: &Record, codes: &[u8]) -> u8 {
    let held = |code: &&u8| record.verdict.codes.contains(&i32::from(**code));
    codes.iter().find(held).copied().unwrap_or(cli::DONE)
}

fn in_memory(write: impl FnOnce(&mut dyn io::Write) -> io::Result<()>) -> Result<String, Failure> {
    let mut bytes = Vec::new();
    write(&mut bytes).map_err(Failure::Output)?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}
