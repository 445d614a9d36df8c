//! Creases and rims, where the field is unbounded: σ ~ K s^(π/(2π−w) − 1) at distance s from the edge
//! of a metal wedge of angle w (Jackson, Classical Electrodynamics, section 2.11).

use crate::base::Vec3;
use crate::mesh::Assembly;
use crate::mesh::Crease;
use crate::mesh::Surface;
use crate::panel::Panels;
use crate::physics::look::Map;
use crate::physics::look::Medium;
use std::collections::HashMap;
use std::f64::consts::PI;

/// Angle through the metal above which an edge is not counted as unbounded [rad]: 175°.
///
/// The exponent there is above −0.03: over three decades of distance the field grows by a fifth.
pub const SEAM: f64 = 175.0 * PI / 180.0;

/// Largest turn between two pieces of crease that make one edge [rad]: 35°, as for smooth surfaces.
const ONE_EDGE: f64 = 35.0 * PI / 180.0;

/// Largest difference of the angles through the metal within one edge [rad]: 10°.
///
/// The exponent of a right angle moves by 0.024 over it.
const ALIKE: f64 = 10.0 * PI / 180.0;

/// A straight piece of an edge with the free space around it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Segment {
    /// Ends, in the direction of the edge [m].
    pub ends: [Vec3; 2],
    /// Angle through the metal [rad].
    pub angle: f64,
    /// Unit vector from the edge along the first face.
    pub face: Vec3,
    /// Unit normal of the first face, into free space; both faces are met on a turn from `face` over this.
    pub normal: Vec3,
    /// Indices of the ends in `Welded::points`; none where metal or an earth plane cuts a crease.
    vertices: [Option<u32>; 2],
}

impl Segment {
    /// Length [m].
    pub fn length(&self) -> f64 {
        (self.ends[1] - self.ends[0]).norm()
    }

    /// Unit vector along it; zero without length.
    pub fn tangent(&self) -> Vec3 {
        (self.ends[1] - self.ends[0]).try_normalize(0.0).unwrap_or_else(Vec3::zeros)
    }

    /// Point at distance `r` [m] from `at`, turned by `alpha` [rad] from the first face through free space [m].
    pub fn around(&self, at: &Vec3, r: f64, alpha: f64) -> Vec3 {
        at + (self.face * alpha.cos() + self.normal * alpha.sin()) * r
    }

    fn turned(mut self) -> Self {
        self.ends.swap(0, 1);
        self.vertices.swap(0, 1);
        self
    }
}

/// A whole edge: pieces of crease or rim that follow each other without a corner.
#[derive(Clone, Debug, PartialEq)]
pub struct Edge {
    /// Index of the body.
    pub body: usize,
    /// Its pieces in order, each starting where the one before ends.
    pub segments: Vec<Segment>,
    /// Whether it comes back to its start.
    pub closed: bool,
}

impl Edge {
    /// Length [m].
    pub fn length(&self) -> f64 {
        self.segments.iter().map(Segment::length).sum()
    }

    /// Index of the piece at `along` [m] from the start, and the place on it [m].
    pub fn at(&self, along: f64) -> (usize, Vec3) {
        let mut left = along;
        for (k, segment) in self.segments.iter().enumerate() {
            let length = segment.length();
            if left <= length || k + 1 == self.segments.len() {
                return (k, segment.ends[0] + segment.tangent() * left.min(length));
            }
            left -= length;
        }
        (0, Vec3::zeros())
    }

    /// Distance along the edge from its start to the middle of piece `k` [m].
    pub fn middle_of(&self, k: usize) -> f64 {
        self.segments[..k].iter().map(Segment::length).sum::<f64>() + 0.5 * self.segments[k].length()
    }

    /// Largest turn from piece to piece [rad].
    pub fn largest_turn(&self) -> f64 {
        let turn = |pair: &[Segment]| pair[0].tangent().dot(&pair[1].tangent()).clamp(-1.0, 1.0).acos();
        self.segments.windows(2).map(turn).fold(0.0, f64::max)
    }

    /// Whether all pieces run in one direction.
    pub fn straight(&self) -> bool {
        let t = self.segments[0].tangent();
        self.segments.iter().all(|segment| STRAIGHT <= segment.tangent().dot(&t))
    }
}

/// Cosine of the turn under which an edge counts as straight [1].
const STRAIGHT: f64 = 1.0 - 1e-6;

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

