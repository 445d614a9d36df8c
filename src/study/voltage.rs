//! Results of the voltage cases.

use super::edges::Edges;
use super::edges::Top;
use super::record::medium_name;
use super::state::States;
use crate::base::Finding;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::ValueIs;
use crate::circuit;
use crate::circuit::CircuitError;
use crate::circuit::Settled;
use crate::circuit::State;
use crate::operator::Sources;
use crate::physics::field;
use crate::physics::field::Peak;
use crate::physics::look;
use crate::physics::solved::Solved;
use crate::physics::solved::unit_weight;
use crate::record::Corner;
use crate::record::Edge;
use crate::record::FurtherMaximum;
use crate::record::Look;
use crate::record::Maximum;
use crate::record::VoltageCase;
use std::collections::BTreeMap;

/// What depends on applied potentials.
pub(super) struct Voltage {
    pub(super) cases: Vec<VoltageCase>,
    pub(super) edges: Vec<Edge>,
    pub(super) corners: Vec<Corner>,
    /// What the edges tell: one of a kind for each body.
    pub(super) findings: Vec<Finding>,
    pub(super) looks: Vec<Look>,
    /// Row potentials of each case [V].
    pub(super) potentials: Vec<Vec<f64>>,
}

/// Settles every case and finds maxima, edges and looks.
///
/// # Errors
/// [`CircuitError`] where a floating row has no capacitance.
pub(super) fn results(
    case: &Case,
    solved: &Solved,
    sources: &Sources,
    states: &[States],
) -> Result<Voltage, CircuitError> {
    let map = look::Map::new(&solved.panels);
    let media = |points: &[crate::base::Vec3]| -> Vec<String> {
        points.iter().map(|x| medium_name(map.medium(x), solved)).collect()
    };
    let mut looks: Vec<Look> = case
        .looks
        .iter()
        .map(|look| Look {
            name: look.name.clone(),
            points_metre: look.points.iter().map(|x| [x.x, x.y, x.z]).collect(),
            medium: media(&look.points),
            potential_volt: BTreeMap::new(),
            field_v_per_m: BTreeMap::new(),
        })
        .collect();
    let (mut cases, mut potentials) = (Vec::new(), Vec::new());
    let (mut edges, mut corners, mut findings) = (Vec::new(), Vec::new(), Vec::<Finding>::new());
    let n = solved.n_rows();
    let relative = |i: usize| {
        let u = unit_weight(i, n);
        solved.bar(&u, &u).total() / solved.matrix[i][i].abs()
    };
    let charge_bars: Vec<f64> = (0..n).map(relative).collect();
    let sharp = Edges::find(case, solved, sources, &charge_bars);
    let survey = field::survey(&solved.panels);
    for (voltages, states) in case.voltage_cases.iter().zip(states) {
        let settled = circuit::settle(&solved.matrix, &states.rows, &states.groups)?;
        let peaks = field::surveyed_peaks(&survey, solved, sources, &settled.potentials);
        let found = sharp.at(&voltages.name, &settled.potentials);
        let one_of = |peak: &Peak| maximum(&case.electrodes[peak.body], peak, found.tops[peak.body]);
        let maxima = peaks.iter().map(one_of).collect();
        let floating = floating(states);
        cases.push(one(&voltages.name, voltages.value_is, solved, &settled, &floating, maxima));
        edges.extend(found.edges);
        corners.extend(found.corners);
        // The same place in another case says nothing new.
        let new = |f: &Finding| findings.iter().all(|other| other.code != f.code || other.place != f.place);
        let new: Vec<Finding> = found.findings.into_iter().filter(new).collect();
        findings.extend(new);
        for (look, record) in case.looks.iter().zip(&mut looks) {
            let seen = look::look(solved, sources, &map, &settled.potentials, &look.points);
            record.potential_volt.insert(voltages.name.clone(), seen.iter().map(|s| s.potential).collect());
            let field = |s: &look::Seen| [s.field.x, s.field.y, s.field.z];
            record.field_v_per_m.insert(voltages.name.clone(), seen.iter().map(field).collect());
        }
        potentials.push(settled.potentials);
    }
    Ok(Voltage { cases, edges, corners, findings, looks, potentials })
}

