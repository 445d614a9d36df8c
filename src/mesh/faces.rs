//! Flat faces: the facets that lie in one plane, and what they meet across edges that turn little.

use super::Welded;
use super::edges;
use crate::base::Vec3;
use crate::geom::Triangle;
use std::collections::VecDeque;

/// No facet, no face, no patch.
pub(super) const NONE: u32 = u32::MAX;

/// Error of a corner from single precision, in largest coordinates [1].
///
/// Half a spacing in each of three directions is at most 1.03e-7 of the largest coordinate; after a turn
/// and for corners that two computations rounded twice that is doubled.
const ROUNDING: f64 = 2e-7;

/// Turn under which facets are of one plane, however exact the corners are [rad].
const COPLANAR: f64 = 1e-4;

/// Heights of a facet, in roundings, under which its normal says nothing [1].
const NEEDLE: f64 = 20.0;

/// A set of facets in one plane, connected over their edges.
#[derive(Clone, Debug)]
pub(super) struct Face {
    pub(super) facets: Vec<u32>,
    /// Corners of its facets, each once.
    pub(super) corners: Vec<u32>,
    pub(super) normal: Vec3,
    pub(super) area: f64,
    /// Largest of the smallest heights of its facets [m].
    pub(super) width: f64,
    /// Centre of the circle through the corners of its largest facet [m].
    pub(super) centre: Vec3,
    /// The normal is known: not a needle.
    pub(super) sure: bool,
    /// Faces across edges that turn less than the crease angle, with the length in common [m].
    pub(super) beside: Vec<(u32, f64)>,
}

/// The facets of a body and the flat faces that they make.
pub(super) struct Faces<'a> {
    pub(super) welded: &'a Welded,
    /// Error of a corner [m].
    pub(super) rounding: f64,
    /// Normal of each facet: that of its face.
    pub(super) normal: Vec<Vec3>,
    /// Facet across each side, or [`NONE`] at rims and where more than two meet.
    pub(super) across: Vec<[u32; 3]>,
    /// Turn across each side [rad]; infinite where there is no one facet.
    pub(super) turn: Vec<[f64; 3]>,
    /// Face of each facet.
    pub(super) of: Vec<u32>,
    pub(super) faces: Vec<Face>,
    /// First entry in `around` of each point, and one more.
    first: Vec<u32>,
    /// Facets around each point.
    around: Vec<u32>,
    pub(super) crease_angle: f64,
}

/// Angle between two unit vectors [rad].
pub(super) fn angle(a: &Vec3, b: &Vec3) -> f64 {
    a.cross(b).norm().atan2(a.dot(b))
}

/// The flat faces of a body.
pub(super) fn faces(welded: &Welded, crease_angle: f64) -> Faces<'_> {
    let n = welded.facets.len();
    let tri = |f: usize| Triangle::new(welded.facets[f].map(|k| welded.points[k as usize]));
    let crosses: Vec<Vec3> = (0..n).map(|f| tri(f).cross()).collect();
    let height: Vec<f64> = (0..n)
        .map(|f| {
            let longest = tri(f).longest_edge();
            if 0.0 < longest { crosses[f].norm() / longest } else { 0.0 }
        })
        .collect();
    let (lo, hi) = super::weld::bounds(&welded.points);
    let size = lo.amax().max(hi.amax()).max((hi - lo).norm());
    let rounding = ROUNDING * size;
    let across = across(welded);
    let (first, around) = around(welded);
    let mut all = Faces {
        welded,
        rounding,
        normal: crosses.iter().map(|c| c.try_normalize(0.0).unwrap_or_else(Vec3::zeros)).collect(),
        across,
        turn: vec![[f64::INFINITY; 3]; n],
        of: vec![NONE; n],
        faces: Vec::new(),
        first,
        around,
        crease_angle,
    };
    let mut order: Vec<u32> = (0..n as u32).collect();
    order.sort_by(|a, b| {
        let area = |f: &u32| crosses[*f as usize].norm_squared();
        area(b).total_cmp(&area(a)).then(a.cmp(b))
    });
    for f in order {
        if all.of[f as usize] == NONE {
            grow(&mut all, f, &crosses, &height);
        }
    }
    adopt_normals(&mut all, &height);
    turns(&mut all);
    beside(&mut all);
    all
}

