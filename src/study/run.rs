//! The road of a case: bodies, assembly, rounds, record.

use super::Event;
use super::Outcome;
use super::StudyError;
use super::bodies;
use super::copies;
use super::record;
use super::state;
use super::state::States;
use crate::adapt;
use crate::adapt::Aim;
use crate::adapt::Demand;
use crate::adapt::Finished;
use crate::adapt::Limits;
use crate::adapt::Round;
use crate::base::threads;
use crate::case::Case;
use crate::case::Shapes;
use crate::case::machine;
use crate::circuit;
use crate::mesh::Assembly;
use crate::mesh::assembly;
use crate::operator::dense;
use crate::panel;
use crate::panel::Panels;
use crate::physics::capacitance::Matrix;
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
    let assembly = assemble(case, shapes)?;
    let states = state::states(case, &assembly).map_err(StudyError::Refused)?;
    let (panels, note) = copies::arranged(case, panel::build(Arc::new(assembly), &case.images));
    lap(&mut seconds, "inspect");
    progress(&Event::Phase("refine"));
    let finished = refine(case, panels, &states, progress)?;
    lap(&mut seconds, "refine");
    progress(&Event::Phase("results"));
    let mut outcome = record::outcome(case, shapes, &finished, &states)?;
    outcome.record.findings.extend(note.iter().map(record::stored));
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
    match assembly::expose(bodies, &case.bonds, &case.images) {
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

/// Most panels of the first round: what is allowed, and what half the memory holds.
fn most_at_first(case: &Case) -> usize {
    let held = (0.5 * memory_limit(case) / 8.0).sqrt();
    case.accuracy.max_panels.unwrap_or(usize::MAX).min(held as usize)
}

fn refine(
    case: &Case,
    panels: Panels,
    states: &[States],
    progress: &(dyn Fn(&Event) + Sync),
) -> Result<Finished, StudyError> {
    let start = adapt::start(FIRST_PANELS, Some(most_at_first(case)), panels);
    let limits = Limits {
        max_panels: case.accuracy.max_panels,
        time: case.accuracy.time_limit,
        memory: memory_limit(case),
    };
    let needed = dense::bytes(start.len(), start.n_rows, start.copies());
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
            field: round.field.map(|reached| (reached, case.accuracy.max_field)),
            left: round.next,
        });
    };
    // A matrix that settles no state is told with the results; until then there is no maximum to aim at.
    let settled = |matrix: &Matrix| -> Vec<Vec<f64>> {
        let settle = |states: &States| circuit::settle(matrix, &states.rows, &states.groups);
        let all: Result<Vec<_>, _> = states.iter().map(settle).collect();
        all.map_or_else(|_| Vec::new(), |all| all.into_iter().map(|s| s.potentials).collect())
    };
    let aim = Aim { max_field: case.accuracy.max_field, potentials: &settled };
    let demand = Demand { capacitance: asked, field: (!states.is_empty()).then_some(aim) };
    adapt::run(start, case.relative_permittivity, demand, &limits, &tell)
        .map_err(|error| StudyError::Singular(error.to_string()))
}
