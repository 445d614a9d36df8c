//! What each row is held at in each voltage case.

use super::bodies::refusal;
use crate::base::Finding;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::Role;
use crate::case::VoltageCase;
use crate::circuit::State;
use crate::mesh::Assembly;

/// States of the rows in one voltage case, and rows bonded without touching.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct States {
    /// By row.
    pub(super) rows: Vec<State>,
    /// Bonded rows.
    pub(super) groups: Vec<Vec<usize>>,
}

/// States of every voltage case, in case order.
///
/// # Errors
/// A refusal for every row that would be at two potentials.
pub(super) fn states(case: &Case, assembly: &Assembly) -> Result<Vec<States>, Vec<Finding>> {
    let groups = groups(case, assembly);
    let mut refused = Vec::new();
    let mut all = Vec::new();
    for voltage_case in &case.voltage_cases {
        let rows = (0..assembly.rows.len()).map(|row| row_state(case, assembly, voltage_case, row));
        let mut found = Vec::new();
        for (row, state) in rows.enumerate() {
            match state {
                Ok(state) => found.push(state),
                Err(potentials) => {
                    refused.push(clash(&voltage_case.name, &assembly.rows[row].name, &potentials))
                }
            }
        }
        refused.extend(earthed_clashes(case, assembly, voltage_case));
        refused.extend(group_clashes(&groups, &found, assembly, voltage_case));
        // A guard bonded to what it follows needs no source of its own.
        for group in &groups {
            for row in group {
                if matches!(found.get(*row), Some(State::Follow(leader)) if group.contains(leader)) {
                    found[*row] = State::Charge(0.0);
                }
            }
        }
        all.push(States { rows: found, groups: groups.clone() });
    }
    if refused.is_empty() { Ok(all) } else { Err(refused) }
}

fn clash(case: &str, name: &str, potentials: &[f64]) -> Finding {
    let list: Vec<String> = potentials.iter().map(|v| format!("{v} V")).collect();
    refusal(
        "two_potentials",
        format!(
            "voltage case `{case}`: `{name}` is one conductor but would be at {}; give one potential",
            list.join(" and ")
        ),
    )
}

/// Rows of each bond that has several; bonds that share a row are one.
fn groups(case: &Case, assembly: &Assembly) -> Vec<Vec<usize>> {
    let mut groups: Vec<Vec<usize>> = Vec::new();
    for bond in &case.bonds {
        let mut rows: Vec<usize> = bond.iter().filter_map(|name| row_of(case, assembly, name)).collect();
        let (touching, apart): (Vec<_>, Vec<_>) =
            groups.into_iter().partition(|group| group.iter().any(|row| rows.contains(row)));
        rows.extend(touching.into_iter().flatten());
        rows.sort_unstable();
        rows.dedup();
        groups = apart;
        if 1 < rows.len() {
            groups.push(rows);
        }
    }
    groups
}

/// Row of an electrode; none if it belongs to earth or is `earth`.
pub(super) fn row_of(case: &Case, assembly: &Assembly, name: &str) -> Option<usize> {
    let body = case.electrodes.iter().position(|electrode| electrode.name == name)?;
    assembly.rows.iter().position(|row| row.bodies.contains(&(body as u32)))
}

/// Whether the electrode is bonded with earth, through any chain of bonds.
fn bonded_with_earth(case: &Case, name: &str) -> bool {
    let mut reached = vec!["earth".to_owned()];
    let mut grown = true;
    while grown {
        grown = false;
        for bond in &case.bonds {
            if bond.iter().any(|member| reached.contains(member)) {
                let fresh: Vec<String> =
                    bond.iter().filter(|member| !reached.contains(member)).cloned().collect();
                grown |= !fresh.is_empty();
                reached.extend(fresh);
            }
        }
    }
    reached.iter().any(|member| member == name)
}

fn given(list: &[(String, f64)], name: &str) -> Option<f64> {
    list.iter().find(|(electrode, _)| electrode == name).map(|(_, value)| *value)
}

/// State of one electrode by the case, its role and its bonds.
fn electrode_state(case: &Case, assembly: &Assembly, voltages: &VoltageCase, electrode: &Electrode) -> State {
    if let Some(volt) = given(&voltages.potentials, &electrode.name) {
        return State::Potential(volt);
    }
    if let Some(charge) = given(&voltages.charges, &electrode.name) {
        return State::Charge(charge);
    }
    if bonded_with_earth(case, &electrode.name) {
        return State::Potential(0.0);
    }
    match &electrode.role {
        Role::Earthed => State::Potential(0.0),
        // A live electrode without a value is refused with the case; a bonded one takes its partner's.
        Role::Live | Role::Floating => State::Charge(0.0),
        Role::Guard { follows } => match row_of(case, assembly, follows) {
            Some(row) => State::Follow(row),
            None => State::Potential(0.0),
        },
    }
}

/// State of a row from its members; several potentials are an error.
fn row_state(
    case: &Case,
    assembly: &Assembly,
    voltages: &VoltageCase,
    row: usize,
) -> Result<State, Vec<f64>> {
    let members = assembly.rows[row].bodies.iter().map(|body| &case.electrodes[*body as usize]);
    let (mut potentials, mut charge, mut follows): (Vec<f64>, f64, Option<usize>) = (Vec::new(), 0.0, None);
    for electrode in members {
        match electrode_state(case, assembly, voltages, electrode) {
            State::Potential(volt) if potentials.iter().all(|v| (v - volt).abs() > 0.0) => {
                potentials.push(volt)
            }
            State::Potential(_) => {}
            State::Charge(q) => charge += q,
            State::Follow(leader) if leader != row => follows = Some(leader),
            State::Follow(_) => {}
        }
    }
    match (potentials.as_slice(), follows) {
        ([volt], _) => Ok(State::Potential(*volt)),
        ([], Some(leader)) => Ok(State::Follow(leader)),
        ([], None) => Ok(State::Charge(charge)),
        _ => Err(potentials),
    }
}

/// Potentials other than 0 V, and charges, on electrodes that are part of the 0 V reference.
fn earthed_clashes(case: &Case, assembly: &Assembly, voltages: &VoltageCase) -> Vec<Finding> {
    let rowless = |name: &&(String, f64)| row_of(case, assembly, &name.0).is_none();
    let volts = voltages.potentials.iter().filter(rowless).filter(|(_, volt)| 0.0 < volt.abs());
    let charges = voltages.charges.iter().filter(rowless);
    let text = |name: &str| {
        format!(
            "voltage case `{}`: `{name}` is bonded with earth at the plane and part of the 0 V reference; \
             only 0 V is possible for it",
            voltages.name
        )
    };
    volts.chain(charges).map(|(name, _)| refusal("earthed_value", text(name))).collect()
}

fn group_clashes(
    groups: &[Vec<usize>],
    found: &[State],
    assembly: &Assembly,
    voltages: &VoltageCase,
) -> Vec<Finding> {
    let mut refused = Vec::new();
    for group in groups {
        let mut potentials: Vec<f64> = Vec::new();
        for row in group {
            if let Some(State::Potential(volt)) = found.get(*row)
                && potentials.iter().all(|v| (v - volt).abs() > 0.0)
            {
                potentials.push(*volt);
            }
        }
        if 1 < potentials.len() {
            let names: Vec<&str> = group.iter().map(|row| assembly.rows[*row].name.as_str()).collect();
            refused.push(clash(&voltages.name, &names.join("` bonded with `"), &potentials));
        }
    }
    refused
}
