//! From the file as written to the case in SI: every fault is noted, every default listed.

use crate::base::units;
use crate::base::units::Dimension;
use crate::case::Accuracy;
use crate::case::Case;
use crate::case::Deliver;
use crate::case::Printing;
use crate::case::Study;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::resolve_electrode as electrode;
use crate::case::resolve_value as value;
use crate::case::resolve_voltage as voltage;
use crate::case::wire;
use crate::case::wire::Field;
use crate::case::wire::Value;
use std::path::Path;
use std::path::PathBuf;

/// Bar demanded of capacitances where the case does not say [1].
const CAPACITANCE_BAR: f64 = 0.005;

/// The case; to be thrown away if `sink` holds faults afterwards.
pub(super) fn resolve(file: &wire::File, text: &str, path: &Path, sink: &mut Sink) -> Case {
    let (length_unit, length_name) = length(file, sink);
    let mut shape_paths = Vec::new();
    if file.electrode.is_empty() && sink.is_clean() {
        let wanted = "one [[electrode]] table for each conducting body, with `name` and `shape`";
        sink.note(0..0, Fault::Missing { word: "electrode", table: "the file".to_owned(), wanted });
    }
    let electrodes = electrode::electrodes(&file.electrode, length_unit, &mut shape_paths, sink);
    let bonds = electrode::bonds(&file.bond, &electrodes, sink);
    Case {
        path: path.to_owned(),
        text: text.to_owned(),
        study: study(file.study.as_ref(), sink),
        length_unit,
        length_name,
        printing: printing(file, sink),
        relative_permittivity: relative_permittivity(file.surroundings.as_ref(), sink),
        earth_plane: electrode::earth_plane(&file.earth_plane, length_unit, sink),
        voltage_cases: voltage::voltage_cases(&file.voltage_case, &electrodes, &bonds, sink),
        electrodes,
        bonds,
        looks: voltage::looks(&file.look, length_unit, sink),
        accuracy: accuracy(file.accuracy.as_ref(), sink),
        deliver: deliver(file.deliver.as_ref(), path, sink),
        shape_paths,
        defaults: std::mem::take(&mut sink.defaults),
    }
}

/// Metres per unit of length [m], and its name.
fn length(file: &wire::File, sink: &mut Sink) -> (f64, String) {
    let wanted = "the length unit of the STL files and of bare coordinates, as in length = \"mm\"";
    let (span, field) = match &file.units {
        Some(units) => (units.span(), units.get_ref().length.as_ref()),
        None => (0..0, None),
    };
    let Some(at) = field else {
        let fault = Fault::Missing { word: "length", table: "[units]".to_owned(), wanted };
        sink.note(span, fault);
        return (1.0, String::new());
    };
    (unit_of(at, "length", Dimension::Length, sink)).unwrap_or((1.0, String::new()))
}

/// SI value of a unit [SI unit of `dimension`], and its name.
fn unit_of(
    at: &toml::Spanned<Value>,
    word: &str,
    dimension: Dimension,
    sink: &mut Sink,
) -> Option<(f64, String)> {
    let error = match at.get_ref() {
        Value::Text(name) if name.trim().is_empty() => units::UnitError::NoName { dimension },
        Value::Text(name) => match units::factor(name, dimension) {
            Ok(factor) => return Some((factor, name.clone())),
            Err(error) => error,
        },
        _ => {
            let wanted = "the name of a unit in quotation marks";
            sink.note(at.span(), Fault::Form { word: word.to_owned(), wanted });
            return None;
        }
    };
    sink.note(at.span(), Fault::Quantity { word: word.to_owned(), error });
    None
}

fn printing(file: &wire::File, sink: &mut Sink) -> Printing {
    let units = file.units.as_ref().map(toml::Spanned::get_ref);
    let mut unit = |field: Option<&Field>, word: &str, dimension, name: &str, factor: f64| match field {
        Some(Some(at)) => unit_of(at, word, dimension, sink).unwrap_or((factor, name.to_owned())),
        _ => {
            sink.assume(&format!("units.{word}"), name);
            (factor, name.to_owned())
        }
    };
    let (capacitance, capacitance_name) =
        unit(units.map(|units| &units.capacitance), "capacitance", Dimension::Capacitance, "pF", 1e-12);
    let (field, field_name) = unit(units.map(|units| &units.field), "field", Dimension::Field, "kV/mm", 1e6);
    Printing { capacitance_name, capacitance, field_name, field }
}