/// All edges with an unbounded field: exposed, with less than [`SEAM`] through the metal.
///
/// Where bonded metal meets a crease, the angle is that of all metal there, and what it buries is left out;
/// so is what an earth plane cuts off.
pub fn edges(panels: &Panels) -> Vec<Edge> {
    let assembly = &panels.assembly;
    let mut found = Vec::new();
    let mut map = None;
    let mut seen: Vec<Vec3> = Vec::new();
    for (body, part) in assembly.bodies.iter().enumerate() {
        let exposed = exposed_facets(assembly, body);
        let row = assembly.rows.iter().find(|row| row.bodies.contains(&(body as u32)));
        let alone = row.is_some_and(|row| row.bodies.len() == 1);
        let sharp = |crease: &&Crease| {
            crease.facets.iter().any(|f| exposed[*f as usize])
                && (!alone || sharp_angle(&part.surface, crease) < SEAM)
        };
        let drawn =
            part.surface.creases.iter().filter(sharp).filter_map(|crease| drawn(&part.surface, crease));
        let segments = if alone {
            drawn.collect()
        } else {
            let map = map.get_or_insert_with(|| Map::new(panels));
            let free = drawn.flat_map(|segment| free(map, &segment)).filter(|s| s.angle < SEAM);
            // Two bodies that share an edge both draw it.
            let new = free.filter(|segment| {
                let middle = (segment.ends[0] + segment.ends[1]) * 0.5;
                let near = SAME_PLACE * segment.length();
                let known = seen.iter().any(|other| (other - middle).norm() <= near);
                if !known && seen.len() < MOST_SHARED {
                    seen.push(middle);
                }
                !known
            });
            new.collect()
        };
        found.extend(chained(body, segments));
    }
    found
}

/// Exposed creases that bulge out by less than what makes an edge: how many there are, and where the sharpest stands.
pub fn seams(assembly: &Assembly, body: usize) -> Option<(usize, f64, Vec3)> {
    let surface = &assembly.bodies[body].surface;
    let exposed = exposed_facets(assembly, body);
    let seam = |crease: &&Crease| {
        let angle = sharp_angle(surface, crease);
        (SEAM..PI).contains(&angle) && crease.facets.iter().any(|f| exposed[*f as usize])
    };
    let all: Vec<&Crease> = surface.creases.iter().filter(seam).collect();
    let angle = |crease: &&Crease| sharp_angle(surface, crease);
    let sharpest = all.iter().min_by(|a, b| angle(a).total_cmp(&angle(b)))?;
    let [a, b] = sharpest.ends.map(|k| surface.welded.points[k as usize]);
    Some((all.len(), PI - angle(sharpest), (a + b) * 0.5))
}

/// Distance between the middles of two pieces that are the same, in lengths [1].
const SAME_PLACE: f64 = 1e-4;

/// Pieces of joined bodies that are compared with each other at most.
const MOST_SHARED: usize = 5000;

/// The crease as a piece of edge; none where it has no length.
fn drawn(surface: &Surface, crease: &Crease) -> Option<Segment> {
    let point = |k: u32| surface.welded.points[k as usize];
    let ends = crease.ends.map(point);
    let t = (ends[1] - ends[0]).try_normalize(0.0)?;
    let corners = surface.welded.facets[crease.facets[0] as usize];
    let apex = point(*corners.iter().find(|k| !crease.ends.contains(k))?);
    let away = apex - ends[0];
    let face = (away - t * away.dot(&t)).try_normalize(0.0)?;
    let [a, b, c] = corners.map(point);
    let outward = (b - a).cross(&(c - a)).try_normalize(0.0)?;
    let angle = sharp_angle(surface, crease);
    // On a fold whose metal side is the wide one the free side is the other.
    let normal = if angle < crease.angle { -outward } else { outward };
    Some(Segment { ends, angle, face, normal, vertices: crease.ends.map(Some) })
}

/// Places along a crease at which joined metal is looked for.
const ALONG: usize = 9;

/// Directions around a crease in which joined metal is looked for.
const AROUND: usize = 24;

/// Distance from a crease at which it is looked for, in lengths of the crease [1].
const CLOSE: f64 = 1e-3;

/// Halvings with which the end of metal is found.
const HALVINGS: usize = 12;

/// The stretches of a crease that stand free, each with its angle through all metal there.
fn free(map: &Map, segment: &Segment) -> Vec<Segment> {
    let length = segment.length();
    let at = |t: f64| segment.ends[0] + segment.tangent() * (t * length);
    let angle = |t: f64| free_arc(map, segment, &at(t)).map(|(_, open)| 2.0 * PI - open);
    let t = |k: usize| (k as f64 + 0.5) / ALONG as f64;
    let angles: Vec<Option<f64>> = (0..ALONG).map(|k| angle(t(k))).collect();
    let same = |a: Option<f64>, b: Option<f64>| match (a, b) {
        (Some(a), Some(b)) => (a - b).abs() <= ALIKE,
        (None, None) => true,
        _ => false,
    };
    let mut cuts = vec![0.0];
    for k in 1..ALONG {
        if !same(angles[k - 1], angles[k]) {
            let (mut lo, mut hi) = (t(k - 1), t(k));
            for _ in 0..HALVINGS {
                let mid = 0.5 * (lo + hi);
                if same(angles[k - 1], angle(mid)) { lo = mid } else { hi = mid }
            }
            cuts.push(0.5 * (lo + hi));
        }
    }
    cuts.push(1.0);
    let piece = |span: &[f64]| {
        let [from, to] = [span[0], span[1]];
        let middle = at(0.5 * (from + to));
        let (start, open) = free_arc(map, segment, &middle)?;
        let face = segment.face * start.cos() + segment.normal * start.sin();
        let normal = segment.normal * start.cos() - segment.face * start.sin();
        let vertex = |t: f64, k: usize| if t.fract().abs() <= 0.0 { segment.vertices[k] } else { None };
        Some(Segment {
            ends: [at(from), at(to)],
            angle: 2.0 * PI - open,
            face,
            normal,
            vertices: [vertex(from, 0), vertex(to, 1)],
        })
    };
    cuts.windows(2).filter_map(piece).collect()
}

