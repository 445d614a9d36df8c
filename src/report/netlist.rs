//! A subcircuit of capacitors, as circuit simulators of the SPICE family read it.
//!
//! Pins are the rows in the order of the record, `earth` last.  No element is negative; what is
//! left out is listed with its digits, so the matrix can be put together again.

use crate::record::Record;
use crate::record::cautions::CHARGED;
use crate::record::cautions::ESTIMATE;
use crate::report::form::REFERENCE;
use crate::report::form::clean;
use crate::report::form::title;
use crate::report::tables;
use std::collections::BTreeSet;
use std::io;
use std::io::Write;

/// Resistance that gives a floating node a path for direct current [Ω].
///
/// With 1 pF its time constant is 1000 s: it draws the operating point to earth and does nothing
/// above a millihertz.
const BLEED: &str = "1e15";

/// Longest line of pins before it is continued [1].
const LINE: usize = 72;

/// Names that mean the common node to simulators, or the last pin here.
const RESERVED: [&str; 3] = ["0", "gnd", "earth"];

/// How to write a subcircuit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Options {
    /// Name of the subcircuit, mapped as the names of pins are.
    pub name: String,
    /// A bleed resistor at each floating electrode.
    pub bleeds: bool,
}

/// One capacitor that might be written.
struct Element {
    label: String,
    nodes: [String; 2],
    between: String,
    value: f64,
    bar: f64,
}

/// Writes the subcircuit.
///
/// Values have 17 significant digits.  An entry smaller than its bar, or not positive, is left out
/// and listed; one that is negative beyond its bar is listed with a warning.
///
/// # Errors
/// Those of `out`.
pub fn write(record: &Record, options: &Options, out: &mut dyn Write) -> io::Result<()> {
    let pins = pins(&record.electrodes);
    let name = pins_free_name(&options.name, &pins);
    head(record, &pins, out)?;
    let (kept, dropped): (Vec<Element>, Vec<Element>) =
        elements(record, &pins).into_iter().partition(|e| 0.0 < e.value && e.bar <= e.value);
    list_dropped(&dropped, out)?;
    let floating: Vec<usize> =
        (0..record.rows.len()).filter(|row| record.rows[*row].role == "floating").collect();
    bleed_remarks(&floating, &pins, options.bleeds, out)?;
    subcircuit_line(&name, &pins, out)?;
    for e in &kept {
        writeln!(out, "{} {} {} {:.16e}", e.label, e.nodes[0], e.nodes[1], e.value)?;
    }
    if options.bleeds {
        for row in &floating {
            writeln!(out, "Rbleed_{} {} earth {BLEED}", row + 1, pins[*row])?;
        }
    }
    writeln!(out, ".ends {name}")
}

/// Longest name of a subcircuit taken from a study [1]: half a line, so that it can be typed.
const NAME: usize = 36;

/// A name for the subcircuit: number of the study, else its title, else `otherwise`.
pub fn subcircuit_name(record: &Record, otherwise: &str) -> String {
    let word = |key: &str| record.case.resolved.get(key).map(|text| words_joined(text));
    let given = ["study.number", "study.title"].into_iter().filter_map(word).find(|name| !name.is_empty());
    given.unwrap_or_else(|| otherwise.to_owned())
}

/// Letters and digits of a text, everything between them as one `_`.
fn words_joined(text: &str) -> String {
    let words = text.split(|c: char| !c.is_ascii_alphanumeric()).filter(|word| !word.is_empty());
    let mut name = words.collect::<Vec<&str>>().join("_");
    name.truncate(NAME);
    name.trim_end_matches('_').to_owned()
}

/// Names mapped to `[a-z0-9_]` without clashes, and none of them reserved.
pub fn pins(names: &[String]) -> Vec<String> {
    let mut taken: BTreeSet<String> = RESERVED.iter().map(|name| (*name).to_owned()).collect();
    names.iter().map(|name| unclashing(&mapped(name), &mut taken)).collect()
}

fn unclashing(plain: &str, taken: &mut BTreeSet<String>) -> String {
    let mut name = plain.to_owned();
    let mut count = 2;
    while !taken.insert(name.clone()) {
        name = format!("{plain}_{count}");
        count += 1;
    }
    name
}

