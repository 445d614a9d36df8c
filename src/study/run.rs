//! The road of a case: bodies, assembly, rounds, record.

use super::Event;
use super::Outcome;
use super::StudyError;
use super::bodies;
use super::record;
use super::state;
use crate::adapt;
use crate::adapt::Demand;
use crate::adapt::Finished;
use crate::adapt::Limits;
use crate::adapt::Round;
use crate::base::threads;
use crate::case::Case;
use crate::case::Shapes;
use crate::case::machine;
use crate::mesh::Assembly;
use crate::mesh::assembly;
use crate::operator::dense;
use crate::panel;
use std::collections::BTreeMap;
use std::sync::Arc;
use std::time::Instant;

/// Panels that every body has at least in the first round (DESIGN 3.4).
const FIRST_PANELS: usize = 60;

/// Share of the free memory that is taken where the case gives no limit [1].
const SHARE_OF_FREE: f64 = 0.7;

/// Memory taken for free where the system does not tell [B].
const FREE_IF_UNKNOWN: f64 = 4e9;

/// Seconds by phase.
pub(super) type Seconds = BTreeMap<String, f64>;

/// Runs a case to its record.
///
/// # Errors
/// [`StudyError`]; no partial result.
pub fn run(case: &Case, shapes: &Shapes, progress: &(dyn Fn(&Event) + Sync)) -> Result<Outcome, StudyError> {
    threads::with(case.accuracy.threads, || run_here(case, shapes, progress))
}

fn run_here(case: &Case, shapes: &Shapes, progress: &(dyn Fn(&Event) + Sync)) -> Result<Outcome, StudyError> {
    let mut seconds = Seconds::new();
    let mut clock = Instant::now();
    let mut lap = |seconds: &mut Seconds, phase: &str| {
        seconds.insert(phase.to_owned(), clock.elapsed().as_secs_f64());
        clock = Instant::now();
    };
    progress(&Event::Phase("inspect"));
    let assembly = Arc::new(assemble(case, shapes)?);
    let states = state::states(case, &assembly).map_err(StudyError::Refused)?;
    lap(&mut seconds, "inspect");
    progress(&Event::Phase("refine"));
    let finished = refine(case, assembly, progress)?;
    lap(&mut seconds, "refine");
    progress(&Event::Phase("results"));
    let outcome = record::outcome(case, shapes, &finished, &states)?;
    lap(&mut seconds, "results");
    Ok(with_seconds(outcome, seconds))
}

fn with_seconds(mut outcome: Outcome, seconds: Seconds) -> Outcome {
    outcome.record.effort.seconds = seconds;
    outcome
}

/// Bodies read, repaired and exposed; findings of every step are in it.
///
/// # Errors
/// [`StudyError::Refused`] with all findings.
pub(super) fn assemble(case: &Case, shapes: &Shapes) -> Result<Assembly, StudyError> {
    let (bodies, mut findings) = bodies::bodies(case, shapes).map_err(StudyError::Refused)?;
    let plane = case.earth_plane.as_ref().map(|earth| earth.plane);
    match assembly::expose(bodies, &case.bonds, plane.as_ref()) {
        Ok(assembly) => {
            findings.extend(assembly.findings);
            if assembly.rows.is_empty() {
                let text =
                    "every electrode belongs to earth: at least one that does not is wanted".to_owned();
                findings.push(bodies::refusal("no_rows", text));
                return Err(StudyError::Refused(findings));
            }
            Ok(Assembly { findings, ..assembly })
        }
        Err(more) => {
            findings.extend(more);
            Err(StudyError::Refused(findings))
        }
    }
}

/// Memory that may be taken [B].
pub(super) fn memory_limit(case: &Case) -> f64 {
    let free = || SHARE_OF_FREE * machine::free_memory().unwrap_or(FREE_IF_UNKNOWN);
    case.accuracy.memory_limit.unwrap_or_else(free)
}

fn refine(
    case: &Case,
    assembly: Arc<Assembly>,
    progress: &(dyn Fn(&Event) + Sync),
) -> Result<Finished, StudyError> {
    let plane = case.earth_plane.as_ref().map(|earth| earth.plane);
    let start = adapt::at_least(FIRST_PANELS, panel::build(assembly, plane));
    let limits = Limits {
        max_panels: case.accuracy.max_panels,
        time: case.accuracy.time_limit,
        memory: memory_limit(case),
    };
    let needed = dense::bytes(start.len(), start.n_rows);
    if limits.memory < needed {
        return Err(StudyError::Memory {
            panels: start.len(),
            needed_bytes: needed,
            limit_bytes: limits.memory,
        });
    }
    let asked = case.accuracy.capacitance;
    let tell = |round: &Round| {
        progress(&Event::Round {
            number: round.number,
            panels: round.panels,
            reached: round.reached,
            asked,
            left: round.next,
        });
    };
    let demand = Demand { capacitance: asked };
    adapt::run(start, case.relative_permittivity, demand, &limits, &tell)
        .map_err(|error| StudyError::Singular(error.to_string()))
}
