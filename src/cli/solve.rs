//! `solve`: one case to its record and files.

use crate::case;
use crate::case::Case;
use crate::case::Shapes;
use crate::cli;
use crate::cli::args;
use crate::cli::failure::Failure;
use crate::cli::progress::Progress;
use crate::cli::records;
use crate::cli::show::Show;
use crate::record::FileHash;
use crate::record::RecordError;
use crate::record::cautions::ESTIMATE;
use crate::record::sha256;
use crate::record::store;
use crate::report;
use crate::report::Printing;
use crate::report::Targets;
use crate::report::answers;
use crate::study;
use crate::study::StudyError;
use std::path::Path;
use std::path::PathBuf;

/// Solves the case, prints the answers and writes the files.
///
/// # Errors
/// [`Failure`]; no file is written then, or each one whole.
pub(super) fn run(args: &args::Solve, show: &Show) -> Result<u8, Failure> {
    let (case, shapes) = case::load(&args.case).map_err(|error| match store::read(&args.case) {
        Ok(_) => Failure::IsRecord { path: args.case.clone() },
        Err(_) => Failure::Case(error),
    })?;
    let (targets, printing) = (targets(&case), printing(&case));
    keep_inputs(&args.case, &case, &targets)?;
    if !args.overwrite {
        check_targets(&case, &shapes, &targets)?;
    }
    say_defaults(&case, show);
    let progress = Progress::start(show);
    let outcome = study::run(&case, &shapes, &|event| progress.tell(event));
    progress.end();
    let study::Outcome { mut record, surface } = outcome.map_err(|error| match error {
        error @ StudyError::Refused(_) => {
            Failure::Refused { error, unit_name: case.length_name.clone(), unit: case.length_unit }
        }
        other => Failure::Study(other),
    })?;
    let written = report::deliver(&mut record, &surface, &targets, &printing)?;
    if show.json {
        let mut bytes = Vec::new();
        store::write(&record, &mut bytes)?;
        show.result(&String::from_utf8_lossy(&bytes))?;
    } else {
        show.result(&answers::sheet(&record, &printing))?;
    }
    for path in written {
        show.remark(&format!("written: {}", path.display()));
    }
    for reason in &record.verdict.reasons {
        show.remark(&format!("{}: {reason}: {ESTIMATE}", record.verdict.word));
    }
    if show.json {
        records::say_cautions(&record, show);
    }
    Ok(records::verdict_code(&record, &[cli::CHECK, cli::LIMIT, cli::ACCURACY]))
}

fn say_defaults(case: &Case, show: &Show) {
    if !case.defaults.is_empty() {
        show.remark(&format!("defaults used: {}", case.defaults.join("; ")));
    }
    if case.accuracy.max_field.is_some() {
        show.remark("`max_field` was read; refinement is not steered by it in this version");
    }
}

/// Refuses, whatever was allowed, to write over the case or a shape file.
fn keep_inputs(path: &Path, case: &Case, targets: &Targets) -> Result<(), Failure> {
    let folder = path.parent().unwrap_or(Path::new(""));
    let shapes = case.shape_paths.iter().map(|shape| folder.join(shape));
    let inputs: Vec<PathBuf> =
        shapes.chain([path.to_owned()]).filter_map(|input| input.canonicalize().ok()).collect();
    // A target that is not there has no such name and is in nobody's way.
    let is_input = |target: &PathBuf| target.canonicalize().is_ok_and(|whole| inputs.contains(&whole));
    match targets.paths().into_iter().find(is_input) {
        Some(path) => Err(Failure::Input { path }),
        None => Ok(()),
    }
}

/// Refuses, before any work, if the record in the way belongs to another case or other shapes, or if
/// any other file stands where one would be written and no record of this case beside it tells that
/// it is an earlier result.
fn check_targets(case: &Case, shapes: &Shapes, targets: &Targets) -> Result<(), Failure> {
    let path = &targets.record;
    if !path.exists() {
        return match targets.paths().into_iter().find(|path| path.exists()) {
            Some(path) => Err(Failure::Exists { path }),
            None => Ok(()),
        };
    }
    let other = |held| Err(Failure::OtherRecord { path: path.clone(), held });
    let record = match store::read(path) {
        Ok(record) => record,
        Err(RecordError::Read { path, source }) => {
            return Err(Failure::Record(RecordError::Read { path, source }));
        }
        Err(_) => return other("something that is no record of this program"),
    };
    if record.case.sha256 != sha256(case.text.as_bytes()) {
        return other("the record of another case (or of this one before it was changed)");
    }
    let hashes = |file: &case::ShapeFile| FileHash { path: file.path.clone(), sha256: sha256(&file.bytes) };
    let now: Vec<FileHash> = shapes.files.iter().map(hashes).collect();
    if record.shapes != now {
        return other("a record of this case with other shape files");
    }
    Ok(())
}

/// Units for printing, as the case asks for them.
pub(super) fn printing(case: &Case) -> Printing {
    Printing {
        length_name: case.length_name.clone(),
        length: case.length_unit,
        capacitance_name: case.printing.capacitance_name.clone(),
        capacitance: case.printing.capacitance,
        field_name: case.printing.field_name.clone(),
        field: case.printing.field,
    }
}

fn targets(case: &Case) -> Targets {
    Targets {
        record: case.deliver.record.clone(),
        surface: case.deliver.surface.clone(),
        answers: case.deliver.answers.clone(),
        matrix: case.deliver.matrix.clone(),
        netlist: case.deliver.netlist.clone(),
    }
}
