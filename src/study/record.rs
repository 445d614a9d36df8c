//! The record of a finished refinement.

use super::Outcome;
use super::StudyError;
use super::checks;
use super::state::States;
use super::voltage;
use crate::adapt;
use crate::adapt::Finished;
use crate::adapt::Stop;
use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::base::threads;
use crate::case;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::Role;
use crate::case::Shapes;
use crate::case::SurfaceKind;
use crate::case::machine;
use crate::circuit;
use crate::mesh::Net;
use crate::mesh::weld;
use crate::operator::Sources;
use crate::physics::edges;
use crate::physics::field;
use crate::physics::look;
use crate::physics::solved::Bar;
use crate::physics::solved::Solved;
use crate::record::Accuracy;
use crate::record::Budget;
use crate::record::BudgetLine;
use crate::record::CAUTIONS;
use crate::record::CaseText;
use crate::record::Effort;
use crate::record::FileHash;
use crate::record::FindingRecord;
use crate::record::Part;
use crate::record::Program;
use crate::record::Record;
use crate::record::RowInfo;
use crate::record::SCHEMA;
use crate::record::SurfaceTable;
use crate::record::Verdict;
use crate::record::sha256;
use std::collections::BTreeMap;

/// All numbers of a finished study.
///
/// # Errors
/// [`StudyError::Singular`] where the matrix cannot be inverted.
pub(super) fn outcome(
    case: &Case,
    shapes: &Shapes,
    finished: &Finished,
    states: &[States],
) -> Result<Outcome, StudyError> {
    let solved = &finished.solved;
    let singular = |error: circuit::CircuitError| StudyError::Singular(error.to_string());
    let (bars, earth_bars) = solved.bars();
    let inverse = circuit::inverse(&solved.matrix).map_err(singular)?;
    let sources = Sources::build(&solved.panels);
    let totals = |bars: &[Bar]| bars.iter().map(Bar::total).collect::<Vec<f64>>();
    let bar_matrix: Vec<Vec<f64>> = bars.iter().map(|row| totals(row)).collect();
    let earth = circuit::earth(&solved.matrix);
    let without_diagonal = |m: &[Vec<f64>]| -> Vec<Vec<f64>> {
        let cell = |i: usize, j: usize| if i == j { 0.0 } else { m[i][j] };
        (0..m.len()).map(|i| (0..m.len()).map(|j| cell(i, j)).collect()).collect()
    };
    let reached = finished.reached;
    let voltage = voltage::results(case, solved, &sources, states, &bar_matrix).map_err(singular)?;
    let checks = checks::checks(solved, &bar_matrix, &totals(&earth_bars), &inverse, &voltage.cases);
    let verdict = verdict(case, finished, reached, &voltage.cases, &checks);
    let record = Record {
        schema: SCHEMA,
        program: Program {
            name: env!("CARGO_PKG_NAME").to_owned(),
            version: env!("CARGO_PKG_VERSION").to_owned(),
        },
        cautions: CAUTIONS.iter().map(|text| (*text).to_owned()).collect(),
        verdict,
        case: CaseText {
            text: case.text.clone(),
            sha256: sha256(case.text.as_bytes()),
            resolved: case::resolved(case).into_iter().collect(),
        },
        shapes: shapes
            .files
            .iter()
            .map(|f| FileHash { path: f.path.clone(), sha256: sha256(&f.bytes) })
            .collect(),
        surface_file: FileHash { path: String::new(), sha256: String::new() },
        electrodes: solved.panels.assembly.rows.iter().map(|row| row.name.clone()).collect(),
        rows: rows(case, solved),
        accuracy: Accuracy { asked: case.accuracy.capacitance, reached },
        earth_share: earth.iter().enumerate().map(|(i, c)| c / solved.matrix[i][i]).collect(),
        mutual_farad: circuit::mutual(&solved.matrix),
        mutual_bar_farad: without_diagonal(&bar_matrix),
        capacitance_farad: solved.matrix.clone(),
        capacitance_bar_farad: bar_matrix,
        earth_bar_farad: totals(&earth_bars),
        potential_coefficients_bar_per_farad: coefficient_bars(solved, &inverse),
        potential_coefficients_per_farad: inverse,
        checks,
        findings: findings(case, solved),
        parts: parts(case, solved),
        edges: voltage.edges,
        looks: voltage.looks,
        voltage_cases: voltage.cases,
        budget: budget(solved, &bars, &earth_bars, &earth),
        effort: effort(finished),
        earth_farad: earth,
    };
    let surface = surface_table(case, solved, &record.voltage_cases, &voltage.potentials);
    Ok(Outcome { record, surface })
}

