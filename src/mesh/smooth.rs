//! Smooth patches, creases, and the normals of the drawn surface recovered from its facets.

use super::Crease;
use super::Welded;
use crate::base::Vec3;
use crate::geom::Triangle;
use std::f64::consts::PI;

/// Turn between facet normals from which an edge counts as a crease [rad]: 35°.
///
/// A round rim drawn with four facets a quarter turns by 22.5°, a cylinder of twelve sides by 30°, an
/// octagonal bar by 45° (*common practice*: CAD exports stay under 30°).
pub const CREASE_ANGLE: f64 = 35.0 * PI / 180.0;

/// Turn under which two facets lie in one plane [rad].
const COPLANAR: f64 = 1e-3;

/// Angle between a recovered normal and its facet's, in largest turns around the corner, that is
/// still explained [1].
///
/// On a regular mesh of a sphere both are the circumradius over the radius; at 1 half the corners of an
/// icosphere are refused by rounding (14 % of the faceting correction lost), at 2 none.
const EXPLAINED: f64 = 2.0;

/// Largest over smallest area of the facets around a corner up to which they are weighted as on a sphere;
/// beyond it the large ones decide [1].
///
/// Volume error after rebuilding, at 1, 3, 6 and without limit: icosphere of 1,280 facets with jittered
/// corners −1.5e-3, −3.5e-4, −9e-5, −9e-5 (flat −9.8e-3); disc of 960 facets with filleted rims −7e-5,
/// −8e-5, **+5e-3**, +5e-3 (flat −4.8e-3); capsule of long facets +6e-4, +1.4e-3, **+6e-2**, +6e-2; filleted
/// tube −2e-4, −2e-4, −2e-4, **+0.39**.
const EVEN: f64 = 3.0;

/// Facets of one plane from which it counts as a flat of the drawing: the two triangles of a quad of a
/// round body lie in one plane as well.
const FLAT_FACETS: usize = 3;

/// Error of a normal from the rounding of f32 corners above which it is taken from a neighbour [rad].
const UNRELIABLE: f64 = 0.05;

/// What [`recover`] finds.
#[derive(Clone, Debug, PartialEq)]
pub struct Smooth {
    /// Unit normal at each corner of each facet.
    pub normals: Vec<[Vec3; 3]>,
    /// Edges where smooth patches end.
    pub creases: Vec<Crease>,
    /// Largest turn that was smoothed [rad], and where [m].
    pub sharpest_smoothed: Option<(f64, Vec3)>,
}

/// An edge with the facets beside it.
struct Joint {
    ends: [u32; 2],
    /// Facet and number of the edge in it.
    sides: Vec<(u32, u8)>,
}

/// Groups facets across edges that turn less than `crease_angle` [rad] and gives each corner the mean
/// normal of its group: where the facets are alike, with the weights that are exact on a sphere (Max,
/// J. Graphics Tools 4, 1999), else weighted by area squared.
///
/// In exports the large facets tell the surface and the small ones beside them are fillets: with
/// Max's weights alone a filleted disc gains 12 % of volume, with area squared 1e-4 (DESIGN 3.6).  Where a flat meets other facets, the flat decides.  A normal that leaves
/// its facet by more than the turns around the corner explain is refused: the facet's own is taken.
pub fn recover(welded: &Welded, crease_angle: f64) -> Smooth {
    let joints = joints(welded);
    let shape = Shape::new(welded, &joints);
    let (mut groups, mut flats) = (Groups::new(3 * welded.facets.len()), Groups::new(welded.facets.len()));
    let mut creases = Vec::new();
    let mut max_turn = vec![0.0_f64; 3 * welded.facets.len()];
    let mut sharpest: Option<(f64, Vec3)> = None;
    for joint in &joints {
        let turn = shape.turn(joint);
        match (turn, joint.sides.as_slice()) {
            (Some(turn), [(f, e), (g, d)]) if turn <= crease_angle => {
                if turn < COPLANAR {
                    flats.join(*f as usize, *g as usize);
                }
                for (a, b) in [(*e, (*d + 1) % 3), ((*e + 1) % 3, *d)] {
                    let corners = [3 * *f as usize + a as usize, 3 * *g as usize + b as usize];
                    groups.join(corners[0], corners[1]);
                    corners.iter().for_each(|c| max_turn[*c] = max_turn[*c].max(turn));
                }
                if sharpest.is_none_or(|(most, _)| most < turn) {
                    let [a, b] = joint.ends.map(|k| welded.points[k as usize]);
                    sharpest = Some((turn, (a + b) * 0.5));
                }
            }
            (_, sides) => creases.extend(crease(&shape, joint, sides)),
        }
    }
    let normals = corner_normals(welded, &shape, &mut groups, &mut flats, &max_turn);
    let sharpest_smoothed = sharpest.filter(|(turn, _)| COPLANAR < *turn);
    Smooth { normals, creases, sharpest_smoothed }
}

