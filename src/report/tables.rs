//! Text tables of the matrices and of the surface field.

use crate::record::Edge;
use crate::record::Maximum;
use crate::record::Record;
use crate::record::VoltageCase;
use crate::record::cautions;
use crate::record::cautions::ESTIMATE;
use crate::report::Printing;
use crate::report::digits;
use crate::report::form::Form;
use crate::report::form::REFERENCE;
use crate::report::form::clean;
use crate::report::form::title;
use std::collections::BTreeMap;
use std::f64::consts::SQRT_2;

/// Words of the paper trail, in the order they are printed.
const TRAIL: [(&str, &str); 6] = [
    ("study.question", "question"),
    ("study.prepared", "prepared"),
    ("study.checked", "checked"),
    ("study.approved", "approved"),
    ("study.organisation", "organisation"),
    ("study.left_out", "not modelled"),
];

/// Most unbounded edges printed for one part in one voltage case [1]: those with the highest field at
/// the first stated distance; a body with many creases would fill pages.
const EDGES: usize = 3;

/// Widest table before it goes on below [1].
const WIDTH: usize = 110;

/// One form of the matrix as a table, each entry with its bar and cut to it.
///
/// Whoever prints it alone puts [`head_text`] above it.
pub fn matrix_text(record: &Record, form: Form, printing: &Printing) -> String {
    let (unit, factor) = match form {
        Form::PotentialCoefficients => {
            (format!("1/{}", printing.capacitance_name), 1.0 / printing.capacitance)
        }
        _ => (printing.capacitance_name.clone(), printing.capacitance),
    };
    let names: Vec<String> = record.electrodes.iter().map(|name| clean(name)).collect();
    let (values, bars) = form.of(record);
    let column = |j: usize| -> Vec<String> {
        (0..names.len())
            .map(|i| match form {
                Form::Mutual if i == j => "-".to_owned(),
                _ => digits::cell(values[i][j] / factor, bars[i][j] / factor),
            })
            .collect()
    };
    let mut columns: Vec<(String, Vec<String>)> =
        names.iter().enumerate().map(|(j, name)| (name.clone(), column(j))).collect();
    if form == Form::Mutual {
        let earth = record.earth_farad.iter().zip(&record.earth_bar_farad);
        let cells = earth.map(|(c, bar)| digits::cell(c / factor, bar / factor)).collect();
        columns.push(("to earth".to_owned(), cells));
        let share = record.earth_share.iter().map(|share| digits::percent(*share, false)).collect();
        columns.push(("earth share".to_owned(), share));
    }
    let mut text = format!("{} [{unit}]\n  {}\n", form.kind(), form.sign_rule());
    text += &format!("  reference: {REFERENCE}; behind ± stands the error bar\n");
    if form == Form::Mutual {
        text += "  earth share: to earth, over the charge per volt of the electrode itself\n";
    }
    text + &grid(&names, &columns)
}

/// The highest surface field of every electrode in every voltage case, with limits and margins.
///
/// Whoever prints it alone puts [`head_text`] above it.
pub fn stress_text(record: &Record, printing: &Printing) -> String {
    let mut text = String::new();
    for case in &record.voltage_cases {
        text += &case_heading(case);
        for name in &case.floating {
            text += &format!("  {}: {}\n", clean(name), floating_text(case, name));
        }
        text += &maxima_text(case, &record.edges, printing);
        text.push('\n');
    }
    if record.voltage_cases.is_empty() {
        text += "No voltage case, so no surface field.\n";
    }
    text
}

