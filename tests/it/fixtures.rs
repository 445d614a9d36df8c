//! A record and a surface table made by hand.
//!
//! Three balls over an earthed floor.  Matrix, floating potential, energy and maxima are the exact series
//! of images for radii 50, 30, 40 mm and centres 400, 270, 130 mm; bars, looks, edges and all
//! bookkeeping are invented to show every kind of line.
use amberskin::circuit;
use amberskin::record::*;
use std::collections::BTreeMap;

/// Charge per volt [F].
pub(crate) fn matrix() -> Vec<Vec<f64>> {
    let pico = [
        [6.4155114543, -1.2371277443, -0.3065412242],
        [-1.2371277443, 3.9702508605, -0.7399930487],
        [-0.3065412242, -0.7399930487, 5.4671438083],
    ];
    pico.iter().map(|row| row.iter().map(|c| c * 1e-12).collect()).collect()
}

/// The three-ball stack.
pub(crate) fn record() -> Record {
    let c = matrix();
    let flat = |bar: f64| vec![vec![bar; 3]; 3];
    let earth = circuit::earth(&c);
    Record {
        schema: SCHEMA,
        program: Program { name: "amberskin".into(), version: "0.1.0".into() },
        cautions: CAUTIONS.map(str::to_owned).to_vec(),
        verdict: Verdict {
            word: "not_met".into(),
            codes: vec![4],
            reasons: vec!["field of `foot` is over its limit".into()],
        },
        case: case_text(),
        shapes: vec![FileHash { path: "../meshes/ball.stl".into(), sha256: "ab".repeat(32) }],
        surface_file: FileHash { path: String::new(), sha256: String::new() },
        electrodes: ["ball", "tap", "foot"].map(str::to_owned).to_vec(),
        rows: [("ball", "live"), ("tap", "floating"), ("foot", "earthed")]
            .map(|(name, role)| RowInfo { members: vec![name.into()], role: role.into() })
            .to_vec(),
        accuracy: Accuracy { asked: 5e-3, reached: 3.1e-3 },
        earth_share: earth.iter().zip(&c).enumerate().map(|(i, (e, row))| e / row[i]).collect(),
        mutual_farad: circuit::mutual(&c),
        mutual_bar_farad: flat(2.1e-15),
        earth_farad: earth,
        earth_bar_farad: vec![9.7e-15, 4.1e-15, 8.8e-15],
        potential_coefficients_per_farad: circuit::inverse(&c).unwrap(),
        potential_coefficients_bar_per_farad: flat(2.4e8),
        capacitance_bar_farad: flat(7.3e-15),
        capacitance_farad: c,
        checks: vec![Check { name: "asymmetry [1]".into(), value: 2.1e-7, limit: 1e-4, pass: true }],
        findings: findings(),
        parts: vec![part()],
        edges: vec![edge()],
        looks: vec![look()],
        voltage_cases: vec![crest_case(), rms_case()],
        budget: Budget { entries: vec![budget_line()] },
        effort: effort(),
    }
}

fn case_text() -> CaseText {
    let words = [
        ("study.title", "Three-ball stack"),
        ("study.number", "ST-014"),
        ("study.issue", "B"),
        ("study.question", "Tap voltage"),
        ("study.left_out", "supports, lead to the ball"),
        ("units.length", "mm"),
        ("units.capacitance", "pF"),
        ("units.field", "kV/mm"),
        ("accuracy.capacitance", "0.5 %"),
    ];
    CaseText {
        text: "[study]\ntitle = \"Three-ball stack\"\n".into(),
        sha256: "0f".repeat(32),
        resolved: words.map(|(k, v)| (k.to_owned(), v.to_owned())).into(),
    }
}

fn findings() -> Vec<FindingRecord> {
    let finding = |severity: &str, code: &str, where_metre| FindingRecord {
        severity: severity.into(),
        code: code.into(),
        text: format!("a {severity} about `tap`"),
        where_metre,
    };
    vec![finding("note", "effort", None), finding("warning", "sharp_crease", Some([0.0, 0.03, 0.27]))]
}

fn part() -> Part {
    Part {
        name: "ball".into(),
        kind: "electrode".into(),
        surface: "as_drawn".into(),
        facets: 2500,
        panels: 2612,
        area_m2: 0.0314,
        size_metre: [0.1; 3],
    }
}

fn edge() -> Edge {
    Edge {
        part: "foot".into(),
        angle_deg: 90.0,
        exponent: -1.0 / 3.0,
        case: "100 kV peak applied".into(),
        strength: 1.2e5,
        from_metre: [0.0, 0.0, 0.1],
        to_metre: [0.04, 0.0, 0.1],
        field_at: vec![FieldAt { distance_metre: 1e-4, field_v_per_m: 2.585e6 }],
    }
}

