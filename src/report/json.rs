//! What the verbs that ask a record say with `--json`; SI, units in the keys.

use crate::record::Record;
use crate::record::cautions::ESTIMATE;
use crate::report::form::Form;
use crate::report::form::REFERENCE;
use crate::report::form::title;
use serde_json::Value;
use serde_json::json;

/// One form of the matrix with its bars, kind, sign rule, reference and cautions.
pub fn matrix_json(record: &Record, form: Form) -> String {
    let unit = if form == Form::PotentialCoefficients { "per_farad" } else { "farad" };
    let (values, bars) = form.of(record);
    let mut object = head(record);
    object["form"] = json!(form.word());
    object["kind"] = json!(form.kind());
    object["sign_rule"] = json!(form.sign_rule());
    object["reference"] = json!(REFERENCE);
    object["electrodes"] = json!(record.electrodes);
    object[format!("value_{unit}")] = json!(values);
    object[format!("bar_{unit}")] = json!(bars);
    if form == Form::Mutual {
        object["earth_farad"] = json!(record.earth_farad);
        object["earth_bar_farad"] = json!(record.earth_bar_farad);
        object["earth_share"] = json!(record.earth_share);
    }
    format!("{object:#}\n")
}

/// The maxima and unbounded edges of every voltage case; the caution stands with each judgement.
pub fn stress_json(record: &Record) -> String {
    let mut object = head(record);
    let cases = record.voltage_cases.iter().map(|case| {
        let maxima: Vec<Value> = case
            .maxima
            .iter()
            .map(|maximum| {
                let mut maximum = json!(maximum);
                maximum["caution"] = json!(ESTIMATE);
                maximum
            })
            .collect();
        let edges: Vec<Value> =
            record.edges.iter().filter(|edge| edge.case == case.name).map(|edge| json!(edge)).collect();
        json!({"name": case.name, "value_is": case.value_is, "maxima": maxima, "edges": edges})
    });
    object["voltage_cases"] = Value::Array(cases.collect());
    format!("{object:#}\n")
}

/// Program, cautions, title, verdict, accuracy and the case the record belongs to: what stands in
/// everything said as JSON.
pub fn head(record: &Record) -> Value {
    let mut verdict = json!(record.verdict);
    verdict["caution"] = json!(ESTIMATE);
    json!({
        "program": record.program,
        "cautions": record.cautions,
        "title": title(record),
        "verdict": verdict,
        "accuracy": record.accuracy,
        "case_sha256": record.case.sha256,
    })
}