impl Faces<'_> {
    pub(super) fn point(&self, k: u32) -> Vec3 {
        self.welded.points[k as usize]
    }

    /// Facets around a point.
    pub(super) fn around(&self, point: u32) -> &[u32] {
        let k = point as usize;
        &self.around[self.first[k] as usize..self.first[k + 1] as usize]
    }

    /// Whether the surface goes on across this side: one facet there, turned less than a crease.
    pub(super) fn smooth(&self, facet: u32, side: usize) -> bool {
        self.turn[facet as usize][side] <= self.crease_angle
    }

    /// Faces around a corner of `face` that are reached from it over smooth edges at that corner.
    pub(super) fn star(&self, face: u32, corner: u32) -> Vec<u32> {
        let mut facets: Vec<u32> =
            self.around(corner).iter().copied().filter(|f| self.of[*f as usize] == face).collect();
        let mut k = 0;
        while let Some(f) = facets.get(k).copied() {
            k += 1;
            for side in 0..3 {
                let ends = self.ends(f, side);
                let g = self.across[f as usize][side];
                if ends.contains(&corner) && self.smooth(f, side) && !facets.contains(&g) {
                    facets.push(g);
                }
            }
        }
        let mut faces: Vec<u32> = facets.iter().map(|f| self.of[*f as usize]).collect();
        faces.sort_unstable();
        faces.dedup();
        faces
    }

    /// Ends of a side of a facet in its direction.
    pub(super) fn ends(&self, facet: u32, side: usize) -> [u32; 2] {
        let corners = &self.welded.facets[facet as usize];
        [corners[side], corners[(side + 1) % 3]]
    }
}

fn across(welded: &Welded) -> Vec<[u32; 3]> {
    let mut across = vec![[NONE; 3]; welded.facets.len()];
    let sides = edges::sides(&welded.facets);
    for edge in edges::by_edge(&sides) {
        if let [a, b] = edge
            && a.forward != b.forward
            && a.facet != b.facet
        {
            across[a.facet as usize][a.side as usize] = b.facet;
            across[b.facet as usize][b.side as usize] = a.facet;
        }
    }
    across
}

fn around(welded: &Welded) -> (Vec<u32>, Vec<u32>) {
    let mut first = vec![0_u32; welded.points.len() + 1];
    welded.facets.iter().flatten().for_each(|k| first[*k as usize + 1] += 1);
    for k in 1..first.len() {
        first[k] += first[k - 1];
    }
    let mut next = first.clone();
    let mut around = vec![0; 3 * welded.facets.len()];
    for (f, facet) in welded.facets.iter().enumerate() {
        for k in facet {
            around[next[*k as usize] as usize] = f as u32;
            next[*k as usize] += 1;
        }
    }
    (first, around)
}