/// Title, cautions, verdict and accuracy: what stands over everything printed from a record.
pub fn head_text(record: &Record) -> String {
    let mut text = format!("{}\n", title(record));
    for (key, label) in TRAIL {
        if let Some(value) = record.case.resolved.get(key).filter(|value| !value.is_empty()) {
            text += &format!("  {label}: {}\n", clean(value));
        }
    }
    text += &format!("  by {} {}\n", clean(&record.program.name), clean(&record.program.version));
    let floats = record.rows.iter().any(|row| row.role == "floating")
        || record.voltage_cases.iter().any(|case| !case.floating.is_empty());
    // The caution of an estimate stands on the verdict and on every line with a limit or margin.
    let apart = |caution: &&String| *caution != ESTIMATE && (floats || *caution != cautions::FLOATING);
    let cautions: Vec<&String> = record.cautions.iter().filter(apart).collect();
    if !cautions.is_empty() {
        text += "\nCautions\n";
    }
    for caution in cautions {
        text += &format!("  {}\n", clean(caution));
    }
    text += &format!("\nVerdict: {}: {ESTIMATE}\n", judged(&record.verdict.word));
    for reason in &record.verdict.reasons {
        text += &format!("  {}: {ESTIMATE}\n", clean(reason));
    }
    if !record.verdict.codes.is_empty() {
        let codes: Vec<String> = record.verdict.codes.iter().map(i32::to_string).collect();
        text += &format!("  exit codes that hold: {}\n", codes.join(", "));
    }
    let (asked, reached) = (record.accuracy.asked, record.accuracy.reached);
    let (asked, reached) = (digits::percent(asked, false), digits::percent(reached, false));
    text + &format!(
        "  bar of the capacitances: asked {asked}, reached {reached}\n  case sha256 {}\n\n",
        clean(&record.case.sha256)
    )
}

/// The caution of a floating electrode with its potential in one voltage case.
pub(crate) fn floating_text(case: &VoltageCase, name: &str) -> String {
    let by_row = |map: &BTreeMap<String, f64>| map.get(name).copied().unwrap_or(0.0);
    let (v, bar) = (by_row(&case.potentials_volt), by_row(&case.potentials_bar_volt));
    cautions::floats_at(&in_time(case, &|k| digits::engineering(k * v, k * bar, "V")))
}

/// `Voltage case … ` and what its numbers are in time.
pub(crate) fn case_heading(case: &VoltageCase) -> String {
    let time = match case.value_is.as_str() {
        "rms" => "given as rms; peak stands for the crest value, rms = crest / sqrt(2) behind it",
        "dc" => "dc, steady values",
        _ => "peak, crest values in time",
    };
    format!("Voltage case `{}`: {time}\n", clean(&case.name))
}

/// A value that follows the voltage, with `peak`, `rms` or `dc`.
pub(crate) fn in_time(case: &VoltageCase, show: &dyn Fn(f64) -> String) -> String {
    match case.value_is.as_str() {
        "rms" => format!("{} peak ({} rms)", show(1.0), show(1.0 / SQRT_2)),
        "dc" => format!("{} dc", show(1.0)),
        _ => format!("{} peak", show(1.0)),
    }
}

/// The maxima and unbounded edges of one voltage case.
pub(crate) fn maxima_text(case: &VoltageCase, edges: &[Edge], printing: &Printing) -> String {
    let mut text = "  Highest surface field of each electrode, where it stands\n".to_owned();
    for maximum in &case.maxima {
        text += &maximum_text(maximum, case, printing);
    }
    let mut edges: Vec<&Edge> = edges.iter().filter(|edge| edge.case == case.name).collect();
    let near = |edge: &Edge| edge.field_at.first().map_or(edge.strength, |at| at.field_v_per_m).abs();
    edges.sort_by(|a, b| near(b).total_cmp(&near(a)));
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    for edge in edges {
        let count = counts.entry(edge.part.as_str()).or_default();
        *count += 1;
        if *count <= EDGES {
            text += &edge_text(edge, case, printing);
        }
    }
    for (part, count) in counts.iter().filter(|(_, count)| EDGES < **count) {
        let more = count - EDGES;
        let plural = if more == 1 { "edge stands" } else { "edges stand" };
        text += &format!("    {}: {more} more unbounded {plural} in the record\n", clean(part));
    }
    text
}