/// Rows whose potential is found, not given.
fn floating(states: &States) -> Vec<usize> {
    let given = |row: usize| matches!(states.rows[row], State::Potential(_));
    let group = |row: usize| states.groups.iter().find(|group| group.contains(&row));
    let held = |row: usize| group(row).map_or(given(row), |group| group.iter().any(|member| given(*member)));
    (0..states.rows.len())
        .filter(|row| !held(*row) && matches!(states.rows[*row], State::Charge(_)))
        .collect()
}

fn one(
    name: &str,
    value_is: ValueIs,
    solved: &Solved,
    settled: &Settled,
    floating: &[usize],
    maxima: Vec<Maximum>,
) -> VoltageCase {
    let names: Vec<String> = solved.panels.assembly.rows.iter().map(|row| row.name.clone()).collect();
    let v = &settled.potentials;
    let by_name = |values: Vec<f64>| names.iter().cloned().zip(values).collect::<BTreeMap<String, f64>>();
    let rows = 0..names.len();
    let potential_bar = |m: usize| solved.bar(&settled.weights_potential(m), v).total();
    let alone = |i: usize| settled.weights_charge(i).iter().map(|w| w.abs()).fold(0.0, f64::max) < ROUNDING;
    let charge_bar =
        |i: usize| if alone(i) { 0.0 } else { solved.bar(&settled.weights_charge(i), v).total() };
    VoltageCase {
        name: name.to_owned(),
        value_is: word(value_is).to_owned(),
        potentials_bar_volt: by_name(rows.clone().map(potential_bar).collect()),
        potentials_volt: by_name(v.clone()),
        floating: floating.iter().map(|row| names[*row].clone()).collect(),
        charges_bar_coulomb: by_name(rows.map(charge_bar).collect()),
        charges_coulomb: by_name(settled.charges.clone()),
        energy_joule: settled.energy,
        energy_bar_joule: solved.bar(&settled.weights_energy(), v).total(),
        maxima,
        forces: Vec::new(),
    }
}

/// Weights of a charge under which it is given and the rest is rounding [1].
const ROUNDING: f64 = 1e-9;

/// The word of a value.
pub(super) fn word(value_is: ValueIs) -> &'static str {
    match value_is {
        ValueIs::Peak => "peak",
        ValueIs::Rms => "rms",
        ValueIs::Dc => "dc",
    }
}

/// A maximum against its limit; `top` is what the edges make of it.
fn maximum(electrode: &Electrode, peak: &Peak, top: Top) -> Maximum {
    let rounded = if let Top::Rounded(rounded, at, _) = top { Some((rounded, at)) } else { None };
    let bounded = rounded.is_some() || top == Top::NoEdge;
    let [field, bar] = rounded.map_or([peak.field, peak.bar], |(r, _)| [r.field, r.bar]);
    let kind = match top {
        Top::Rounded(_, _, kind) | Top::Unbounded(kind) => kind,
        Top::NoEdge => "smooth",
    };
    let limit = electrode.field_limit;
    let judged = match limit {
        None => "no_limit",
        // Off the edges alone it is over already; at the edge it is more.
        Some((limit, _)) if limit < field - bar => "not_met",
        Some((limit, _)) if bounded && field + bar <= limit => "met",
        Some(_) => "not_decided",
    };
    let at = rounded.map_or(peak.at, |(_, at)| at);
    Maximum {
        electrode: electrode.name.clone(),
        kind: kind.to_owned(),
        field_v_per_m: bounded.then_some(field),
        bar_v_per_m: bounded.then_some(bar),
        raw_v_per_m: peak.raw,
        smooth_v_per_m: rounded.is_none().then_some(peak.field),
        at_metre: [at.x, at.y, at.z],
        curvature_per_metre: if rounded.is_some() { None } else { peak.curvature },
        area_above_90_m2: peak.area_above.map(|[most, _]| most),
        area_above_80_m2: peak.area_above.map(|[_, more]| more),
        further: peak.further.iter().map(further).collect(),
        limit_v_per_m: limit.map(|(limit, _)| limit),
        limit_is: limit.map(|(_, is)| word(is).to_owned()),
        // A field under its bar leaves no margin that means anything.
        margin: limit.filter(|_| bounded && bar < field).map(|(limit, _)| limit / field - 1.0),
        judged: judged.to_owned(),
    }
}

fn further(further: &field::Further) -> FurtherMaximum {
    FurtherMaximum {
        field_v_per_m: further.field,
        bar_v_per_m: further.bar,
        at_metre: [further.at.x, further.at.y, further.at.z],
    }
}
