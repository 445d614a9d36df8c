//! Results of the voltage cases.

use super::record::edge_records;
use super::record::medium_name;
use super::state::States;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::ValueIs;
use crate::circuit;
use crate::circuit::CircuitError;
use crate::circuit::Settled;
use crate::circuit::State;
use crate::operator::Sources;
use crate::physics::field;
use crate::physics::field::Kind;
use crate::physics::field::Peak;
use crate::physics::look;
use crate::physics::solved::Solved;
use crate::record::Edge;
use crate::record::Look;
use crate::record::Maximum;
use crate::record::VoltageCase;
use std::collections::BTreeMap;

/// What depends on applied potentials.
pub(super) struct Voltage {
    pub(super) cases: Vec<VoltageCase>,
    pub(super) edges: Vec<Edge>,
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
    bars: &[Vec<f64>],
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
    let (mut cases, mut edges, mut potentials) = (Vec::new(), Vec::new(), Vec::new());
    let charge_bars: Vec<f64> =
        (0..solved.n_rows()).map(|i| bars[i][i] / solved.matrix[i][i].abs()).collect();
    for (voltages, states) in case.voltage_cases.iter().zip(states) {
        let settled = circuit::settle(&solved.matrix, &states.rows, &states.groups)?;
        let peaks = field::peaks(solved, sources, &settled.potentials, &charge_bars);
        let maxima = peaks.iter().map(|peak| maximum(&case.electrodes[peak.body], peak)).collect();
        let floating = floating(states);
        cases.push(one(&voltages.name, voltages.value_is, solved, &settled, &floating, maxima));
        edges.extend(edge_records(&voltages.name, solved, &settled.potentials));
        for (look, record) in case.looks.iter().zip(&mut looks) {
            let seen = look::look(solved, sources, &map, &settled.potentials, &look.points);
            record.potential_volt.insert(voltages.name.clone(), seen.iter().map(|s| s.potential).collect());
            let field = |s: &look::Seen| [s.field.x, s.field.y, s.field.z];
            record.field_v_per_m.insert(voltages.name.clone(), seen.iter().map(field).collect());
        }
        potentials.push(settled.potentials);
    }
    Ok(Voltage { cases, edges, looks, potentials })
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

/// A maximum against its limit.
fn maximum(electrode: &Electrode, peak: &Peak) -> Maximum {
    let bounded = peak.kind == Kind::Smooth;
    let limit = electrode.field_limit;
    let judged = match limit {
        None => "no_limit",
        // Off the edges alone it is over already; at the edge it is more.
        Some((limit, _)) if limit < peak.field - peak.bar => "not_met",
        Some((limit, _)) if bounded && peak.field + peak.bar <= limit => "met",
        Some(_) => "not_decided",
    };
    Maximum {
        electrode: electrode.name.clone(),
        kind: if bounded { "smooth" } else { "edge" }.to_owned(),
        field_v_per_m: bounded.then_some(peak.field),
        bar_v_per_m: bounded.then_some(peak.bar),
        raw_v_per_m: peak.raw,
        smooth_v_per_m: bounded.then_some(peak.field),
        at_metre: [peak.at.x, peak.at.y, peak.at.z],
        curvature_per_metre: peak.curvature,
        limit_v_per_m: limit.map(|(limit, _)| limit),
        limit_is: limit.map(|(_, is)| word(is).to_owned()),
        // A field under its bar leaves no margin that means anything.
        margin: limit.filter(|_| bounded && peak.bar < peak.field).map(|(limit, _)| limit / peak.field - 1.0),
        judged: judged.to_owned(),
    }
}