fn study(wire: Option<&wire::Study>, sink: &mut Sink) -> Study {
    let Some(wire) = wire else { return Study::default() };
    let words = [
        ("number", &wire.number),
        ("issue", &wire.issue),
        ("title", &wire.title),
        ("question", &wire.question),
        ("prepared", &wire.prepared),
        ("checked", &wire.checked),
        ("approved", &wire.approved),
        ("organisation", &wire.organisation),
    ];
    let mut fields = Vec::new();
    for (word, field) in words {
        // A form with a line left blank is in order: the paper trail computes nothing.
        let blank =
            matches!(field, Some(at) if matches!(at.get_ref(), Value::Text(text) if text.trim().is_empty()));
        if !blank {
            fields.extend(value::text(field, word, sink).map(|text| (word.to_owned(), text)));
        }
    }
    let wanted = "a list of texts: what was not modelled";
    let left_out = value::texts(&wire.left_out, "left_out", wanted, sink);
    Study { fields, left_out: left_out.into_iter().map(|(text, _)| text).collect() }
}

fn relative_permittivity(wire: Option<&wire::Surroundings>, sink: &mut Sink) -> f64 {
    let Some(at) = wire.and_then(|wire| wire.relative_permittivity.as_ref()) else {
        sink.assume("surroundings.relative_permittivity", "1");
        return 1.0;
    };
    let word = "relative_permittivity";
    let wanted = "a bare number from 1 (vacuum) upwards";
    match value::number_of(at, word, wanted, sink) {
        Some(number) if 1.0 <= number => number,
        Some(number) => {
            let fault = Fault::Range { word: word.to_owned(), found: number.to_string(), wanted };
            sink.note(at.span(), fault);
            1.0
        }
        None => 1.0,
    }
}

fn accuracy(wire: Option<&wire::Accuracy>, sink: &mut Sink) -> Accuracy {
    let nothing = wire::Accuracy::default();
    let wire = wire.unwrap_or(&nothing);
    for (field, word, default) in [
        (&wire.capacitance, "capacitance", "0.5 %"),
        (&wire.memory_limit, "memory_limit", "70 % of what is free"),
        (&wire.threads, "threads", "all cores"),
    ] {
        if field.is_none() {
            sink.assume(&format!("accuracy.{word}"), default);
        }
    }
    let panels = "a whole number of panels, 1 or more";
    let threads = "a whole number of threads, from 1 to 1024";
    Accuracy {
        capacitance: share(&wire.capacitance, "capacitance", sink).unwrap_or(CAPACITANCE_BAR),
        max_field: share(&wire.max_field, "max_field", sink),
        max_panels: value::count(&wire.max_panels, "max_panels", (1, usize::MAX, panels), sink),
        time_limit: value::positive_quantity(&wire.time_limit, "time_limit", Dimension::Time, sink),
        memory_limit: value::positive_quantity(&wire.memory_limit, "memory_limit", Dimension::Memory, sink),
        threads: value::count(&wire.threads, "threads", (1, 1024, threads), sink),
    }
}

/// A ratio above 0 and below 1 [1].
fn share(field: &Field, word: &str, sink: &mut Sink) -> Option<f64> {
    let share = value::positive_quantity(field, word, Dimension::Ratio, sink)?;
    if share < 1.0 {
        return Some(share);
    }
    let at = field.as_ref()?;
    let (found, wanted) = (value::written(at.get_ref()), "a share below 100 %, as in \"0.5 %\"");
    sink.note(at.span(), Fault::Range { word: word.to_owned(), found, wanted });
    None
}