fn look() -> Look {
    let cases = ["100 kV peak applied", "20 kV rms applied"];
    let (volts, fields) = (vec![4.1e4, 6.5e4], vec![[0.0, 0.0, 1.1e6], [0.0, 3e5, 4e5]]);
    Look {
        name: "between ball and tap".into(),
        points_metre: vec![[0.0, 0.0, 0.3], [0.0, 0.0, 0.35]],
        medium: vec!["surroundings".into(), "ball".into()],
        potential_volt: cases.map(|case| (case.to_owned(), volts.clone())).into(),
        field_v_per_m: cases.map(|case| (case.to_owned(), fields.clone())).into(),
    }
}

fn by_row(values: [f64; 3]) -> BTreeMap<String, f64> {
    ["ball", "tap", "foot"].map(str::to_owned).into_iter().zip(values).collect()
}

fn crest_case() -> VoltageCase {
    VoltageCase {
        name: "100 kV peak applied".into(),
        value_is: "peak".into(),
        potentials_volt: by_row([1e5, 31159.93895, 0.0]),
        potentials_bar_volt: by_row([0.0, 46.0, 0.0]),
        floating: vec!["tap".into()],
        charges_coulomb: by_row([6.03e-7, 0.0, -5.37e-8]),
        charges_bar_coulomb: by_row([4e-10, 0.0, 6e-8]),
        energy_joule: 30.1501e-3,
        energy_bar_joule: 2.3e-5,
        maxima: vec![
            maximum("ball", Some(2.3286334e6), [1e-19, 0.0, 0.35]),
            maximum("tap", Some(1.6106250e6), [0.0, 0.0, 0.3]),
            maximum("foot", None, [0.02, 0.0, 0.1]),
        ],
        forces: vec![],
    }
}

fn rms_case() -> VoltageCase {
    let mut case = crest_case();
    let crest = 20e3 * 2f64.sqrt();
    case.name = "20 kV rms applied".into();
    case.value_is = "rms".into();
    case.potentials_volt = by_row([crest, 0.3115993895 * crest, 0.0]);
    case.maxima = vec![Maximum {
        limit_v_per_m: Some(1e6 * 2f64.sqrt()),
        limit_is: Some("rms".into()),
        margin: Some(1e6 / 465.73e3 - 1.0),
        judged: "met".into(),
        ..maximum("ball", Some(23.286334 * crest), [0.0, 0.0, 0.35])
    }];
    case
}

fn maximum(name: &str, field: Option<f64>, at_metre: [f64; 3]) -> Maximum {
    let limited = name != "tap";
    Maximum {
        electrode: name.into(),
        kind: if field.is_some() { "smooth" } else { "edge" }.into(),
        field_v_per_m: field,
        bar_v_per_m: field.map(|e| 0.009 * e),
        raw_v_per_m: 2.41e6,
        smooth_v_per_m: field.or(Some(0.6794162e6)),
        at_metre,
        curvature_per_metre: Some([20.0, 20.0]),
        limit_v_per_m: limited.then_some(2.6e6),
        limit_is: limited.then(|| "peak".into()),
        margin: field.filter(|_| limited).map(|e| 2.6e6 / e - 1.0),
        judged: if !limited {
            "no_limit"
        } else if field.is_some() {
            "met"
        } else {
            "not_decided"
        }
        .into(),
    }
}

fn budget_line() -> BudgetLine {
    BudgetLine {
        entry: "C ball ball".into(),
        discretisation: 2.1e-4,
        faceting: 1.66e-3,
        faceting_bar: 1.7e-4,
        solver: 1e-12,
    }
}

fn effort() -> Effort {
    Effort {
        panels: 7712,
        unknowns: 7712,
        rounds: 2,
        method: "dense".into(),
        seconds: [("assemble".to_owned(), 12.34567)].into(),
        peak_memory_bytes: 612_000_000,
        threads: 2,
        history: vec![(7500, 6.1e-3), (7712, 3.1e-3)],
    }
}

/// Five panels on two electrodes and one on the 0 V reference, with names that XML must escape.
pub(crate) fn surface() -> SurfaceTable {
    let at = |p: usize, k: usize| [p as f64 * 0.1, k as f64 / 3.0, (p * k) as f64 * 1e-3];
    let values = |scale: f64| (0..5).map(|p| scale * (p as f64 + 0.1)).collect::<Vec<f64>>();
    let residual =
        |scale: f64| (0..5).map(|p| [0, 1, 2, 3, 4, 5].map(|q| scale * (p * 6 + q) as f64)).collect();
    SurfaceTable {
        bodies: ["ball", "tap & <ring>", "skirt"].map(str::to_owned).to_vec(),
        rows: ["ball", "tap & <ring>"].map(str::to_owned).to_vec(),
        corners: (0..5).map(|p| [at(p, 0), at(p, 1), at(p, 2)]).collect(),
        electrode: vec![0, 0, 1, 1, 2],
        row: vec![0, 0, 1, 1, -1],
        density: vec![values(1e-10), values(-3e-11)],
        residual: vec![residual(1e-4), residual(-1e-5)],
        field: vec![("100 kV \"peak\" applied".into(), values(1e6))],
    }
}

/// A folder of its own for one test.
pub(crate) fn folder() -> tempfile::TempDir {
    tempfile::tempdir().unwrap()
}