/// Facet normals for every corner, and creases where facets turn at all: the facets are the shape.
pub fn as_drawn(welded: &Welded) -> Smooth {
    let Smooth { creases, .. } = recover(welded, COPLANAR);
    let normal = |facet: &[u32; 3]| Triangle::new(facet.map(|k| welded.points[k as usize])).normal();
    let normals = welded.facets.iter().map(|facet| [normal(facet); 3]).collect();
    Smooth { normals, creases, sharpest_smoothed: None }
}

/// Edges in order of their ends, with the facets beside them.
fn joints(welded: &Welded) -> Vec<Joint> {
    let mut sides: Vec<([u32; 2], u32, u8)> = Vec::with_capacity(3 * welded.facets.len());
    for (f, facet) in welded.facets.iter().enumerate() {
        for e in 0..3 {
            let (a, b) = (facet[e], facet[(e + 1) % 3]);
            sides.push(([a.min(b), a.max(b)], f as u32, e as u8));
        }
    }
    sides.sort_unstable();
    let same = |a: &([u32; 2], u32, u8), b: &([u32; 2], u32, u8)| a.0 == b.0;
    sides
        .chunk_by(same)
        .map(|run| Joint { ends: run[0].0, sides: run.iter().map(|(_, f, e)| (*f, *e)).collect() })
        .collect()
}

/// Normals and areas of facets.
struct Shape {
    normal: Vec<Vec3>,
    area: Vec<f64>,
    centroid: Vec<Vec3>,
}

impl Shape {
    fn new(welded: &Welded, joints: &[Joint]) -> Self {
        let tri = |f: &[u32; 3]| Triangle::new(f.map(|k| welded.points[k as usize]));
        let triangles: Vec<Triangle> = welded.facets.iter().map(tri).collect();
        let mut shape = Shape {
            normal: triangles.iter().map(Triangle::normal).collect(),
            area: triangles.iter().map(Triangle::area).collect(),
            centroid: triangles.iter().map(Triangle::centroid).collect(),
        };
        let largest = welded.points.iter().fold(0.0_f64, |most, p| most.max(p.amax()));
        let rounding = largest * f64::from(f32::EPSILON);
        let doubtful: Vec<bool> = triangles
            .iter()
            .map(|tri| tri.cross().norm() * UNRELIABLE < rounding * tri.longest_edge())
            .collect();
        let own = shape.normal.clone();
        let mut best = vec![0.0; triangles.len()];
        for joint in joints {
            let [(f, _), (g, _)] = joint.sides.as_slice() else { continue };
            let length =
                (welded.points[joint.ends[0] as usize] - welded.points[joint.ends[1] as usize]).norm();
            for (needy, giver) in [(*f as usize, *g as usize), (*g as usize, *f as usize)] {
                if doubtful[needy] && !doubtful[giver] && best[needy] < length {
                    best[needy] = length;
                    shape.normal[needy] = own[giver];
                }
            }
        }
        shape
    }

    /// Angle between the normals beside an edge of two facets that run against each other [rad].
    fn turn(&self, joint: &Joint) -> Option<f64> {
        let [(f, _), (g, _)] = joint.sides.as_slice() else { return None };
        let (n, m) = (&self.normal[*f as usize], &self.normal[*g as usize]);
        Some(n.cross(m).norm().atan2(n.dot(m)))
    }
}

