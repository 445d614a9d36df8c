//! Voltage cases and looks.

use crate::base::Vec3;
use crate::base::units::Dimension;
use crate::case::Electrode;
use crate::case::Look;
use crate::case::Role;
use crate::case::VoltageCase;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::resolve_electrode as resolve;
use crate::case::resolve_value as value;
use crate::case::wire;
use crate::case::wire::Value;
use std::ops::Range;
use toml::Spanned;

/// All voltage cases, checked against the electrodes and bonds.
pub(super) fn voltage_cases(
    wires: &[Spanned<wire::VoltageCase>],
    electrodes: &[Electrode],
    bonds: &[Vec<String>],
    sink: &mut Sink,
) -> Vec<VoltageCase> {
    let groups = groups(electrodes, bonds);
    let mut cases: Vec<VoltageCase> = Vec::new();
    for wire in wires {
        let case = voltage_case(wire.get_ref(), wire.span(), electrodes, sink);
        let span = wire.get_ref().name.as_ref().map_or(wire.span(), Spanned::span);
        twice("voltage case", &case.name, cases.iter().map(|case| case.name.as_str()), &span, sink);
        for group in &groups {
            check_group(&case, group, &span, sink);
        }
        let without: Vec<String> = groups.iter().flat_map(|group| live_without(&case, group)).collect();
        if !without.is_empty() {
            sink.note(span, Fault::LiveWithout { case: case.name.clone(), electrodes: without });
        }
        cases.push(case);
    }
    cases
}

/// Notes a fault if `name` is among the earlier names.
fn twice<'a>(
    what: &'static str,
    name: &str,
    mut earlier: impl Iterator<Item = &'a str>,
    span: &Range<usize>,
    sink: &mut Sink,
) {
    if !name.is_empty() && earlier.any(|other| other == name) {
        sink.note(span.clone(), Fault::Twice { what, name: name.to_owned() });
    }
}

/// Electrodes held at one potential.
struct Group<'a> {
    members: Vec<&'a Electrode>,
    earthed: bool,
}

/// Electrodes joined by bonds, one group for each electrode that is alone.
fn groups<'a>(electrodes: &'a [Electrode], bonds: &[Vec<String>]) -> Vec<Group<'a>> {
    let index = |name: &str| electrodes.iter().position(|electrode| electrode.name == name);
    // The last label is the one of earth.
    let mut label: Vec<usize> = (0..=electrodes.len()).collect();
    for bond in bonds {
        let members: Vec<usize> = bond
            .iter()
            .filter_map(|name| if name == resolve::EARTH { Some(electrodes.len()) } else { index(name) })
            .collect();
        let Some(first) = members.first().map(|n| label[*n]) else { continue };
        let joined: Vec<usize> = members.iter().map(|n| label[*n]).collect();
        label.iter_mut().filter(|l| joined.contains(l)).for_each(|l| *l = first);
    }
    let mut groups: Vec<(usize, Group<'a>)> = Vec::new();
    for (n, electrode) in electrodes.iter().enumerate() {
        match groups.iter_mut().find(|(l, _)| *l == label[n]) {
            Some((_, group)) => group.members.push(electrode),
            None => {
                let earthed = label[n] == label[electrodes.len()];
                groups.push((label[n], Group { members: vec![electrode], earthed }));
            }
        }
    }
    groups.into_iter().map(|(_, group)| group).collect()
}