/// Paths of the outputs; relative ones stand in the folder, the folder beside the case file.
fn deliver(wire: Option<&wire::Deliver>, path: &Path, sink: &mut Sink) -> Deliver {
    let base = path.parent().unwrap_or(Path::new(""));
    let mut name = |field: Option<&Field>, word| field.and_then(|field| value::text(field, word, sink));
    let folder = name(wire.map(|wire| &wire.folder), "folder");
    let record = name(wire.map(|wire| &wire.record), "record");
    let answers = name(wire.map(|wire| &wire.answers), "answers");
    let matrix = name(wire.map(|wire| &wire.matrix), "matrix");
    let netlist = name(wire.map(|wire| &wire.netlist), "netlist");
    let folder = folder.unwrap_or_else(|| {
        let stem = path.file_stem().unwrap_or_default().to_string_lossy();
        let folder = format!("out/{stem}");
        sink.assume("deliver.folder", &folder);
        folder
    });
    let record = record.unwrap_or_else(|| {
        sink.assume("deliver.record", "record.json");
        "record.json".to_owned()
    });
    let folder = base.join(folder);
    let record = folder.join(record);
    let surface = surface_beside(&record);
    let inside = |name: Option<String>| name.map(|name| folder.join(name));
    let deliver = Deliver {
        answers: inside(answers),
        matrix: inside(matrix),
        netlist: inside(netlist),
        folder: folder.clone(),
        record,
        surface,
    };
    check_paths(wire, &deliver, path, sink);
    deliver
}

/// Path of the surface file of a record: `surface.vtu` beside `record.json`, `NAME_surface.vtu`
/// beside any other `NAME.json`, so that records sharing a folder keep their own.
fn surface_beside(record: &Path) -> PathBuf {
    let stem = record.file_stem().unwrap_or_default().to_string_lossy();
    match &*stem {
        "record" => record.with_file_name("surface.vtu"),
        stem => record.with_file_name(format!("{stem}_surface.vtu")),
    }
}

/// Path of the long form of the matrices: `_long` before the ending.
pub(super) fn long_beside(matrix: &Path) -> PathBuf {
    let stem = matrix.file_stem().unwrap_or_default().to_string_lossy();
    match matrix.extension() {
        Some(ending) => matrix.with_file_name(format!("{stem}_long.{}", ending.to_string_lossy())),
        None => matrix.with_file_name(format!("{stem}_long")),
    }
}

/// Notes faults where two outputs, or an output and the case, share a path.
fn check_paths(wire: Option<&wire::Deliver>, deliver: &Deliver, path: &Path, sink: &mut Sink) {
    let Some(wire) = wire else { return };
    let long = deliver.matrix.as_deref().map(long_beside);
    let outputs = [
        ("record", &wire.record, Some(&deliver.record), "the record"),
        ("record", &wire.record, Some(&deliver.surface), "the surface file"),
        ("answers", &wire.answers, deliver.answers.as_ref(), "the answer sheet"),
        ("matrix", &wire.matrix, deliver.matrix.as_ref(), "the matrix"),
        ("matrix", &wire.matrix, long.as_ref(), "the long form of the matrix"),
        ("netlist", &wire.netlist, deliver.netlist.as_ref(), "the netlist"),
    ];
    let mut taken: Vec<(PathBuf, &'static str)> = vec![(plain(path), "the case file")];
    for (word, field, output, what) in outputs {
        let Some(output) = output else { continue };
        let output = plain(output);
        let clash = taken.iter().find(|(other, _)| *other == output);
        if let (Some((_, other)), Some(at)) = (clash, field) {
            sink.note(at.span(), Fault::SamePath { word, path: output.clone(), other });
        }
        taken.push((output, what));
    }
}

/// `path` without `.` and with `name/..` taken out; links are not followed.
pub(super) fn plain(path: &Path) -> PathBuf {
    use std::path::Component;
    let mut parts: Vec<Component<'_>> = Vec::new();
    for part in path.components() {
        match (part, parts.last()) {
            (Component::CurDir, _) => {}
            (Component::ParentDir, Some(Component::Normal(_))) => {
                parts.pop();
            }
            _ => parts.push(part),
        }
    }
    parts.iter().collect()
}