/// `δP_ij = −p_iᵀ δC p_j`, so the weights are rows of the inverse.
fn coefficient_bars(solved: &Solved, inverse: &[Vec<f64>]) -> Vec<Vec<f64>> {
    inverse.iter().map(|u| inverse.iter().map(|v| solved.bar(u, v).total()).collect()).collect()
}

fn role_word(electrode: &Electrode) -> &'static str {
    match electrode.role {
        Role::Live => "live",
        Role::Earthed => "earthed",
        Role::Floating => "floating",
        Role::Guard { .. } => "guard",
    }
}

fn rows(case: &Case, solved: &Solved) -> Vec<RowInfo> {
    let info = |row: &crate::mesh::Row| {
        let members: Vec<&Electrode> =
            row.bodies.iter().map(|body| &case.electrodes[*body as usize]).collect();
        // One held member holds the row.
        let word = |word: &str| members.iter().any(|m| role_word(m) == word);
        let role = ["live", "earthed", "guard"].into_iter().find(|w| word(w)).unwrap_or("floating");
        RowInfo { members: members.iter().map(|m| m.name.clone()).collect(), role: role.to_owned() }
    };
    solved.panels.assembly.rows.iter().map(info).collect()
}

fn findings(case: &Case, solved: &Solved) -> Vec<FindingRecord> {
    let stored = |finding: &Finding| FindingRecord {
        severity: finding.severity.word().to_owned(),
        code: finding.code.to_owned(),
        text: finding.text.clone(),
        where_metre: finding.place.map(|p| [p.x, p.y, p.z]),
    };
    let mut all: Vec<FindingRecord> = solved.panels.assembly.findings.iter().map(stored).collect();
    all.extend(solved_findings(case, solved).iter().map(stored));
    if case.accuracy.max_field.is_some() {
        all.push(FindingRecord {
            severity: "note".to_owned(),
            code: "max_field_not_steered".to_owned(),
            text: "`max_field` is read but does not steer the refinement yet; each maximum has its own bar"
                .to_owned(),
            where_metre: None,
        });
    }
    all
}

/// Share of a gap by which facets may be moved before it is told [1].
const COARSE_FOR_GAP: f64 = 0.1;

/// Panel length over gap above which it is told that the fringe is not resolved [1].
///
/// A square sheet a 200th of its side over a plane, 64 panels of 35 gaps: off by 1.0 % at a bar of 0.11 %.
const UNRESOLVED: f64 = 10.0;

/// What only the solution tells: facets too coarse for a gap, and a limit that the drawing exceeds.
fn solved_findings(case: &Case, solved: &Solved) -> Vec<Finding> {
    let panels = &solved.panels;
    let mut found = Vec::new();
    let mut warn = |code: &'static str, text: String, place: Option<Vec3>| {
        found.push(Finding { severity: Severity::Warning, code, text, place });
    };
    // The panel at which `ratio` is largest, if it is over `least`: the name of its body, value and place.
    let over = |least: f64, ratio: &dyn Fn(usize) -> f64| {
        let worst = (0..panels.len()).max_by(|a, b| ratio(*a).total_cmp(&ratio(*b)))?;
        let name = &panels.assembly.bodies[panels.body[worst] as usize].name;
        (least < ratio(worst)).then(|| (name, ratio(worst), panels.triangles[worst].centroid()))
    };
    let gap = |p: usize| solved.gaps[p].max(f64::MIN_POSITIVE);
    if let Some((name, share, place)) = over(COARSE_FOR_GAP, &|p| panels.offset[p].abs() / gap(p)) {
        let share = 100.0 * share;
        let text = format!(
            "`{name}`: the round shape stands {share:.3} % of the gap away from its facets; draw it finer there"
        );
        warn("facets_coarse_for_gap", text, Some(place));
    }
    if let Some((name, ratio, place)) = over(UNRESOLVED, &|p| panels.triangles[p].longest_edge() / gap(p)) {
        let text = format!(
            "`{name}`: panels {ratio:.0} times as long as the gap beside them; bars can be too small there: ask for a \
             tighter capacitance until this is gone or the values stand still"
        );
        warn("gap_not_resolved", text, Some(place));
    }
    if let Some(most) = case.accuracy.max_panels.filter(|most| *most < panels.len()) {
        let text = format!(
            "`max_panels` is {most}, but the shapes as drawn need {} panels from the first round on",
            panels.len()
        );
        warn("max_panels_exceeded", text, None);
    }
    found
}

