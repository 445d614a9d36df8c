//! Repeated electrodes: `name` with `count` copies becomes `name.1`, the drawn one, to `name.count`.

use crate::base::Motion;
use crate::base::Vec3;
use crate::base::units::Dimension;
use crate::case::Copy;
use crate::case::Electrode;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::resolve_electrode as resolve;
use crate::case::resolve_value as value;
use crate::case::wire;
use std::f64::consts::TAU;
use std::ops::Range;
use toml::Spanned;

/// Most copies of one electrode, the drawn one included.
///
/// Each is a row of the matrices: a record of 1,000 rows holds 6 million numbers, 130 MB.
const MOST_COPIES: usize = 1000;

/// One table with its place.
struct Wanted {
    of: String,
    count: usize,
    motion: Motion,
    at: Range<usize>,
}

/// The electrodes with each copied one replaced by its copies, in its place.
pub(super) fn expanded(
    wires: &[Spanned<wire::Copies>],
    electrodes: Vec<Electrode>,
    unit: f64,
    sink: &mut Sink,
) -> Vec<Electrode> {
    let mut wanted: Vec<Wanted> = Vec::new();
    for wire in wires {
        let Some(next) = copies(wire, &electrodes, unit, sink) else { continue };
        if wanted.iter().any(|other| other.of == next.of) {
            let what = "electrode with copies";
            sink.note(next.at, Fault::Twice { what, name: next.of });
        } else {
            wanted.push(next);
        }
    }
    let mut all: Vec<Electrode> = Vec::new();
    for electrode in electrodes {
        match wanted.iter().find(|wanted| wanted.of == electrode.name) {
            None => all.push(electrode),
            Some(wanted) => all.extend((0..wanted.count).map(|number| copy(&electrode, wanted, number))),
        }
    }
    for wanted in &wanted {
        check(wanted, &all, sink);
    }
    all
}

/// Faults where a name of a copy is taken.
fn check(wanted: &Wanted, all: &[Electrode], sink: &mut Sink) {
    for (n, electrode) in all.iter().enumerate() {
        let own = electrode.copy.as_ref().is_some_and(|copy| copy.of == wanted.of);
        if own && all.iter().enumerate().any(|(m, other)| m != n && other.name == electrode.name) {
            let fault = Fault::Twice { what: "electrode name", name: electrode.name.clone() };
            sink.note(wanted.at.clone(), fault);
        }
    }
}

fn copy(electrode: &Electrode, wanted: &Wanted, number: usize) -> Electrode {
    let Wanted { of, count, motion, .. } = wanted;
    Electrode {
        name: format!("{of}.{}", number + 1),
        copy: Some(Copy { of: of.clone(), number, count: *count, motion: *motion }),
        ..electrode.clone()
    }
}

/// Names for which `name` stands: those of the copies of a copied electrode, else itself.
pub(super) fn named(name: &str, electrodes: &[Electrode]) -> Vec<String> {
    let of = |electrode: &&Electrode| electrode.copy.as_ref().is_some_and(|copy| copy.of == name);
    let copies: Vec<String> = electrodes.iter().filter(of).map(|electrode| electrode.name.clone()).collect();
    if copies.is_empty() { vec![name.to_owned()] } else { copies }
}

fn copies(
    wire: &Spanned<wire::Copies>,
    electrodes: &[Electrode],
    unit: f64,
    sink: &mut Sink,
) -> Option<Wanted> {
    let (span, wire) = (wire.span(), wire.get_ref());
    let of = value::needed_text(&wire.of, "of", ("a [[copies]]", span.clone()), sink);
    let at = wire.of.as_ref().map_or(span.clone(), Spanned::span);
    if !of.is_empty() && electrodes.iter().all(|electrode| electrode.name != of) {
        sink.note(at.clone(), resolve::no_electrode("of", &of, electrodes));
    }
    let table = format!("the copies of `{of}`");
    let wanted = "a whole number from 2 to 1000, the drawn electrode counted";
    value::needed(&wire.count, "count", wanted, (&table, span.clone()), sink);
    let count = value::count(&wire.count, "count", (2, MOST_COPIES, wanted), sink);
    let found = usize::from(wire.rotate.is_some()) + usize::from(wire.step.is_some());
    if found != 1 {
        let fault = Fault::ExactlyOne { table, wanted: "`rotate` and `step`", found };
        sink.note(span, fault);
        return None;
    }
    let motion = match &wire.rotate {
        Some(turn) => turned(turn, count, unit, sink),
        None => stepped(&wire.step, unit, sink),
    };
    (!of.is_empty()).then_some(Wanted { of, count: count?, motion: motion?, at })
}

/// A turn; without an angle the whole turn divided evenly.
fn turned(wire: &Spanned<wire::Turn>, count: Option<usize>, unit: f64, sink: &mut Sink) -> Option<Motion> {
    let (span, wire) = (wire.span(), wire.get_ref());
    value::needed(&wire.axis, "axis", "a direction such as [0, 0, 1]", ("rotate", span), sink);
    let axis = value::direction(&wire.axis, "axis", sink);
    if wire.through.is_none() {
        sink.assume("copies.rotate.through", "[0, 0, 0]");
    }
    let through = value::vector(&wire.through, "through", unit, sink).unwrap_or_else(Vec3::zeros);
    let Some(at) = &wire.angle else {
        sink.assume("copies.rotate.angle", "360 deg / count");
        return Some(Motion::Turn { through, axis: axis?, angle: TAU / count? as f64 });
    };
    let angle = value::quantity(&wire.angle, "angle", Dimension::Angle, sink)?;
    let span = angle.abs() * (count? - 1) as f64;
    // The last copy must not come round to the first.
    if 0.0 < angle.abs() && span < TAU - 0.5 * angle.abs() {
        return Some(Motion::Turn { through, axis: axis?, angle });
    }
    let (found, wanted) =
        (value::written(at.get_ref()), "an angle other than zero, with all copies within one turn");
    sink.note(at.span(), Fault::Range { word: "angle".to_owned(), found, wanted });
    None
}

fn stepped(step: &wire::Field, unit: f64, sink: &mut Sink) -> Option<Motion> {
    let vector = value::vector(step, "step", unit, sink)?;
    if 0.0 < vector.norm() {
        return Some(Motion::Step(vector));
    }
    let (found, wanted) = ("[0, 0, 0]".to_owned(), "the vector from one copy to the next, not zero");
    sink.note(step.as_ref()?.span(), Fault::Range { word: "step".to_owned(), found, wanted });
    None
}
