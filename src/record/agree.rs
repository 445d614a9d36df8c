//! Whether the keys of a record agree with each other.

use crate::record::Record;

/// Largest difference of a capacitance derived from another one, over the largest entry of its row [1].
///
/// Seen in records as written: below 1e-15.  What a netlist is promised to give back is 1e-9.
const AGREE_REL: f64 = 1e-9;

/// The first key that contradicts another one, and how.
///
/// The mutual capacitances are the negative entries of the Maxwell matrix, those to earth its row
/// sums; the verdict agrees with its codes, and hides no failed check, limit or accuracy.  A change
/// made to all keys alike is not found.
pub(super) fn contradiction(record: &Record) -> Option<(&'static str, String)> {
    capacitances(record).or_else(|| verdict(record))
}

fn capacitances(record: &Record) -> Option<(&'static str, String)> {
    let c = &record.capacitance_farad;
    for (i, row) in c.iter().enumerate() {
        let name = &record.electrodes[i];
        let size = row.iter().fold(0.0, |top: f64, c| top.max(c.abs()));
        let apart = |a: f64, b: f64| AGREE_REL * size < (a - b).abs();
        for (j, entry) in row.iter().enumerate() {
            let (found, wanted) = (record.mutual_farad[i][j], if i == j { 0.0 } else { -entry });
            if apart(found, wanted) {
                let other = &record.electrodes[j];
                let problem = format!(
                    "`{name}` and `{other}` have {found:e} F, but {wanted:e} F follows from `capacitance_farad`"
                );
                return Some(("mutual_farad", problem));
            }
        }
        let (found, sum): (f64, f64) = (record.earth_farad[i], row.iter().sum());
        if apart(found, sum) {
            let problem =
                format!("`{name}` has {found:e} F, but the row of `capacitance_farad` sums to {sum:e} F");
            return Some(("earth_farad", problem));
        }
        let (found, share) = (record.earth_share[i], record.earth_farad[i] / row[i]);
        if AGREE_REL * (1.0 + share.abs()) < (found - share).abs() {
            let problem = format!("`{name}` has {found:e}, but {share:e} follows from `earth_farad`");
            return Some(("earth_share", problem));
        }
    }
    None
}

fn verdict(record: &Record) -> Option<(&'static str, String)> {
    let (word, codes) = (record.verdict.word.as_str(), &record.verdict.codes);
    let judged = |word: &str| record.voltage_cases.iter().flat_map(|c| &c.maxima).any(|m| m.judged == word);
    let fits = match word {
        "met" => codes.is_empty(),
        "not_met" => !codes.is_empty(),
        "not_decided" => *codes == [4] && !judged("not_met"),
        _ => return Some(("word", format!("`{word}` is no verdict; met, not_met or not_decided is"))),
    };
    if !fits {
        return Some((
            "word",
            format!("the verdict `{word}` does not fit the codes {codes:?} and the limits"),
        ));
    }
    let hidden = |code: i32, holds: bool, what: &str| {
        (holds && !codes.contains(&code))
            .then(|| ("codes", format!("{what}, but {code} is not among {codes:?}")))
    };
    let failed = record.checks.iter().any(|check| !check.pass);
    let limit = judged("not_met") || judged("not_decided");
    let short = record.accuracy.asked < record.accuracy.reached;
    hidden(5, failed, "a check failed")
        .or_else(|| hidden(4, limit, "a field limit is not met or not decided"))
        .or_else(|| hidden(3, short, "the bar reached is wider than the one asked"))
}