/// Start [rad from the face of the segment] and width [rad] of the widest free arc around a place; none
/// where all is metal.
fn free_arc(map: &Map, segment: &Segment, at: &Vec3) -> Option<(f64, f64)> {
    let r = CLOSE * segment.length();
    let open = |alpha: f64| map.medium(&segment.around(at, r, alpha)) == Medium::Surroundings;
    let step = 2.0 * PI / AROUND as f64;
    let alpha = |k: usize| (k as f64 + 0.5) * step;
    let free: Vec<bool> = (0..AROUND).map(|k| open(alpha(k))).collect();
    // Sheets hold no space: what is free all around is as drawn.
    let Some(first) = (0..AROUND).find(|k| !free[*k]) else { return Some((0.0, 2.0 * PI - segment.angle)) };
    let (mut best, mut run) = ((0, 0), 0);
    for k in 1..=AROUND {
        if free[(first + k) % AROUND] {
            run += 1;
            if best.1 < run {
                best = (first + k + 1 - run, run);
            }
        } else {
            run = 0;
        }
    }
    if best.1 == 0 {
        return None;
    }
    let side = |mut inside: f64, mut outside: f64| {
        for _ in 0..HALVINGS {
            let mid = 0.5 * (inside + outside);
            if open(mid) { inside = mid } else { outside = mid }
        }
        0.5 * (inside + outside)
    };
    let (lo, hi) = (alpha(best.0), alpha(best.0 + best.1 - 1));
    let (start, end) = (side(lo, lo - step), side(hi, hi + step));
    Some((start, end - start))
}

/// Pieces put together to whole edges: at each corner those that go on straightest.
fn chained(body: usize, mut segments: Vec<Segment>) -> Vec<Edge> {
    let mut meeting: HashMap<u32, Vec<(usize, usize)>> = HashMap::new();
    for (k, segment) in segments.iter().enumerate() {
        for (end, vertex) in segment.vertices.iter().enumerate() {
            if let Some(vertex) = vertex {
                meeting.entry(*vertex).or_default().push((k, end));
            }
        }
    }
    let mut next: Vec<[Option<(usize, usize)>; 2]> = vec![[None; 2]; segments.len()];
    let away = |(k, end): (usize, usize)| segments[k].tangent() * if end == 0 { 1.0 } else { -1.0 };
    let mut vertices: Vec<&u32> = meeting.keys().collect();
    vertices.sort_unstable();
    for vertex in vertices {
        let here = &meeting[vertex];
        let mut pairs: Vec<(f64, usize, usize)> = Vec::new();
        for a in 0..here.len() {
            for b in a + 1..here.len() {
                let turn = (-away(here[a]).dot(&away(here[b]))).clamp(-1.0, 1.0).acos();
                let alike = (segments[here[a].0].angle - segments[here[b].0].angle).abs() <= ALIKE;
                if turn <= ONE_EDGE && alike && here[a].0 != here[b].0 {
                    pairs.push((turn, a, b));
                }
            }
        }
        pairs.sort_by(|p, q| p.0.total_cmp(&q.0));
        for (_, a, b) in pairs {
            let ([k, end], [l, other]) = ([here[a].0, here[a].1], [here[b].0, here[b].1]);
            if next[k][end].is_none() && next[l][other].is_none() {
                next[k][end] = Some((l, other));
                next[l][other] = Some((k, end));
            }
        }
    }
    let mut done = vec![false; segments.len()];
    let mut found = Vec::new();
    // Open edges from their ends, then what is left: closed ones.
    let starts = (0..segments.len()).flat_map(|k| [(k, 0), (k, 1)]);
    let open: Vec<(usize, usize)> = starts.filter(|(k, end)| next[*k][*end].is_none()).collect();
    let rest = (0..segments.len()).map(|k| (k, 0));
    for (start, end) in open.into_iter().chain(rest) {
        if done[start] {
            continue;
        }
        let closed = next[start][end].is_some();
        let mut held = Vec::new();
        let mut at = Some((start, end));
        while let Some((k, entry)) = at.filter(|(k, _)| !done[*k]) {
            done[k] = true;
            held.push((k, entry));
            at = next[k][1 - entry];
        }
        let run =
            |(k, entry): &(usize, usize)| if *entry == 0 { segments[*k] } else { segments[*k].turned() };
        found.push(Edge { body, segments: held.iter().map(run).collect(), closed });
    }
    segments.clear();
    found
}