fn parts(case: &Case, solved: &Solved) -> Vec<Part> {
    let panels = &solved.panels;
    let part = |(k, body): (usize, &crate::mesh::Body)| {
        let held: Vec<usize> = (0..panels.len()).filter(|p| panels.body[*p] as usize == k).collect();
        let (lo, hi) = weld::bounds(&body.surface.welded.points);
        let size = hi - lo;
        let surface = match case.electrodes[k].surface {
            SurfaceKind::Rebuilt => "rebuilt",
            SurfaceKind::AsDrawn => "as_drawn",
        };
        Part {
            name: body.name.clone(),
            kind: "electrode".to_owned(),
            surface: surface.to_owned(),
            facets: body.surface.welded.facets.len(),
            panels: held.len(),
            area_m2: held.iter().map(|p| panels.triangles[*p].area()).sum(),
            size_metre: [size.x, size.y, size.z],
        }
    };
    panels.assembly.bodies.iter().enumerate().map(part).collect()
}

fn budget(solved: &Solved, bars: &[Vec<Bar>], earth_bars: &[Bar], earth: &[f64]) -> Budget {
    let n = solved.n_rows();
    let names: Vec<&str> = solved.panels.assembly.rows.iter().map(|row| row.name.as_str()).collect();
    let ones = vec![1.0; n];
    let unit = |i: usize| crate::physics::solved::unit_weight(i, n);
    let line = |entry: String, value: f64, bar: &Bar, u: &[f64], v: &[f64]| BudgetLine {
        entry,
        discretisation: bar.discretisation / value.abs(),
        faceting: solved.faceting(u, v) / value,
        faceting_bar: bar.faceting / value.abs(),
        solver: bar.solver / value.abs(),
    };
    let mut entries = Vec::new();
    for i in 0..n {
        entries.push(line(
            format!("C {} {}", names[i], names[i]),
            solved.matrix[i][i],
            &bars[i][i],
            &unit(i),
            &unit(i),
        ));
    }
    for i in 0..n {
        for j in i + 1..n {
            let c = -solved.matrix[i][j];
            if adapt::over_floor(&solved.matrix, i, Some(j)) {
                let mut entry =
                    line(format!("c {} {}", names[i], names[j]), c, &bars[i][j], &unit(i), &unit(j));
                entry.faceting = -entry.faceting;
                entries.push(entry);
            }
        }
    }
    for i in (0..n).filter(|i| 1 < n && adapt::over_floor(&solved.matrix, *i, None)) {
        entries.push(line(format!("c {} earth", names[i]), earth[i], &earth_bars[i], &unit(i), &ones));
    }
    Budget { entries }
}

fn effort(finished: &Finished) -> Effort {
    let panels = finished.solved.panels.len();
    Effort {
        panels,
        unknowns: panels,
        rounds: finished.rounds.len(),
        method: "dense".to_owned(),
        seconds: BTreeMap::new(),
        peak_memory_bytes: machine::peak_memory().map_or(0, |bytes| bytes as u64),
        threads: threads::count(),
        history: finished.rounds.iter().map(|round| (round.panels, round.reached)).collect(),
    }
}

fn verdict(
    case: &Case,
    finished: &Finished,
    reached: f64,
    cases: &[crate::record::VoltageCase],
    checks: &[crate::record::Check],
) -> Verdict {
    let (mut codes, mut reasons) = (Vec::new(), Vec::new());
    let failed: Vec<&str> =
        checks.iter().filter(|check| !check.pass).map(|check| check.name.as_str()).collect();
    if !failed.is_empty() {
        codes.push(5);
        reasons.push(format!("internal checks failed beyond their bars: {}", failed.join("; ")));
    }
    let judged = |word: &str| -> Vec<String> {
        let of_case = |c: &crate::record::VoltageCase| {
            let hit = c.maxima.iter().filter(|m| m.judged == word);
            hit.map(|m| format!("{} in {}", m.electrode, c.name)).collect::<Vec<_>>()
        };
        cases.iter().flat_map(of_case).collect()
    };
    let (over, undecided) = (judged("not_met"), judged("not_decided"));
    if !over.is_empty() || !undecided.is_empty() {
        codes.push(4);
        if !over.is_empty() {
            reasons.push(format!("field limit exceeded: {}", over.join("; ")));
        }
        if !undecided.is_empty() {
            reasons.push(format!("field limit not decided: {}", undecided.join("; ")));
        }
    }
    if finished.stop != Stop::Met {
        codes.push(3);
        let why = match finished.stop {
            Stop::MaxPanels => "`max_panels` left no room for another round; raise it",
            Stop::Time => "another round would not have fitted into `time_limit`; raise it",
            Stop::Memory => "another round would not have fitted into the memory; raise `memory_limit`",
            Stop::Met | Stop::NothingToCut => "no panel was left to cut",
        };
        reasons.push(format!(
            "capacitance: a bar of {:.3} % was asked and {:.3} % reached: {why}; {}",
            100.0 * case.accuracy.capacitance,
            100.0 * reached,
            worst_entry(&finished.solved)
        ));
    }
    let certain = codes.contains(&5) || codes.contains(&3) || !over.is_empty();
    let word = if codes.is_empty() {
        "met"
    } else if certain {
        "not_met"
    } else {
        "not_decided"
    };
    Verdict { word: word.to_owned(), codes, reasons }
}

