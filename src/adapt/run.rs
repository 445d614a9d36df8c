//! Round after round.

use super::mark;
use super::mark::Demand;
use super::split;
use crate::operator::dense;
use crate::panel::Panels;
use crate::physics::solved;
use crate::physics::solved::Solved;
use crate::solve::direct::SolveError;
use std::time::Instant;

/// What ends the refinement before the demand is met.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limits {
    /// Most panels.
    pub max_panels: Option<usize>,
    /// Longest time [s].
    pub time: Option<f64>,
    /// Most memory [B].
    pub memory: f64,
}

/// Why the last round is the last.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stop {
    /// The demand is met.
    Met,
    /// The next round would exceed `max_panels`.
    MaxPanels,
    /// The next round would exceed the time.
    Time,
    /// The next round would exceed the memory.
    Memory,
    /// No panel is left to cut.
    NothingToCut,
}

/// What is known at the end of a round.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Round {
    /// Counted from 1.
    pub number: usize,
    /// Panels.
    pub panels: usize,
    /// Largest relative bar [1].
    pub reached: f64,
    /// Seconds since the start [s].
    pub seconds: f64,
    /// Estimated seconds of the next round, if there is one [s].
    pub next: Option<f64>,
}

/// The result of the refinement.
#[derive(Clone, Debug)]
pub struct Finished {
    /// The last round, unless an earlier one had far smaller bars.
    pub solved: Solved,
    /// Its largest relative bar [1].
    pub reached: f64,
    /// All rounds.
    pub rounds: Vec<Round>,
    /// Why it stopped.
    pub stop: Stop,
}

/// Refines from round to round until the demand is met or a limit is reached.
///
/// # Errors
/// Those of the factorisation.
pub fn run(
    start: Panels,
    eps_r: f64,
    demand: Demand,
    limits: &Limits,
    tell: &(dyn Fn(&Round) + Sync),
) -> Result<Finished, SolveError> {
    let began = Instant::now();
    let mut panels = start;
    let mut rounds: Vec<Round> = Vec::new();
    let mut best: Option<(f64, Solved)> = None;
    loop {
        let before = began.elapsed().as_secs_f64();
        let solved = solved::solve(panels, eps_r)?;
        let reached = mark::reached(&solved.matrix, &solved.bars());
        let seconds = began.elapsed().as_secs_f64();
        let n = solved.panels.len();
        let mut round = Round { number: rounds.len() + 1, panels: n, reached, seconds, next: None };
        let (stop, cuts) = decide(&solved, reached, demand, limits);
        if let Some(stop) = stop {
            tell(&round);
            rounds.push(round);
            return Ok(finished(solved, reached, best, rounds, stop));
        }
        // Between the square of assembly and the cube of factorisation the cube is the safe guess.
        let growth = ((n + cuts.len()) as f64 / n as f64).powi(3);
        let next = (seconds - before) * growth;
        round.next = Some(next);
        let late = limits.time.is_some_and(|limit| limit < seconds + next);
        if late {
            round.next = None;
        }
        tell(&round);
        rounds.push(round);
        if late {
            return Ok(finished(solved, reached, best, rounds, Stop::Time));
        }
        panels = split::bisect(&solved.panels, &cuts);
        if best.as_ref().is_none_or(|(least, _)| reached <= *least) {
            best = Some((reached, solved));
        }
    }
}

/// How much wider the bars of the last round must be for an earlier one to be kept [1].
///
/// Bars go up and down by a third from round to round while the error falls; needles of coarse drawings
/// were seen to widen them tenfold.
const WORSE: f64 = 1.5;

/// The last round, or an earlier one whose bars were far smaller.
fn finished(
    solved: Solved,
    reached: f64,
    best: Option<(f64, Solved)>,
    rounds: Vec<Round>,
    stop: Stop,
) -> Finished {
    match best {
        Some((least, earlier)) if WORSE * least < reached => {
            Finished { solved: earlier, reached: least, rounds, stop }
        }
        _ => Finished { solved, reached, rounds, stop },
    }
}

/// Whether to stop, and else what to cut.
fn decide(
    solved: &Solved,
    reached: f64,
    demand: Demand,
    limits: &Limits,
) -> (Option<Stop>, Vec<(usize, usize)>) {
    if reached <= demand.capacitance {
        return (Some(Stop::Met), Vec::new());
    }
    let n = solved.panels.len();
    let room = limits.max_panels.map_or(usize::MAX, |most| most.saturating_sub(n));
    if room == 0 {
        return (Some(Stop::MaxPanels), Vec::new());
    }
    let cuts = mark::cuts(solved, room);
    if cuts.is_empty() {
        return (Some(Stop::NothingToCut), cuts);
    }
    let fits = dense::bytes(n + cuts.len(), solved.n_rows()) <= limits.memory;
    (if fits { None } else { Some(Stop::Memory) }, cuts)
}