fn maximum_text(m: &Maximum, case: &VoltageCase, printing: &Printing) -> String {
    let field = |value: f64, bar: f64| {
        let unit = &printing.field_name;
        in_time(case, &|k| {
            format!("{} {unit}", digits::cell(k * value / printing.field, k * bar / printing.field))
        })
    };
    let plain = |value: f64| {
        let show = |k: f64| {
            format!("{} {}", digits::significant(k * value / printing.field, 4), printing.field_name)
        };
        in_time(case, &show)
    };
    let at = format!("{} {}", digits::place(&m.at_metre, printing.length), printing.length_name);
    let name = clean(&m.electrode);
    let mut text = match (m.field_v_per_m, m.bar_v_per_m) {
        (Some(value), bar) => format!(
            "    {name}: {} at {at}, {}; highest panel value {}\n",
            field(value, bar.unwrap_or(0.0)),
            clean(&m.kind),
            plain(m.raw_v_per_m)
        ),
        (None, _) => {
            let away = m.smooth_v_per_m.map_or(String::new(), |v| format!("; away from edges {}", plain(v)));
            format!(
                "    {name}: unbounded at {} at {at}{away}; highest panel value {}, a property of the panels\n",
                clean(&m.kind),
                plain(m.raw_v_per_m)
            )
        }
    };
    if m.limit_v_per_m.is_some() || m.margin.is_some() || m.judged != "no_limit" {
        text += &limit_text(m, printing);
    }
    text
}

fn limit_text(m: &Maximum, printing: &Printing) -> String {
    let number =
        |value: f64| format!("{} {}", digits::significant(value / printing.field, 4), printing.field_name);
    let limit = match (m.limit_v_per_m, m.limit_is.as_deref()) {
        (Some(crest), Some("rms")) => {
            format!("limit {} rms ({} peak), ", number(crest / SQRT_2), number(crest))
        }
        (Some(crest), Some(word)) => format!("limit {} {}, ", number(crest), clean(word)),
        (Some(crest), None) => format!("limit {} peak, ", number(crest)),
        (None, _) => String::new(),
    };
    let margin =
        m.margin.map_or(String::new(), |margin| format!("margin {}, ", digits::percent(margin, true)));
    format!("      {limit}{margin}{}: {ESTIMATE}\n", judged(&m.judged))
}

/// The words for a judgement or verdict.
pub(crate) fn judged(word: &str) -> String {
    match word {
        "not_met" => "not met".to_owned(),
        "not_decided" => "not decided".to_owned(),
        "no_limit" => "no limit given".to_owned(),
        other => clean(other),
    }
}

fn edge_text(edge: &Edge, case: &VoltageCase, printing: &Printing) -> String {
    let place = |at: &[f64; 3]| digits::place(at, printing.length);
    let mut text = format!(
        "    {}: unbounded at edge, {} degrees through the metal, from {} to {} {}\n",
        clean(&edge.part),
        digits::significant(edge.angle_deg, 4),
        place(&edge.from_metre),
        place(&edge.to_metre),
        printing.length_name
    );
    text += &format!(
        "      E = K s^({}) with s the distance from the edge, K = {} V m^({})",
        digits::significant(edge.exponent, 4),
        digits::significant(edge.strength, 4),
        digits::significant(-1.0 - edge.exponent, 4)
    );
    for at in &edge.field_at {
        let show = |k: f64| {
            let field = k * at.field_v_per_m / printing.field;
            format!("{} {}", digits::significant(field, 4), printing.field_name)
        };
        let distance = digits::significant(at.distance_metre / printing.length, 4);
        text += &format!("; at {distance} {}: {}", printing.length_name, in_time(case, &show));
    }
    text + "\n"
}

/// A table: names to the left, each column under its head and aligned on the point; columns that
/// do not fit go on in a block below.
pub(crate) fn grid(names: &[String], columns: &[(String, Vec<String>)]) -> String {
    let pad =
        |text: &str, width: usize| format!("{text}{}", " ".repeat(width - text.chars().count().min(width)));
    let left = names.iter().map(|name| name.chars().count()).max().unwrap_or(0);
    let mut text = String::new();
    let mut done = 0;
    while done < columns.len() {
        let mut lines = vec![format!("  {}", " ".repeat(left))];
        lines.extend(names.iter().map(|name| format!("  {}", pad(name, left))));
        let mut next = done;
        while next < columns.len() {
            let (head, cells) = &columns[next];
            let cells = digits::align(cells);
            let width = cells.iter().map(|c| c.chars().count()).max().unwrap_or(0).max(head.chars().count());
            if done < next && WIDTH < lines[0].chars().count() + 3 + width {
                break;
            }
            for (line, cell) in lines.iter_mut().zip([head].into_iter().chain(&cells)) {
                *line += &format!("   {}", pad(cell, width));
            }
            next += 1;
        }
        for line in lines {
            text += line.trim_end();
            text.push('\n');
        }
        done = next;
    }
    text
}