/// The face of facet `seed`: facets reached over edges whose corners lie in its plane.
fn grow(all: &mut Faces<'_>, seed: u32, crosses: &[Vec3], height: &[f64]) {
    let id = all.faces.len() as u32;
    let tri = |f: u32| Triangle::new(all.welded.facets[f as usize].map(|k| all.welded.points[k as usize]));
    let mut sum = crosses[seed as usize];
    let mut weight = sum.norm();
    let mut middle = tri(seed).centroid() * weight;
    let mut facets = vec![seed];
    let mut queue = VecDeque::from([seed]);
    all.of[seed as usize] = id;
    while let Some(f) = queue.pop_front() {
        for side in 0..3 {
            let g = all.across[f as usize][side];
            if g == NONE || all.of[g as usize] != NONE {
                continue;
            }
            let (Some(n), true) = (sum.try_normalize(0.0), 0.0 < weight) else { continue };
            let through = middle / weight;
            let blur = 2.0 * all.rounding;
            let in_plane = tri(g).corners.iter().all(|p| (p - through).dot(&n).abs() <= blur);
            let own = crosses[g as usize].try_normalize(0.0).unwrap_or(n);
            let noise = COPLANAR.max(2.0 * blur / height[g as usize].max(f64::MIN_POSITIVE));
            if in_plane
                && angle(&n, &own) <= noise.min(3.2)
                && (noise < 1.0 || 0.0 < n.dot(&own) || height[g as usize] < blur)
            {
                all.of[g as usize] = id;
                facets.push(g);
                queue.push_back(g);
                let w = crosses[g as usize].norm();
                sum += crosses[g as usize];
                weight += w;
                middle += tri(g).centroid() * w;
            }
        }
    }
    let mut corners: Vec<u32> = facets.iter().flat_map(|f| all.welded.facets[*f as usize]).collect();
    corners.sort_unstable();
    corners.dedup();
    let width = facets.iter().map(|f| height[*f as usize]).fold(0.0, f64::max);
    let face = Face {
        corners,
        normal: sum.try_normalize(0.0).unwrap_or_else(Vec3::zeros),
        area: 0.5 * weight,
        width,
        centre: circumcentre(&tri(seed)),
        sure: NEEDLE * all.rounding < width,
        facets,
        beside: Vec::new(),
    };
    all.faces.push(face);
}

/// Centre of the circle through the corners [m]; the centroid of a triangle without area.
fn circumcentre(tri: &Triangle) -> Vec3 {
    let [a, b, c] = tri.corners;
    let (u, v) = (b - a, c - a);
    let n = u.cross(&v);
    let square = n.norm_squared();
    if square <= 1e-24 * u.norm_squared() * v.norm_squared() {
        return tri.centroid();
    }
    a + (v.cross(&n).scale(-u.norm_squared()) + u.cross(&n).scale(v.norm_squared())).scale(-0.5 / square)
}

/// Gives each facet the normal of its face, and needles that of the neighbour along the longest edge.
fn adopt_normals(all: &mut Faces<'_>, _height: &[f64]) {
    for face in 0..all.faces.len() {
        if !all.faces[face].sure {
            let mut best: Option<(f64, Vec3)> = None;
            for f in &all.faces[face].facets {
                for side in 0..3 {
                    let g = all.across[*f as usize][side];
                    if g == NONE || !all.faces[all.of[g as usize] as usize].sure {
                        continue;
                    }
                    let [a, b] = all.ends(*f, side).map(|k| all.point(k));
                    let length = (a - b).norm();
                    if best.is_none_or(|(most, _)| most < length) {
                        best = Some((length, all.faces[all.of[g as usize] as usize].normal));
                    }
                }
            }
            if let Some((_, normal)) = best {
                all.faces[face].normal = normal;
            }
        }
    }
    for f in 0..all.normal.len() {
        all.normal[f] = all.faces[all.of[f] as usize].normal;
    }
}

fn turns(all: &mut Faces<'_>) {
    for f in 0..all.turn.len() {
        for side in 0..3 {
            let g = all.across[f][side];
            if g != NONE {
                all.turn[f][side] = angle(&all.normal[f], &all.normal[g as usize]);
            }
        }
    }
}

fn beside(all: &mut Faces<'_>) {
    for face in 0..all.faces.len() {
        let mut beside: Vec<(u32, f64)> = Vec::new();
        for f in &all.faces[face].facets {
            for side in 0..3 {
                if !all.smooth(*f, side) {
                    continue;
                }
                let other = all.of[all.across[*f as usize][side] as usize];
                if other as usize != face {
                    let [a, b] = all.ends(*f, side).map(|k| all.point(k));
                    beside.push((other, (a - b).norm()));
                }
            }
        }
        beside.sort_by_key(|(other, _)| *other);
        beside.dedup_by(|later, kept| {
            let same = later.0 == kept.0;
            if same {
                kept.1 += later.1;
            }
            same
        });
        beside.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
        all.faces[face].beside = beside;
    }
}
