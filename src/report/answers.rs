//! The answer sheet: what `solve` prints and `answers.txt` holds.

use crate::base::counted;
use crate::record::BudgetLine;
use crate::record::Look;
use crate::record::Record;
use crate::record::VoltageCase;
use crate::record::cautions::CHARGED;
use crate::report::Printing;
use crate::report::digits;
use crate::report::form::Form;
use crate::report::form::clean;
use crate::report::lengths;
use crate::report::tables;
use std::collections::BTreeMap;

/// Most points of a look printed one by one [1]; of longer ones the ends and the extremes stand here.
const LOOK_POINTS: usize = 11;

/// Most findings of slivers printed for a part [1]; a fan of a flat cap can hold hundreds.
const SLIVERS: usize = 5;

/// A charge that was given and differs from it by less than this share of the largest charge of the
/// voltage case is rounding of the algebra [1], four digits above a double's.
const ROUNDING_REL: f64 = 1e-12;

/// The whole sheet.
pub fn sheet(record: &Record, printing: &Printing) -> String {
    let mut text = tables::head_text(record);
    for form in Form::ALL {
        text += &tables::matrix_text(record, form, printing);
        text.push('\n');
    }
    for case in &record.voltage_cases {
        text += &tables::case_heading(case);
        text += &electrical_text(record, case);
        text += &tables::maxima_text(case, &record.edges, printing);
        text.push('\n');
    }
    for look in &record.looks {
        text += &look_text(look, &record.voltage_cases, printing);
    }
    text += &checks_text(record);
    text += &findings_text(record, printing);
    text += &parts_text(record, printing);
    text += &budget_text(&record.budget.entries);
    text += &effort_text(record);
    text += &case_text(record);
    text + &hashes_text(record)
}

/// Potentials, charges and energy of one voltage case.
fn electrical_text(record: &Record, case: &VoltageCase) -> String {
    let by_row = |map: &BTreeMap<String, f64>, name: &str| map.get(name).copied().unwrap_or(0.0);
    let (mut volts, mut charges) = ("  Potentials\n".to_owned(), format!("  Charges: {CHARGED}\n"));
    let largest = case.charges_coulomb.values().fold(0.0, |top: f64, q| top.max(q.abs()));
    for name in &record.electrodes {
        let (v, bar) = (by_row(&case.potentials_volt, name), by_row(&case.potentials_bar_volt, name));
        let volt = tables::in_time(case, &|k| digits::engineering(k * v, k * bar, "V"));
        let name_shown = clean(name);
        volts += &if case.floating.contains(name) {
            format!("    {name_shown}: {}\n", tables::floating_text(case, name))
        } else {
            format!("    {name_shown}: {volt}\n")
        };
        let (mut q, bar) = (by_row(&case.charges_coulomb, name), by_row(&case.charges_bar_coulomb, name));
        if bar == 0.0 && q.abs() <= ROUNDING_REL * largest {
            q = 0.0;
        }
        let charge = tables::in_time(case, &|k| digits::engineering(k * q, k * bar, "C"));
        charges += &format!("    {name_shown}: {charge}\n");
    }
    let energy = digits::engineering(case.energy_joule, case.energy_bar_joule, "J");
    let when = if case.value_is == "dc" { "" } else { " at the crest" };
    format!("{volts}{charges}  Field energy{when}: {energy}; {CHARGED}\n")
}

fn look_text(look: &Look, cases: &[VoltageCase], printing: &Printing) -> String {
    let points = look.points_metre.len();
    let mut text = format!("Look `{}`, {}\n", clean(&look.name), counted(points, "point"));
    for case in cases {
        let (Some(volts), Some(fields)) =
            (look.potential_volt.get(&case.name), look.field_v_per_m.get(&case.name))
        else {
            continue;
        };
        let size: Vec<f64> = fields.iter().map(|e| e.iter().map(|c| c * c).sum::<f64>().sqrt()).collect();
        text += &format!("  `{}`: place [{}], potential, field\n", clean(&case.name), printing.length_name);
        for n in look_rows(&size) {
            let volt = tables::in_time(case, &|k| plain_volt(k * volts[n]));
            let field = tables::in_time(case, &|k| {
                format!("{} {}", digits::significant(k * size[n] / printing.field, 4), printing.field_name)
            });
            let at = digits::place(&look.points_metre[n], printing.length);
            text += &format!("    {at}  {volt}  {field}  in {}\n", clean(&look.medium[n]));
        }
    }
    if LOOK_POINTS < points {
        text += "  the ends and the highest field only; every point stands in the record\n";
    }
    text + "\n"
}

/// Which points of a look are printed.
fn look_rows(size: &[f64]) -> Vec<usize> {
    if size.len() <= LOOK_POINTS {
        return (0..size.len()).collect();
    }
    let top = (0..size.len()).max_by(|a, b| size[*a].total_cmp(&size[*b])).unwrap_or(0);
    let mut rows = vec![0, top, size.len() - 1];
    rows.sort_unstable();
    rows.dedup();
    rows
}

fn plain_volt(value: f64) -> String {
    let (factor, prefix) = digits::prefix(value.abs());
    format!("{} {prefix}V", digits::significant(value / factor, 5))
}

fn checks_text(record: &Record) -> String {
    let mut text = "Checks\n".to_owned();
    for check in &record.checks {
        let word = if check.pass { "holds" } else { "FAILS" };
        let (value, limit) = (digits::significant(check.value, 3), digits::significant(check.limit, 3));
        text += &format!("  {word}  {}: {value}, allowed {limit}\n", clean(&check.name));
    }
    text + "\n"
}