fn crease(shape: &Shape, joint: &Joint, sides: &[(u32, u8)]) -> Option<Crease> {
    match sides {
        [(f, _)] => Some(Crease { ends: joint.ends, facets: [*f, *f], angle: 0.0 }),
        [(f, _), (g, _)] => {
            let turn = shape.turn(joint)?;
            let (n, m) = (&shape.normal[*f as usize], &shape.normal[*g as usize]);
            let between = shape.centroid[*g as usize] - shape.centroid[*f as usize];
            let convex = 0.0 < between.dot(&(m - n));
            Some(Crease {
                ends: joint.ends,
                facets: [*f, *g],
                angle: if convex { PI - turn } else { PI + turn },
            })
        }
        _ => None,
    }
}

fn corner_normals(
    welded: &Welded,
    shape: &Shape,
    groups: &mut Groups,
    flats: &mut Groups,
    max_turn: &[f64],
) -> Vec<[Vec3; 3]> {
    let n = welded.facets.len();
    let mut members = vec![0_usize; n];
    (0..n).for_each(|f| members[flats.find(f)] += 1);
    let is_flat: Vec<bool> = (0..n).map(|f| FLAT_FACETS <= members[flats.find(f)]).collect();
    let mut flat_area = vec![0.0; n];
    (0..n).for_each(|f| flat_area[flats.find(f)] += shape.area[f]);
    // Round facets by both weights, flats by the area of the flat; and the span of areas in the group.
    let mut sums = vec![[Vec3::zeros(); 3]; 3 * n];
    let mut span = vec![(f64::INFINITY, 0.0_f64); 3 * n];
    let mut turns = vec![0.0_f64; 3 * n];
    for f in 0..n {
        for k in 0..3 {
            let group = groups.find(3 * f + k);
            turns[group] = turns[group].max(max_turn[3 * f + k]);
            let (lo, hi) = span[group];
            span[group] = (lo.min(shape.area[f]), hi.max(shape.area[f]));
            if is_flat[f] {
                let area = flat_area[flats.find(f)];
                sums[group][2] += shape.normal[f] * (area * area);
            } else {
                sums[group][0] += shape.normal[f] * sphere_weight(welded, f, k);
                sums[group][1] += shape.normal[f] * (shape.area[f] * shape.area[f]);
            }
        }
    }
    let corner = |groups: &mut Groups, f: usize, k: usize| {
        let group = groups.find(3 * f + k);
        let [even, uneven, flat] = sums[group];
        let own = shape.normal[f];
        let (lo, hi) = span[group];
        let sum = if flat != Vec3::zeros() {
            flat
        } else if hi <= EVEN * lo {
            even
        } else {
            uneven
        };
        let found = sum.try_normalize(0.0).unwrap_or(own);
        let leaves = found.cross(&own).norm().atan2(found.dot(&own));
        if leaves <= EXPLAINED * turns[group] { found } else { own }
    };
    (0..n).map(|f| [0, 1, 2].map(|k| corner(groups, f, k))).collect()
}

/// Weight of facet `f` at its corner `k`: `sin α / (|e₁| |e₂|)`, exact on a sphere (Max 1999).
fn sphere_weight(welded: &Welded, f: usize, k: usize) -> f64 {
    let at = |k: usize| welded.points[welded.facets[f][k % 3] as usize];
    let (d, e) = (at(k + 1) - at(k), at(k + 2) - at(k));
    let size = d.norm_squared() * e.norm_squared();
    if 0.0 < size { d.cross(&e).norm() / size } else { 0.0 }
}

/// Disjoint sets with path halving (Tarjan and van Leeuwen, J. ACM 31, 1984).
struct Groups(Vec<usize>);

impl Groups {
    fn new(n: usize) -> Self {
        Groups((0..n).collect())
    }

    fn find(&mut self, mut a: usize) -> usize {
        while self.0[a] != a {
            self.0[a] = self.0[self.0[a]];
            a = self.0[a];
        }
        a
    }

    fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.find(a), self.find(b));
        let (lo, hi) = (a.min(b), a.max(b));
        self.0[hi] = lo;
    }
}
