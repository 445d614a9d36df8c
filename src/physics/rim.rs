//! What the straight sides of a drawn rim miss of a round one, to first order.
//!
//! At the rim of a sheet the charge of both sides is `s = K d^(−1/2)` at distance `d`, and moving the
//! rim outward by `δ` changes `uᵀ C v` by `(π/2) ε K_u K_v δ` per length: on a disc, `K² = 8/(π² R)` per volt
//! squared, this is the known `dC/dR = 8 ε`.

use crate::base::Vec3;
use crate::mesh::Surface;
use crate::panel::Panels;
use crate::physics::unit::UnitCharges;
use std::collections::HashMap;
use std::f64::consts::PI;

/// Largest turn between neighbouring sides of a rim that is taken for a chord of a round one [rad]: 35°.
const ROUND: f64 = 35.0 * PI / 180.0;

/// Longest side beside a round corner, in lengths of its neighbour, that is still taken for a chord [1].
const ALIKE: f64 = 2.0;

/// A side of a rim that stands for an arc.
#[derive(Clone, Debug, PartialEq)]
struct Chord {
    body: usize,
    facet: u32,
    ends: [Vec3; 2],
    /// Mean height of the arc over the chord, outward positive [m].
    rise: f64,
}

/// Rim sides with a rise, and the strength of every unit solution along them.
#[derive(Clone, Debug, PartialEq)]
pub struct Rims {
    /// Length times rise [m²].
    gain: Vec<f64>,
    /// `strength[j][c]`: K of row `j` at side `c` [V·m^(−1/2) per V].
    strength: Vec<Vec<f64>>,
}

/// Finds the round rims of all sheets and fits K from the panels that touch them.
///
/// A panel of the rim has the mean `2K/√w` over its width `w`; triangles with one side on the rim are
/// weighted towards it, which the mean of `d^(−1/2)` over the panel takes in.
pub fn rims(panels: &Panels, charges: &UnitCharges) -> Rims {
    let chords: Vec<Chord> =
        panels.assembly.bodies.iter().enumerate().flat_map(|(k, b)| chords(k, &b.surface)).collect();
    let mut by_facet: HashMap<(u32, u32), Vec<usize>> = HashMap::new();
    if !chords.is_empty() {
        (0..panels.len())
            .for_each(|p| by_facet.entry((panels.body[p], panels.facet[p])).or_default().push(p));
    }
    let mut rims = Rims { gain: Vec::new(), strength: vec![Vec::new(); panels.n_rows] };
    for chord in &chords {
        let Some(held) = by_facet.get(&(chord.body as u32, chord.facet)) else { continue };
        let touching = touching(panels, held, &chord.ends);
        let covered: f64 = touching.iter().map(|(_, length, _)| length).sum();
        if covered <= 0.0 {
            continue;
        }
        rims.gain.push((chord.ends[1] - chord.ends[0]).norm() * chord.rise);
        for (strength, density) in rims.strength.iter_mut().zip(&charges.density) {
            let sum: f64 = touching.iter().map(|(p, length, mean)| density[*p] / mean * length).sum();
            strength.push(sum / covered);
        }
    }
    rims
}

impl Rims {
    /// First-order change of `uᵀ C v` over ε: the signed sum and the sum of magnitudes [m × units of u and v].
    pub fn change(&self, u: &[f64], v: &[f64]) -> (f64, f64) {
        let at = |w: &[f64], c: usize| -> f64 { w.iter().zip(&self.strength).map(|(w, k)| w * k[c]).sum() };
        let term = |c: usize| 0.5 * PI * self.gain[c] * at(u, c) * at(v, c);
        (0..self.gain.len()).map(term).fold((0.0, 0.0), |(sum, abs), t| (sum + t, abs + t.abs()))
    }
}