/// Findings, refusals and warnings before notes.
fn findings_text(record: &Record, printing: &Printing) -> String {
    let mut text = "Findings\n".to_owned();
    let weight = |severity: &str| match severity {
        "refusal" => 0,
        "warning" => 1,
        _ => 2,
    };
    let mut findings: Vec<_> = record.findings.iter().collect();
    findings.sort_by_key(|finding| weight(&finding.severity));
    let mut slivers: BTreeMap<&str, usize> = BTreeMap::new();
    for finding in &findings {
        if finding.code == "sliver" {
            let count = slivers.entry(part_of(&finding.text)).or_default();
            *count += 1;
            if SLIVERS < *count {
                continue;
            }
        }
        let (severity, code) = (clean(&finding.severity), clean(&finding.code));
        let unit = (&printing.length_name, printing.length);
        let (sentence, place) = lengths::told(&finding.text, finding.where_metre, unit.0, unit.1);
        let place = place.map_or_else(String::new, |place| format!(" {place}"));
        text += &format!("  {severity} {code}: {sentence}{place}\n");
    }
    for (part, count) in slivers.iter().filter(|(_, count)| SLIVERS < **count) {
        text += &format!(
            "  warning sliver: `{}`: {} more lines on slivers stand in the record\n",
            clean(part),
            count - SLIVERS
        );
    }
    if findings.is_empty() {
        text += "  none\n";
    }
    text + "\n"
}

/// Name between the first backquotes of a finding's text.
fn part_of(text: &str) -> &str {
    text.split('`').nth(1).unwrap_or("")
}

fn parts_text(record: &Record, printing: &Printing) -> String {
    let mut text = format!("Parts, overall size in {0}, exposed area in {0}^2\n", printing.length_name);
    for part in &record.parts {
        let size: Vec<String> =
            part.size_metre.iter().map(|c| digits::significant(c / printing.length, 5)).collect();
        let area = digits::significant(part.area_m2 / printing.length / printing.length, 5);
        text += &format!(
            "  {}: {}, {} facets {}, {} panels, {}, {area}\n",
            clean(&part.name),
            clean(&part.kind),
            part.facets,
            clean(&part.surface).replace('_', " "),
            part.panels,
            size.join(" x ")
        );
    }
    text + "\n"
}

fn budget_text(entries: &[BudgetLine]) -> String {
    let mut text = "Where the bars come from, relative to the entry\n".to_owned();
    let names: Vec<String> = entries.iter().map(|line| clean(&line.entry)).collect();
    let column = |head: &str, signed: bool, of: &dyn Fn(&BudgetLine) -> f64| {
        (head.to_owned(), entries.iter().map(|line| digits::percent(of(line), signed)).collect::<Vec<_>>())
    };
    let columns = [
        column("panels", false, &|line| line.discretisation),
        column("facets (rebuilt - flat)", true, &|line| line.faceting),
        column("bar of facets", false, &|line| line.faceting_bar),
        column("solver", false, &|line| line.solver),
    ];
    text += &tables::grid(&names, &columns);
    text + "\n"
}

fn effort_text(record: &Record) -> String {
    let effort = &record.effort;
    let mut text = format!(
        "Effort\n  {}, {}, {}, {} method, {}",
        counted(effort.panels, "panel"),
        counted(effort.unknowns, "unknown"),
        counted(effort.rounds, "round"),
        clean(&effort.method),
        counted(effort.threads, "thread")
    );
    if effort.peak_memory_bytes != 0 {
        text += &format!(", {} MB at most", digits::significant(effort.peak_memory_bytes as f64 / 1e6, 3));
    }
    for (phase, seconds) in &effort.seconds {
        text += &format!("\n  {}: {} s", clean(phase), digits::significant(*seconds, 3));
    }
    for (round, (panels, reached)) in effort.history.iter().enumerate() {
        text +=
            &format!("\n  round {}: {panels} panels, bar {}", round + 1, digits::percent(*reached, false));
    }
    text + "\n\n"
}

/// A text whose numbers of full length, which a factor left behind, have six digits; the record keeps
/// them whole.
fn shortened(text: &str) -> String {
    let short = |word: &str| {
        let digits = word.chars().filter(char::is_ascii_digit).count();
        let number = word.parse::<f64>().ok().filter(|_| FULL_LENGTH <= digits);
        number.map_or_else(|| word.to_owned(), |number| digits::significant(number, 6))
    };
    text.split(' ').map(short).collect::<Vec<String>>().join(" ")
}

/// Digits from which a number is taken for the result of a product [1]; a double has up to 17.
const FULL_LENGTH: usize = 15;

/// Every word of the case as understood, defaults included.
fn case_text(record: &Record) -> String {
    let mut text = "Case as understood, defaults included\n".to_owned();
    for (key, value) in record.case.resolved.iter().filter(|(key, _)| !key.starts_with("study.")) {
        text += &format!("  {} = {}\n", clean(key), shortened(&clean(value)));
    }
    text + "\n"
}

fn hashes_text(record: &Record) -> String {
    let mut text = format!("SHA-256\n  {}  case file\n", clean(&record.case.sha256));
    for file in record.shapes.iter().chain([&record.surface_file]) {
        text += &format!("  {}  {}\n", clean(&file.sha256), clean(&file.path));
    }
    text
}
