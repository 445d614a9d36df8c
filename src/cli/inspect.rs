//! `inspect`: incoming inspection of STL files or of a case.

use crate::base::Severity;
use crate::case;
use crate::case::ShapeFile;
use crate::cli;
use crate::cli::args;
use crate::cli::case_to_fill;
use crate::cli::failure::Failure;
use crate::cli::progress::Progress;
use crate::cli::show;
use crate::cli::show::Show;
use crate::report::digits;
use crate::report::file;
use crate::report::form::clean;
use crate::report::lengths;
use crate::report::stl;
use crate::study;
use crate::study::BodyLine;
use crate::study::Inspection;
use serde_json::Value;
use serde_json::json;
use std::path::Path;
use std::path::PathBuf;

/// Inspects, prints what was found, writes repaired bodies and a case to fill in.
///
/// # Errors
/// [`Failure`]; refusals among the findings are no failure, but exit code 2.
pub(super) fn run(args: &args::Inspect, show: &Show) -> Result<u8, Failure> {
    let is_case = |path: &PathBuf| path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("toml"));
    let (inspection, unit) = match args.files.as_slice() {
        [path] if is_case(path) => {
            if args.write_case.is_some() {
                return Err(Failure::CaseToCase);
            }
            let (case, shapes) = case::load(path)?;
            let progress = Progress::start(show);
            let inspection = study::inspect_case(&case, &shapes);
            progress.end();
            (inspection?, Some((case.length_name, case.length_unit)))
        }
        paths if paths.iter().any(is_case) => return Err(Failure::Mixed),
        paths => {
            let names: Vec<String> = paths.iter().map(|path| path.to_string_lossy().into_owned()).collect();
            let shapes = case::read_shapes(&names, Path::new(""))?;
            shapes.files.iter().try_for_each(no_other_file)?;
            (study::inspect_files(&shapes), None)
        }
    };
    let unit = unit.as_ref().map(|(name, metres)| (name.as_str(), *metres));
    if show.json {
        show.result(&format!("{:#}", as_json(&inspection, unit.is_some())))?;
    } else {
        show.result(&as_text(&inspection, unit))?;
    }
    if let Some(folder) = &args.repair {
        write_repaired(&inspection, folder, args.overwrite, show)?;
    }
    if let Some(path) = &args.write_case {
        check_free(path, args.overwrite)?;
        file::write_whole(path, case_to_fill::text(&inspection.bodies, path).as_bytes())?;
        show.remark(&format!("written: {}; fill in the blanks, then solve it", path.display()));
    }
    let refused = inspection.findings.iter().any(|finding| finding.severity == Severity::Refusal);
    Ok(if refused { cli::REFUSED } else { cli::DONE })
}

/// Refuses a record or a case given for an STL file.
fn no_other_file(file: &ShapeFile) -> Result<(), Failure> {
    let path = PathBuf::from(&file.path);
    let Ok(text) = std::str::from_utf8(&file.bytes) else { return Ok(()) };
    let starts = |line: &str| text.lines().any(|l| l.trim_start().starts_with(line));
    if text.trim_start().starts_with('{') && text.contains("\"capacitance_farad\"") {
        return Err(Failure::IsRecord { path });
    }
    if starts("[[electrode]]") || starts("[units]") { Err(Failure::LooksLikeCase { path }) } else { Ok(()) }
}

fn as_text(inspection: &Inspection, unit: Option<show::LengthUnit<'_>>) -> String {
    let mut text = String::new();
    for body in &inspection.bodies {
        text.push_str(&body_text(body, unit));
    }
    for finding in &inspection.findings {
        text.push_str(&show::finding_text(finding, unit.unwrap_or(("drawing units", 1.0))));
        text.push('\n');
    }
    let count = |severity| inspection.findings.iter().filter(|finding| finding.severity == severity).count();
    let counts = [Severity::Refusal, Severity::Warning, Severity::Note].map(count);
    text.push_str(&format!("refusals: {}, warnings: {}, notes: {}\n", counts[0], counts[1], counts[2]));
    if let Some((panels, bytes)) = inspection.effort {
        let memory = digits::significant(bytes / 1e6, 2);
        text.push_str(&format!("effort for the accuracy asked: about {panels} panels, {memory} MB\n"));
    }
    text
}

fn body_text(body: &BodyLine, unit: Option<show::LengthUnit<'_>>) -> String {
    let (name, metres) = unit.unwrap_or(("", 1.0));
    let number = |value: f64, power: i32| digits::significant(value / metres.powi(power), 5);
    let power = |power: &str| match name {
        "" => String::new(),
        name => format!(" {name}{power}"),
    };
    let sizes = body.size.map(|side| number(side, 1)).join(" x ");
    let sizes = if name.is_empty() { format!("{sizes} (in the unit of the drawing)") } else { sizes };
    let volume = match body.closed {
        true => format!(", volume {}{}", number(body.volume, 3), power("³")),
        false => String::new(),
    };
    format!(
        "{}: {} facets, {}, size {sizes}{}, area {}{}{volume}\n",
        clean(&body.name),
        body.facets,
        if body.closed { "closed" } else { "open" },
        power(""),
        number(body.area, 2),
        power("²"),
    )
}

fn as_json(inspection: &Inspection, metres: bool) -> Value {
    let keys = if metres { ["size_metre", "area_m2", "volume_m3"] } else { ["size", "area", "volume"] };
    let bodies = inspection.bodies.iter().map(|body| {
        json!({
            "name": body.name, "facets": body.facets, "closed": body.closed,
            keys[0]: body.size, keys[1]: body.area, keys[2]: body.volume,
        })
    });
    let findings = inspection.findings.iter().map(|finding| {
        let mut value = show::finding_json(finding);
        if !metres && let Some(object) = value.as_object_mut() {
            let text = lengths::in_unit(&finding.text, "drawing units", 1.0);
            object.insert("text".to_owned(), Value::from(text));
            let place = object.remove("where_metre");
            object.insert("where".to_owned(), place.unwrap_or(Value::Null));
        }
        value
    });
    let effort = inspection.effort.map(|(panels, bytes)| json!({ "panels": panels, "memory_bytes": bytes }));
    json!({
        "length_unit": if metres { "metre" } else { "of the drawing" },
        "bodies": bodies.collect::<Vec<Value>>(),
        "findings": findings.collect::<Vec<Value>>(),
        "effort": effort,
    })
}

fn write_repaired(
    inspection: &Inspection,
    folder: &Path,
    overwrite: bool,
    show: &Show,
) -> Result<(), Failure> {
    let names: Vec<&str> = inspection.repaired.iter().map(|(name, _)| name.as_str()).collect();
    let paths: Vec<PathBuf> =
        case_to_fill::file_names(&names).iter().map(|name| folder.join(format!("{name}.stl"))).collect();
    for path in &paths {
        check_free(path, overwrite)?;
    }
    for (path, (_, facets)) in paths.iter().zip(&inspection.repaired) {
        stl::write(path, facets)?;
        show.remark(&format!("written: {}", path.display()));
    }
    Ok(())
}

fn check_free(path: &Path, overwrite: bool) -> Result<(), Failure> {
    match path.exists() && !overwrite {
        true => Err(Failure::Exists { path: path.to_owned() }),
        false => Ok(()),
    }
}