/// Sides of round rims with their rise, in the order of creases.
fn chords(body: usize, surface: &Surface) -> Vec<Chord> {
    if !surface.sheet || surface.rims_as_drawn {
        return Vec::new();
    }
    let point = |k: u32| surface.welded.points[k as usize];
    let sides: Vec<(u32, [u32; 2])> = surface
        .creases
        .iter()
        .filter(|crease| crease.facets[0] == crease.facets[1])
        .map(|crease| (crease.facets[0], directed(surface, crease.facets[0], crease.ends)))
        .collect();
    let mut leaving: HashMap<u32, Vec<usize>> = HashMap::new();
    let mut arriving: HashMap<u32, Vec<usize>> = HashMap::new();
    for (k, (_, [a, b])) in sides.iter().enumerate() {
        leaving.entry(*a).or_default().push(k);
        arriving.entry(*b).or_default().push(k);
    }
    let along = |k: usize| {
        (point(sides[k].1[1]) - point(sides[k].1[0])).try_normalize(0.0).unwrap_or_else(Vec3::zeros)
    };
    // Turn about the facet normal from one side to the next; positive where the rim bulges out.
    let turn = |from: usize, to: usize| {
        let n = surface.welded.facets[sides[to].0 as usize].map(point);
        let n = (n[1] - n[0]).cross(&(n[2] - n[0])).try_normalize(0.0).unwrap_or_else(Vec3::zeros);
        let (a, b) = (along(from), along(to));
        n.dot(&a.cross(&b)).atan2(a.dot(&b))
    };
    let one = |list: Option<&Vec<usize>>| list.filter(|list| list.len() == 1).map(|list| list[0]);
    let round = |turn: f64| if turn.abs() <= ROUND { turn } else { 0.0 };
    let chord = |(k, (facet, [a, b])): (usize, &(u32, [u32; 2]))| {
        let length_of = |k: usize| (point(sides[k].1[1]) - point(sides[k].1[0])).norm();
        let length = length_of(k);
        // A side much longer than its neighbour is a straight one beside a round corner.
        let alike = |other: &usize| length <= ALIKE * length_of(*other);
        let before = one(arriving.get(a)).filter(alike).map_or(0.0, |from| round(turn(from, k)));
        let after = one(leaving.get(b)).filter(alike).map_or(0.0, |to| round(turn(k, to)));
        // An arc of turn θ over a chord l has the mean height l θ/12; half of it from each end.
        let rise = length * (before + after) / 24.0;
        (rise.abs() > 0.0).then(|| Chord { body, facet: *facet, ends: [point(*a), point(*b)], rise })
    };
    sides.iter().enumerate().filter_map(chord).collect()
}

/// The ends of an edge in the order in which the facet runs through them.
fn directed(surface: &Surface, facet: u32, ends: [u32; 2]) -> [u32; 2] {
    let corners = surface.welded.facets[facet as usize];
    let runs = (0..3).any(|k| [corners[k], corners[(k + 1) % 3]] == ends);
    if runs { ends } else { [ends[1], ends[0]] }
}

/// Panels with a side on the chord: index, length on it [m], mean of d^(−1/2) [m^(−1/2)].
fn touching(panels: &Panels, held: &[usize], [a, b]: &[Vec3; 2]) -> Vec<(usize, f64, f64)> {
    let (t, length) = ((b - a).normalize(), (b - a).norm());
    let height = |x: &Vec3| (x - a - t * (x - a).dot(&t)).norm();
    let mut found = Vec::new();
    for p in held {
        let corners = &panels.triangles[*p].corners;
        let on: Vec<usize> = (0..3).filter(|k| height(&corners[*k]) <= ON_RIM * length).collect();
        if let [i, j] = on[..] {
            let top = height(&corners[3 - i - j]);
            // A triangle with its base on the rim and height w: 2/w² ∫ (w − d) d^(−1/2) dd = (8/3)/√w.
            found.push((*p, (corners[i] - corners[j]).norm(), 8.0 / (3.0 * top.sqrt())));
        }
    }
    found
}

/// Distance from the chord within which a corner lies on it, in chord lengths [1].
const ON_RIM: f64 = 1e-9;
