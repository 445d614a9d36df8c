//! Round after round.

use super::aim;
use super::aim::Sight;
use super::aim::WidestPeak;
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
    /// The bars of maxima stood still over [`PATIENCE`] rounds.
    Stalled,
}

/// Rounds without a narrower bar of the maxima after which refinement for them ends, the capacitance being met.
const PATIENCE: usize = 6;

/// Inverse of the share of panels that are cut in a round to mend the charges for maxima alone [1].
const FOR_MAXIMA: usize = 4;

/// What counts as narrower [1].
const NARROWER: f64 = 0.95;

/// What is known at the end of a round.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Round {
    /// Counted from 1.
    pub number: usize,
    /// Panels.
    pub panels: usize,
    /// Largest relative bar of the capacitances [1].
    pub reached: f64,
    /// Largest relative bar of the maxima that are steered [1].
    pub field: Option<f64>,
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
    /// Its largest relative bar of the capacitances [1].
    pub reached: f64,
    /// Its maximum with the largest bar, of those that are steered.
    pub widest: Option<WidestPeak>,
    /// All rounds.
    pub rounds: Vec<Round>,
    /// Why it stopped.
    pub stop: Stop,
}

/// A round with what was seen of it.
struct Looked {
    solved: Solved,
    reached: f64,
    widest: Option<WidestPeak>,
}

/// What comes after a round.
enum Next {
    Stop(Stop),
    Panels(Box<Panels>),
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
    let mut best: Option<Looked> = None;
    loop {
        let before = began.elapsed().as_secs_f64();
        let solved = solved::solve(panels, eps_r)?;
        let reached = mark::reached(&solved.matrix, &solved.bars());
        let sight = demand.field.as_ref().map(|aim| aim::sight(&solved, aim));
        let widest = sight.as_ref().and_then(|sight| sight.widest);
        let seconds = began.elapsed().as_secs_f64();
        let n = solved.panels.len();
        let field = widest.map(|widest| widest.bar);
        let mut round = Round { number: rounds.len() + 1, panels: n, reached, field, seconds, next: None };
        rounds.push(round);
        let next = decide(&solved, sight.as_ref(), &rounds, &demand, limits);
        let looked = Looked { solved, reached, widest };
        panels = match next {
            Next::Stop(stop) => {
                tell(&round);
                return Ok(finished(looked, best, rounds, stop, &demand));
            }
            Next::Panels(panels) => *panels,
        };
        // Between the square of assembly and the cube of factorisation the cube is the safe guess.
        let growth = (panels.len() as f64 / n as f64).powi(3);
        let next = (seconds - before) * growth;
        let late = limits.time.is_some_and(|limit| limit < seconds + next);
        if !late {
            round.next = Some(next);
        }
        tell(&round);
        let last = rounds.len() - 1;
        rounds[last] = round;
        if late {
            return Ok(finished(looked, best, rounds, Stop::Time, &demand));
        }
        if best.as_ref().is_none_or(|best| share(&looked, &demand) <= share(best, &demand)) {
            best = Some(looked);
        }
    }
}

/// How much wider the bars of the last round must be for an earlier one to be kept [1].
///
/// Bars go up and down by a third from round to round while the error falls; needles of coarse drawings
/// were seen to widen them tenfold.
const WORSE: f64 = 1.5;

/// The largest bar over what is asked of it [1].
fn share(looked: &Looked, demand: &Demand) -> f64 {
    let field =
        demand.field.as_ref().zip(looked.widest).map_or(0.0, |(aim, widest)| widest.bar / aim.max_field);
    (looked.reached / demand.capacitance).max(field)
}

/// The last round, or an earlier one whose bars were far smaller.
fn finished(last: Looked, best: Option<Looked>, rounds: Vec<Round>, stop: Stop, demand: &Demand) -> Finished {
    let earlier = best.filter(|best| WORSE * share(best, demand) < share(&last, demand));
    let Looked { solved, reached, widest } = earlier.unwrap_or(last);
    Finished { solved, reached, widest, rounds, stop }
}

/// Whether to stop, and else the panels of the next round.
fn decide(
    solved: &Solved,
    sight: Option<&Sight>,
    rounds: &[Round],
    demand: &Demand,
    limits: &Limits,
) -> Next {
    let charges_met = rounds.last().is_some_and(|round| round.reached <= demand.capacitance);
    let aim = demand.field.as_ref();
    let unmet =
        aim.zip(sight).filter(|(aim, sight)| sight.widest.is_some_and(|widest| aim.max_field < widest.bar));
    if charges_met && unmet.is_none() {
        return Next::Stop(Stop::Met);
    }
    if charges_met && stalled(rounds, demand.capacitance) {
        return Next::Stop(Stop::Stalled);
    }
    let n = solved.panels.len();
    let room = limits.max_panels.map_or(usize::MAX, |most| most.saturating_sub(n));
    if room < solved.panels.copies() {
        return Next::Stop(Stop::MaxPanels);
    }
    let charges = !charges_met || unmet.is_some_and(|(aim, sight)| sight.wants_charges(aim));
    // For maxima alone the panels grow by no more than a part of their count.
    let most = if charges_met { room.min(n.div_ceil(FOR_MAXIMA)) } else { room };
    let cuts = if charges { mark::cuts(solved, most) } else { Vec::new() };
    let room = room - cuts.len();
    let mut panels = split::bisect(&solved.panels, &cuts);
    if let Some((aim, sight)) = unmet {
        panels = sight.refined(panels, aim, room);
    }
    if panels.len() == n {
        return Next::Stop(Stop::NothingToCut);
    }
    let fits = dense::bytes(panels.len(), solved.n_rows(), solved.panels.copies()) <= limits.memory;
    if fits { Next::Panels(Box::new(panels)) } else { Next::Stop(Stop::Memory) }
}

/// Whether the bars of the maxima stood still while nothing else was left to do.
fn stalled(rounds: &[Round], capacitance: f64) -> bool {
    let Some((early, late)) = rounds.len().checked_sub(PATIENCE).map(|k| rounds.split_at(k)) else {
        return false;
    };
    let least = |rounds: &[Round]| rounds.iter().filter_map(|r| r.field).fold(f64::INFINITY, f64::min);
    let met = late.iter().all(|round| round.reached <= capacitance);
    met && !early.is_empty() && NARROWER * least(early) <= least(late)
}