fn mapped(name: &str) -> String {
    let letter = |c: char| {
        let c = c.to_ascii_lowercase();
        if c.is_ascii_lowercase() || c.is_ascii_digit() { c } else { '_' }
    };
    let text: String = name.chars().map(letter).collect();
    // A node of digits alone reads as a number, and one of zeros as the common node.
    if text.chars().all(|c| c.is_ascii_digit()) { format!("n{text}") } else { text }
}

fn pins_free_name(name: &str, pins: &[String]) -> String {
    let mut taken = pins.iter().cloned().collect();
    unclashing(&mapped(name), &mut taken)
}

fn head(record: &Record, pins: &[String], out: &mut dyn Write) -> io::Result<()> {
    writeln!(out, "* {}", title(record))?;
    writeln!(
        out,
        "* capacitances between the electrodes and to earth [F], each smaller than its bar left out"
    )?;
    writeln!(out, "* reference: {REFERENCE}; pin `earth` is that reference")?;
    writeln!(
        out,
        "* {} {}, case sha256 {}",
        clean(&record.program.name),
        clean(&record.program.version),
        clean(&record.case.sha256)
    )?;
    writeln!(out, "* verdict {}: {ESTIMATE}", tables::judged(&record.verdict.word))?;
    for (name, pin) in record.electrodes.iter().zip(pins) {
        for case in record.voltage_cases.iter().filter(|case| case.floating.contains(name)) {
            writeln!(out, "* {pin} in `{}`: {}", clean(&case.name), tables::floating_text(case, name))?;
        }
    }
    writeln!(out, "* {CHARGED}")?;
    for (name, pin) in record.electrodes.iter().zip(pins) {
        writeln!(out, "* pin {pin} is electrode `{}`", clean(name))?;
    }
    writeln!(out, "* pin earth is earth and surroundings")
}

fn elements(record: &Record, pins: &[String]) -> Vec<Element> {
    let mut all = Vec::new();
    let names: Vec<String> = record.electrodes.iter().map(|name| clean(name)).collect();
    for i in 0..pins.len() {
        for j in i + 1..pins.len() {
            all.push(Element {
                label: format!("C{}_{}", i + 1, j + 1),
                nodes: [pins[i].clone(), pins[j].clone()],
                between: format!("`{}` and `{}`", names[i], names[j]),
                value: record.mutual_farad[i][j],
                bar: record.mutual_bar_farad[i][j],
            });
        }
    }
    for i in 0..pins.len() {
        all.push(Element {
            label: format!("C{}_0", i + 1),
            nodes: [pins[i].clone(), "earth".to_owned()],
            between: format!("`{}` and earth", names[i]),
            value: record.earth_farad[i],
            bar: record.earth_bar_farad[i],
        });
    }
    all
}

fn list_dropped(dropped: &[Element], out: &mut dyn Write) -> io::Result<()> {
    for e in dropped {
        let reason = if e.value < -e.bar {
            "WARNING: negative beyond its bar, check the result before use"
        } else {
            "smaller than its bar"
        };
        writeln!(
            out,
            "* left out: {} {} {} {:.16e} bar {:.1e} {reason}; between {}",
            e.label, e.nodes[0], e.nodes[1], e.value, e.bar, e.between
        )?;
    }
    Ok(())
}

fn bleed_remarks(floating: &[usize], pins: &[String], bleeds: bool, out: &mut dyn Write) -> io::Result<()> {
    for row in floating {
        let (pin, count) = (&pins[*row], row + 1);
        let remark = if bleeds {
            format!(
                "Rbleed_{count}, {BLEED} ohm from {pin} to earth, gives the floating node an operating point; may be deleted"
            )
        } else {
            format!("{pin} floats and has no bleed resistor: the simulator may want one to earth")
        };
        writeln!(out, "* {remark}")?;
    }
    Ok(())
}

/// The `.subckt` line, continued with `+` where it is long.
fn subcircuit_line(name: &str, pins: &[String], out: &mut dyn Write) -> io::Result<()> {
    let mut line = format!(".subckt {name}");
    for pin in pins.iter().map(String::as_str).chain(["earth"]) {
        if LINE < line.len() + 1 + pin.len() {
            writeln!(out, "{line}")?;
            line = "+".to_owned();
        }
        line = format!("{line} {pin}");
    }
    writeln!(out, "{line}")
}
