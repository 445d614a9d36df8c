//! One full dense round against the bare LU of its size: assembly, factorisation, solution of three
//! right sides, residuals, correction and bars.
//!
//! Prints the ratio, and the seconds of each part; a lone `--test` runs it at a small size so that it does not rot.

#![expect(clippy::print_stderr, reason = "a bench prints its ratio")]

use amberskin::adapt;
use amberskin::base::Vec3;
use amberskin::mesh::Assembly;
use amberskin::mesh::Body;
use amberskin::mesh::Net;
use amberskin::mesh::Piece;
use amberskin::mesh::Row;
use amberskin::mesh::Surface;
use amberskin::mesh::Welded;
use amberskin::mesh::smooth;
use amberskin::operator::Sources;
use amberskin::operator::dense;
use amberskin::panel;
use amberskin::panel::Panels;
use amberskin::physics::capacitance;
use amberskin::physics::estimate;
use amberskin::physics::gap;
use amberskin::physics::unit;
use amberskin::solve::direct;
use criterion::Criterion;
use std::sync::Arc;
use std::time::Duration;
use std::time::Instant;

/// Three cubes in a row, refined as in a run to `most` panels.
fn three_cubes(most: usize) -> Panels {
    let bodies: Vec<Body> = (0..3).map(|k| cube(&format!("cube {k}"), 1.6 * f64::from(k))).collect();
    let rows = (0..3).map(|k| Row { name: bodies[k as usize].name.clone(), bodies: vec![k] }).collect();
    let piece = |k: u32, f: usize| Piece {
        body: k,
        facet: f as u32,
        corners: bodies[k as usize].surface.welded.facets[f]
            .map(|p| bodies[k as usize].surface.welded.points[p as usize]),
        bary: [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
        net: Net::Row(k),
    };
    let pieces = (0..3).flat_map(|k| (0..12).map(move |f| (k, f))).map(|(k, f)| piece(k, f)).collect();
    let assembly = Assembly { rows, pieces, findings: Vec::new(), bodies };
    let start = adapt::at_least(60, panel::build(Arc::new(assembly), None));
    let limits = adapt::Limits { max_panels: Some(most), time: None, memory: 1e11 };
    let finished = adapt::run(start, 1.0, adapt::Demand { capacitance: 1e-9 }, &limits, &|_| ());
    finished.expect("three cubes can be solved").solved.panels
}

fn cube(name: &str, shift: f64) -> Body {
    let points = (0..8)
        .map(|k| Vec3::new(f64::from(k & 1) + shift, f64::from(k >> 1 & 1), f64::from(k >> 2)))
        .collect();
    let faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]];
    let facets = faces.iter().flat_map(|&[a, b, c, d]| [[a, b, c], [a, c, d]]).collect();
    let welded = Welded { points, facets };
    let smooth = smooth::recover(&welded, smooth::CREASE_ANGLE);
    let surface = Surface {
        welded,
        sheet: false,
        normals: smooth.normals,
        creases: smooth.creases,
        rims_as_drawn: false,
    };
    Body { name: name.to_owned(), surface }
}

/// Seconds of the parts of a round, and of the bare factorisation of the same matrix.
fn round(panels: &Panels) -> (Vec<(&'static str, f64)>, f64) {
    let mut parts = Vec::new();
    let mut clock = Instant::now();
    let mut lap = |name: &'static str| {
        parts.push((name, clock.elapsed().as_secs_f64()));
        clock = Instant::now();
    };
    let sources = Sources::build(panels);
    let matrix = dense::assemble(panels, &sources);
    lap("assembly");
    let copy = matrix.clone();
    lap("copy (not counted)");
    let factors = direct::factor(copy).expect("regular");
    drop(factors);
    lap("bare LU");
    drop(matrix);
    let charges = unit::solve(panels, &sources).expect("regular");
    lap("assembly, LU and solution");
    let residuals = unit::residuals(panels, &sources, &charges);
    lap("residuals");
    let flat = capacitance::corrected(panels, &charges, &residuals, 1.0);
    let estimate = estimate::estimate(panels, &residuals, &gap::gaps(panels), 1.0);
    let bar = estimate.total(&[1.0, 0.0, 0.0], &[1.0, 0.0, 0.0]);
    lap("correction and bars");
    assert!(0.0 < bar && 0.0 < flat.corrected[0][0], "a bar and a capacitance above zero");
    let seconds = |name: &str| parts.iter().filter(|(part, _)| *part == name).map(|(_, s)| s).sum::<f64>();
    let whole = seconds("assembly, LU and solution") + seconds("residuals") + seconds("correction and bars");
    let ratio = whole / seconds("bare LU");
    (parts, ratio)
}

fn main() {
    let test = std::env::args().any(|arg| arg == "--test");
    let panels = three_cubes(if test { 300 } else { 6000 });
    let (parts, ratio) = round(&panels);
    for (name, seconds) in &parts {
        eprintln!("{name:28} {seconds:8.3} s");
    }
    eprintln!("{} panels: full round over bare LU: {ratio:.2} (at most 3 is asked)", panels.len());
    let small = three_cubes(300);
    let mut criterion = Criterion::default().measurement_time(Duration::from_secs(2)).sample_size(10);
    criterion.bench_function("round, 300 panels", |b| b.iter(|| round(&small)));
}
