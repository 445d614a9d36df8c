//! A ring of 24 segments solved from one sector against the same panels solved as one full matrix.
//!
//! Prints both times and their ratio; a lone `--test` runs it at a small size so that it does not rot.

#![expect(clippy::print_stderr, reason = "a bench prints its ratio")]

use amberskin::adapt;
use amberskin::base::Images;
use amberskin::base::Motion;
use amberskin::base::Vec3;
use amberskin::mesh::Body;
use amberskin::mesh::Surface;
use amberskin::mesh::accept;
use amberskin::mesh::assembly;
use amberskin::mesh::smooth;
use amberskin::panel;
use amberskin::panel::Panels;
use amberskin::panel::Ring;
use amberskin::panel::ring;
use amberskin::physics::solved;
use std::f64::consts::TAU;
use std::sync::Arc;
use std::time::Instant;

/// Segments.
const COUNT: usize = 24;

/// Panels of a ring of blocks, at least `each` in every one.
fn segments(each: usize) -> Panels {
    let turn = Motion::Turn { through: Vec3::zeros(), axis: Vec3::z(), angle: TAU / COUNT as f64 };
    let corner = |k: usize| {
        let side = |bit: usize, half: f64| if k >> bit & 1 == 1 { half } else { -half };
        Vec3::new(1.0 + side(0, 0.03), side(1, 0.1), side(2, 0.1))
    };
    let faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]];
    let facets: Vec<[Vec3; 3]> = faces
        .iter()
        .flat_map(|&[a, b, c, d]| [[a, b, c], [a, c, d]])
        .map(|facet| facet.map(corner))
        .collect();
    let body = |s: usize| {
        let turned: Vec<[Vec3; 3]> = facets.iter().map(|f| f.map(|x| turn.times(s).point(&x))).collect();
        let name = format!("segment {s}");
        let (surface, _) = accept::body(&turned, false, &name).expect("a block is closed");
        let smooth = smooth::recover(&surface.welded, smooth::CREASE_ANGLE);
        Body { name, surface: Surface { normals: smooth.normals, creases: smooth.creases, ..surface } }
    };
    let assembly = assembly::expose((0..COUNT).map(body).collect(), &[], None).expect("nothing touches");
    let rows: Vec<Vec<u32>> = assembly.rows.iter().map(|row| row.bodies.clone()).collect();
    let sectors = (0..COUNT as u32).map(|s| vec![s]).collect();
    let ring = Ring::new(turn, sectors, &rows, &Images::none()).expect("a ring");
    let start = ring::arranged(&panel::build(Arc::new(assembly), None), ring).expect("the same facets");
    adapt::start(each, None, start)
}

fn main() {
    let test = std::env::args().any(|arg| arg == "--test");
    let panels = segments(if test { 24 } else { 300 });
    let timed = |panels: Panels| {
        let clock = Instant::now();
        let solved = solved::solve(panels, 1.0).expect("regular");
        let bars = solved.bars();
        (clock.elapsed().as_secs_f64(), solved.matrix, bars)
    };
    let (ring, a, _) = timed(panels.clone());
    let (plain, b, _) = timed(Panels { ring: None, ..panels.clone() });
    let pairs = a.iter().flatten().zip(b.iter().flatten());
    let apart = pairs.map(|(a, b)| (a - b).abs()).fold(0.0, f64::max) / b[0][0];
    eprintln!("{} panels in {COUNT} segments: ring {ring:.3} s, plain {plain:.3} s", panels.len());
    eprintln!("ratio {:.3} (at most 0.25 is asked), matrices differ by {apart:.1e}", ring / plain);
    assert!(apart < 1e-9, "the ring and the full matrix give different answers");
}