/// Notes faults where values of one group contradict each other.
fn check_group(case: &VoltageCase, group: &Group<'_>, span: &Range<usize>, sink: &mut Sink) {
    let given = |values: &[(String, f64)]| -> Vec<(String, f64)> {
        values.iter().filter(|(name, _)| group.members.iter().any(|e| e.name == *name)).cloned().collect()
    };
    let (potentials, charges) = (given(&case.potentials), given(&case.charges));
    let case_name = case.name.clone();
    if group.earthed {
        let values = potentials.iter().filter(|(_, v)| *v != 0.0).chain(&charges);
        for (electrode, _) in values {
            let fault = Fault::BondEarth { case: case_name.clone(), electrode: electrode.clone() };
            sink.note(span.clone(), fault);
        }
        return;
    }
    if !potentials.is_empty() && !charges.is_empty() {
        let mut electrodes: Vec<String> =
            potentials.iter().chain(&charges).map(|(name, _)| name.clone()).collect();
        electrodes.dedup();
        sink.note(span.clone(), Fault::Both { case: case_name.clone(), electrodes });
    }
    if potentials.windows(2).any(|pair| pair[0].1 < pair[1].1 || pair[1].1 < pair[0].1) {
        let electrodes = potentials.iter().map(|(name, _)| name.clone()).collect();
        sink.note(span.clone(), Fault::BondSplit { case: case_name, electrodes });
    }
}

/// The live electrodes of a group for which a case says nothing.
fn live_without(case: &VoltageCase, group: &Group<'_>) -> Vec<String> {
    let given = case.potentials.iter().chain(&case.charges);
    if group.earthed || given.into_iter().any(|(name, _)| group.members.iter().any(|e| e.name == *name)) {
        return Vec::new();
    }
    group.members.iter().filter(|e| e.role == Role::Live).map(|e| e.name.clone()).collect()
}

fn voltage_case(
    wire: &wire::VoltageCase,
    span: Range<usize>,
    electrodes: &[Electrode],
    sink: &mut Sink,
) -> VoltageCase {
    let name = value::needed_text(&wire.name, "name", ("a [[voltage_case]]", span.clone()), sink);
    let table = format!("the voltage case `{name}`");
    let wanted = "`peak`, `rms` or `dc`: what the values mean in time";
    value::needed(&wire.value_is, "value_is", wanted, (&table, span), sink);
    let value_is = value::choice(&wire.value_is, "value_is", &resolve::VALUE_IS, sink);
    let value_is = value_is.unwrap_or(crate::case::ValueIs::Peak);
    let crest = resolve::to_crest(value_is);
    let potentials = pairs(&wire.potentials, ("potentials", Dimension::Potential), electrodes, sink);
    let charges = pairs(&wire.charges, ("charges", Dimension::Charge), electrodes, sink);
    let scaled = |values: Vec<(String, f64)>| values.into_iter().map(|(name, v)| (name, v * crest)).collect();
    VoltageCase { name, value_is, potentials: scaled(potentials), charges: scaled(charges) }
}

fn pairs(
    wire: &wire::Pairs,
    (word, dimension): (&str, Dimension),
    electrodes: &[Electrode],
    sink: &mut Sink,
) -> Vec<(String, f64)> {
    let mut values = Vec::new();
    for (name, at) in &wire.0 {
        let key = format!("{word}.{}", name.get_ref());
        let number = value::quantity_of(at, &key, dimension, sink);
        if name.get_ref() == resolve::EARTH {
            let fault = Fault::Reserved { name: name.get_ref().clone(), what: "what takes a value" };
            sink.note(name.span(), fault);
        } else if electrodes.iter().all(|electrode| electrode.name != *name.get_ref()) {
            sink.note(name.span(), resolve::no_electrode(word, name.get_ref(), electrodes));
        }
        // A value that cannot be read is told of already; its electrode counts as given.
        values.push((name.get_ref().clone(), number.unwrap_or(f64::NAN)));
    }
    values
}

/// Most points of one look.
///
/// Each point costs one pass over all panels: 100,000 points at 6,000 panels are 6e8 kernel values,
/// about 30 s on one core at 50 ns each.
const MOST_POINTS: usize = 100_000;