/// Which entry has the largest bar, and how much of it is faceting.
fn worst_entry(solved: &Solved) -> String {
    let (bars, earth) = solved.bars();
    let name = |i: usize| solved.panels.assembly.rows[i].name.as_str();
    let share = |bar: &Bar, i: usize, j: Option<usize>| bar.total() / adapt::scale(&solved.matrix, i, j);
    let n = solved.n_rows();
    let pairs = (0..n).flat_map(|i| (i..n).map(move |j| (i, Some(j))));
    let all = pairs.chain((0..n).map(|i| (i, None)));
    let bar = |i: usize, j: Option<usize>| j.map_or(earth[i], |j| bars[i][j]);
    let worst =
        all.max_by(|a, b| share(&bar(a.0, a.1), a.0, a.1).total_cmp(&share(&bar(b.0, b.1), b.0, b.1)));
    worst.map_or_else(String::new, |(i, j)| {
        let facets = 100.0 * bar(i, j).faceting / bar(i, j).total();
        let other = j.map_or("earth", name);
        format!("the largest is that of {} to {other}, {facets:.0} % of it from the facets as drawn", name(i))
    })
}

fn surface_table(
    case: &Case,
    solved: &Solved,
    cases: &[crate::record::VoltageCase],
    potentials: &[Vec<f64>],
) -> SurfaceTable {
    let panels = &solved.panels;
    let eps = crate::physics::permittivity(solved.eps_r);
    let fields =
        cases.iter().zip(potentials).map(|(c, v)| (c.name.clone(), field::normal_field(solved, v))).collect();
    SurfaceTable {
        bodies: case.electrodes.iter().map(|electrode| electrode.name.clone()).collect(),
        rows: panels.assembly.rows.iter().map(|row| row.name.clone()).collect(),
        corners: panels.triangles.iter().map(|tri| tri.corners.map(|p| [p.x, p.y, p.z])).collect(),
        electrode: panels.body.clone(),
        row: panels.net.iter().map(|net| if let Net::Row(row) = net { *row as i32 } else { -1 }).collect(),
        density: solved.charges.density.iter().map(|s| s.iter().map(|s| s * eps).collect()).collect(),
        residual: solved.residuals.at.clone(),
        field: fields,
    }
}

/// Names of media for the looks.
pub(super) fn medium_name(medium: look::Medium, solved: &Solved) -> String {
    match medium {
        look::Medium::Surroundings => "surroundings".to_owned(),
        look::Medium::BehindEarth => "behind earth".to_owned(),
        look::Medium::Metal(body) => solved.panels.assembly.bodies[body].name.clone(),
    }
}

/// Edges with an unbounded field in one voltage case, strongest first within each part.
pub(super) fn edge_records(case_name: &str, solved: &Solved, potentials: &[f64]) -> Vec<crate::record::Edge> {
    let normal = field::normal_field(solved, potentials);
    let mut sharp = edges::sharp_edges(solved, &normal);
    sharp.sort_by(|a, b| a.body.cmp(&b.body).then(b.strength.total_cmp(&a.strength)));
    let mut kept: BTreeMap<usize, usize> = BTreeMap::new();
    sharp.retain(|edge| {
        let count = kept.entry(edge.body).or_default();
        *count += 1;
        *count <= MOST_EDGES
    });
    let record = |edge: &edges::SharpEdge| crate::record::Edge {
        part: solved.panels.assembly.bodies[edge.body].name.clone(),
        angle_deg: edge.angle.to_degrees(),
        exponent: edge.exponent,
        case: case_name.to_owned(),
        strength: edge.strength,
        from_metre: edge.ends[0].into(),
        to_metre: edge.ends[1].into(),
        field_at: field_at(solved, edge),
    };
    sharp.iter().map(record).collect()
}

/// Edges stored for each part and voltage case: the strongest.
const MOST_EDGES: usize = 12;

/// Distances at which the field law is stated, in sizes of the part [1].
const STATED: [f64; 3] = [1e-3, 3e-3, 1e-2];

fn field_at(solved: &Solved, edge: &edges::SharpEdge) -> Vec<crate::record::FieldAt> {
    let (lo, hi) = weld::bounds(&solved.panels.assembly.bodies[edge.body].surface.welded.points);
    let size = (hi - lo).max();
    let at = |share: &f64| {
        let distance_metre = share * size;
        crate::record::FieldAt {
            distance_metre,
            field_v_per_m: edge.strength * distance_metre.powf(edge.exponent),
        }
    };
    STATED.iter().map(at).collect()
}
