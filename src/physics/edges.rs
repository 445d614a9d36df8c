//! Creases and rims, where the field is unbounded: σ ~ K s^(π/(2π−w) − 1) at distance s from the edge
//! of a metal wedge of angle w (Jackson, Classical Electrodynamics, section 2.11).

use crate::base::Vec3;
use crate::kernel::rules;
use crate::mesh::Assembly;
use crate::mesh::Crease;
use crate::mesh::Surface;
use crate::physics::solved::Solved;
use std::f64::consts::PI;

/// Angle through the metal above which an edge is not counted as unbounded [rad]: 175°.
///
/// The exponent there is above −0.03: over three decades of distance the field grows by a fifth.
pub const SEAM: f64 = 175.0 * PI / 180.0;

/// An edge with an unbounded field.
#[derive(Clone, Debug, PartialEq)]
pub struct SharpEdge {
    /// Index of the body.
    pub body: usize,
    /// Angle through the metal [rad].
    pub angle: f64,
    /// Exponent of distance [1].
    pub exponent: f64,
    /// K along the edge, mean over the panels beside it [V·m^(−1−exponent)].
    pub strength: f64,
    /// Ends [m].
    pub ends: [Vec3; 2],
}

/// Angle through the metal on the sharper side of a crease [rad]: a fold of a sheet is sharp on one side,
/// whichever way its facets run.
pub fn sharp_angle(surface: &Surface, crease: &Crease) -> f64 {
    if surface.sheet { crease.angle.min(2.0 * PI - crease.angle) } else { crease.angle }
}

/// Which facets of a body have an exposed piece.
pub fn exposed_facets(assembly: &Assembly, body: usize) -> Vec<bool> {
    let mut exposed = vec![false; assembly.bodies[body].surface.welded.facets.len()];
    let own = assembly.pieces.iter().filter(|piece| piece.body as usize == body);
    own.for_each(|piece| exposed[piece.facet as usize] = true);
    exposed
}

/// The strength of every exposed edge of every body, from the normal field of each panel [V/m].
///
/// `K = E_p / ⟨s^exponent⟩_p`, area-weighted over the panels of the facets beside the edge whose foot lies
/// on it and which are closer than a tenth of its length; a coarse value without a bar of its own, within
/// some 10 % on the cube.  On a sheet half of the sum of both sides.
pub fn sharp_edges(solved: &Solved, field: &[f64]) -> Vec<SharpEdge> {
    let panels = &solved.panels;
    let mut found = Vec::new();
    let mut beside: Vec<Vec<Vec<usize>>> =
        panels.assembly.bodies.iter().map(|b| vec![Vec::new(); b.surface.welded.facets.len()]).collect();
    (0..panels.len()).for_each(|p| beside[panels.body[p] as usize][panels.facet[p] as usize].push(p));
    for (body, part) in panels.assembly.bodies.iter().enumerate() {
        let share = if part.surface.sheet { 0.5 } else { 1.0 };
        let sharp = |crease: &&Crease| sharp_angle(&part.surface, crease) < SEAM;
        for crease in part.surface.creases.iter().filter(sharp) {
            let angle = sharp_angle(&part.surface, crease);
            let ends = crease.ends.map(|k| part.surface.welded.points[k as usize]);
            let exponent = PI / (2.0 * PI - angle) - 1.0;
            if let Some(mean) = strength(solved, field, crease, &beside[body], ends, exponent) {
                let strength = mean * share;
                found.push(SharpEdge { body, angle, exponent, strength, ends });
            }
        }
    }
    found
}

/// Distance from the edge within which panels tell its strength, in edge lengths [1].
const BESIDE: f64 = 0.1;

fn strength(
    solved: &Solved,
    field: &[f64],
    crease: &Crease,
    beside: &[Vec<usize>],
    [a, b]: [Vec3; 2],
    exponent: f64,
) -> Option<f64> {
    let (length, t) = ((b - a).norm(), (b - a).try_normalize(0.0)?);
    let distance = |x: &Vec3| (x - a - t * (x - a).dot(&t)).norm();
    let (mut sum, mut area) = (0.0, 0.0);
    let mut nearest: Option<(f64, f64)> = None;
    let facets = if crease.facets[0] == crease.facets[1] { &crease.facets[..1] } else { &crease.facets[..] };
    for p in facets.iter().flat_map(|f| &beside[*f as usize]) {
        let tri = &solved.panels.triangles[*p];
        let s = distance(&tri.centroid());
        let mean: f64 =
            rules::SEVEN.iter().map(|(w, weight)| weight * distance(&tri.at(*w)).powf(exponent)).sum();
        let value = field[*p].abs() / mean;
        if nearest.is_none_or(|(least, _)| s < least) {
            nearest = Some((s, value));
        }
        if s <= BESIDE * length {
            (sum, area) = (sum + value * tri.area(), area + tri.area());
        }
    }
    if 0.0 < area { Some(sum / area) } else { nearest.map(|(_, value)| value) }
}