/// All looks.
pub(super) fn looks(wires: &[Spanned<wire::Look>], unit: f64, sink: &mut Sink) -> Vec<Look> {
    let mut looks: Vec<Look> = Vec::new();
    for wire in wires {
        let (span, wire) = (wire.span(), wire.get_ref());
        let name = value::needed_text(&wire.name, "name", ("a [[look]]", span.clone()), sink);
        let at = wire.name.as_ref().map_or(span.clone(), Spanned::span);
        twice("look", &name, looks.iter().map(|look| look.name.as_str()), &at, sink);
        let found = usize::from(wire.point.is_some())
            + usize::from(wire.line.is_some())
            + usize::from(wire.sheet.is_some());
        if found != 1 {
            let wanted = "`point`, `line` and `sheet`";
            sink.note(at, Fault::ExactlyOne { table: format!("the look `{name}`"), wanted, found });
        }
        let points = match (&wire.point, &wire.line, &wire.sheet) {
            (Some(_), ..) => value::vector(&wire.point, "point", unit, sink).into_iter().collect(),
            (None, Some(line), _) => line_points(line, unit, sink),
            (None, None, Some(sheet)) => sheet_points(sheet, unit, sink),
            (None, None, None) => Vec::new(),
        };
        looks.push(Look { name, points });
    }
    looks
}

/// Points evenly spaced from one end to the other, both included [m].
fn line_points(line: &Spanned<wire::Line>, unit: f64, sink: &mut Sink) -> Vec<Vec3> {
    let (span, line) = (line.span(), line.get_ref());
    let wanted = "a whole number of points from 2 to 100000, both ends included";
    value::needed(&line.from, "from", "a point [x, y, z]", ("line", span.clone()), sink);
    value::needed(&line.to, "to", "a point [x, y, z]", ("line", span.clone()), sink);
    value::needed(&line.points, "points", wanted, ("line", span), sink);
    let from = value::vector(&line.from, "from", unit, sink);
    let to = value::vector(&line.to, "to", unit, sink);
    let points = value::count(&line.points, "points", (2, MOST_POINTS, wanted), sink);
    let (Some(from), Some(to), Some(points)) = (from, to, points) else { return Vec::new() };
    (0..points).map(|n| from + (to - from) * share(n, points)).collect()
}

/// Place of point `n` of `points` between two ends [1].
fn share(n: usize, points: usize) -> f64 {
    // Counts up to `MOST_POINTS` are exact in a double.
    n as f64 / (points - 1) as f64
}

/// Points of the parallelogram at `corner` with the sides `along` and `across` [m].
///
/// `points = [m, n]` along and across, corners included; those along follow each other.
fn sheet_points(sheet: &Spanned<wire::Sheet>, unit: f64, sink: &mut Sink) -> Vec<Vec3> {
    let (span, sheet) = (sheet.span(), sheet.get_ref());
    let side = "the vector of a side, [x, y, z]";
    let wanted = "two whole numbers from 2, along and across, with at most 100000 points in all";
    value::needed(&sheet.corner, "corner", "a point [x, y, z]", ("sheet", span.clone()), sink);
    value::needed(&sheet.along, "along", side, ("sheet", span.clone()), sink);
    value::needed(&sheet.across, "across", side, ("sheet", span.clone()), sink);
    value::needed(&sheet.points, "points", wanted, ("sheet", span), sink);
    let corner = value::vector(&sheet.corner, "corner", unit, sink);
    let along = value::vector(&sheet.along, "along", unit, sink);
    let across = value::vector(&sheet.across, "across", unit, sink);
    let counts = sheet.points.as_ref().and_then(|at| {
        let Value::List(items) = at.get_ref() else {
            sink.note(at.span(), Fault::Form { word: "points".to_owned(), wanted });
            return None;
        };
        let limits = (2, MOST_POINTS, wanted);
        let counts: Vec<usize> =
            items.iter().filter_map(|item| value::count_of(item, "points", limits, sink)).collect();
        if items.len() != 2 || (counts.len() == 2 && MOST_POINTS < counts[0] * counts[1]) {
            sink.note(at.span(), Fault::Form { word: "points".to_owned(), wanted });
            return None;
        }
        (counts.len() == 2).then(|| (counts[0], counts[1]))
    });
    let (Some(corner), Some(along), Some(across), Some((m, n))) = (corner, along, across, counts) else {
        return Vec::new();
    };
    let row = |k: usize| (0..m).map(move |j| corner + along * share(j, m) + across * share(k, n));
    (0..n).flat_map(row).collect()
}
