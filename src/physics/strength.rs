//! Strength of the field along an edge, from the potential around it.
//!
//! Around a straight edge of a wedge the drop of potential below the metal is
//! `u = Σ_k a_k r^(kn) sin(knα)` with `n = π/(2π−w)` (Jackson, Classical Electrodynamics, section 2.11), and the
//! field on the faces `K s^(n−1)` with `K = n a₁`.  The mean of `u` over an arc against `sin(nα)` is `a₁ r^n` at every
//! radius, whatever the other terms; panels of finite size add `b r^(−n)`, curvature a part of order `r`,
//! change along the edge one of order `r²`.  So the means over a decade of radii are fitted by
//! `a₁ (1 + c r + d r²) + b r^(−2n)`.  Potentials off the surface converge faster than charge densities on it,
//! and most of their error is in `b`.

use crate::base::Vec3;
use crate::geom::distance;
use crate::operator::Sources;
use crate::panel::Panels;
use crate::physics::edges::Edge;
use crate::physics::edges::Segment;
use crate::physics::solved::Solved;
use nalgebra::DMatrix;
use std::f64::consts::PI;

/// The strength at a place of an edge.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    /// Distance from the start of the edge [m].
    pub along: f64,
    /// The place [m].
    pub at: Vec3,
    /// Angle through the metal [rad].
    pub angle: f64,
    /// Distance to the nearest other thing: corner, crease, bend, wall, other body, earth [m].
    pub reach: f64,
    /// `strength[j]`: K per volt on row j [V·m^(−n) per V].
    pub strength: Vec<f64>,
    /// The same by a fit of other order, for the bar [V·m^(−n) per V].
    pub other: Vec<f64>,
    /// Part of the mean over an arc that panels of finite size make, at the middle radius [V·m^(−n) per V].
    pub unresolved: Vec<f64>,
    /// `second[j]`: K₂ of the next term `K₂ s^(2n−1)`, of opposite sign on the two faces [V·m^(−2n) per V].
    pub second: Vec<f64>,
    /// `third[j]`: K₃ of the term `K₃ s^(3n−1)` [V·m^(−3n) per V].
    pub third: Vec<f64>,
}

impl Place {
    /// Exponent of distance in the field law [1].
    pub fn exponent(&self) -> f64 {
        order(self.angle) - 1.0
    }

    /// K at row potentials `v` [V·m^(−n)].
    pub fn at_potentials(&self, v: &[f64]) -> f64 {
        dot(&self.strength, v)
    }
}

/// Share of the part that panels of finite size make which enters the bar of K [1].
///
/// Cube of 300, 1,200, 3,600 panels, square sheet of 300 and 1,200, disc of 300 and 1,200: the error of K was at most
/// 1.4 times the larger of that part at the place and of its mean along the edge.
const UNRESOLVED: f64 = 1.5;

/// Share of the squared turn between pieces of a bent edge [rad²] that enters the relative bar [1].
///
/// Disc drawn with 24 and 96 sides, well refined: 1.1 % and 0.1 % low.
const TURN: f64 = 0.2;

/// K at each place of one edge at row potentials `v`, with its bar [V·m^(−n)]; `charge_bar` is the relative bar of
/// the charges of the body [1].
pub fn with_bars(edge: &Edge, places: &[Place], v: &[f64], charge_bar: f64) -> Vec<(f64, f64)> {
    let relative = |place: &Place| {
        let k = place.at_potentials(v).abs().max(f64::MIN_POSITIVE);
        (dot(&place.unresolved, v).abs() / k).min(1.0)
    };
    let mean = places.iter().map(relative).sum::<f64>() / places.len().max(1) as f64;
    let turn = edge.largest_turn();
    let one = |place: &Place| {
        let k = place.at_potentials(v);
        let doubt = (k - dot(&place.other, v)).abs();
        let share = UNRESOLVED * relative(place).max(mean) + TURN * turn * turn + charge_bar;
        (k, doubt + share * k.abs())
    };
    places.iter().map(one).collect()
}

/// `n = π/(2π − angle)` [1].
pub fn order(angle: f64) -> f64 {
    PI / (2.0 * PI - angle)
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// Directions in which the potential is taken: the midpoint rule keeps eleven terms apart.
const AROUND: usize = 6;

/// Radii, a decade from the largest to the smallest.
const RADII: usize = 7;

/// Largest radius, in distances to the nearest other thing [1].
const WIDEST: f64 = 0.5;

/// Turn along an edge that ends what counts as one straight piece [rad].
const BEND: f64 = 1.0;

/// Cosine of the angle between normals up to which a panel still belongs to a face beside the edge [1]: 35°.
const SAME_FACE: f64 = 0.82;

/// Places on edges, most important first: on closed ones as shares of the length, at the ends of open ones as shares of
/// [`scale`].
const CLOSED: [f64; 8] = [0.0, 0.5, 0.25, 0.75, 0.125, 0.625, 0.375, 0.875];
const AT_ENDS: [f64; 4] = [1.0 / 8.0, 1.0 / 32.0, 1.0 / 16.0, 1.0 / 4.0];

/// Most places on one edge.
pub const MOST_PLACES: usize = 11;

/// Strengths along each of the `edges`, in the order of `along`; `most` places an edge.
pub fn strengths(solved: &Solved, sources: &Sources, edges: &[Edge], most: usize) -> Vec<Vec<Place>> {
    let mut spots = Vec::new();
    for (e, edge) in edges.iter().enumerate() {
        let (k, middle) = edge.at(0.5 * edge.length());
        let room = reach(&solved.panels, edges, e, edge.middle_of(k), &middle);
        for along in stations(edge, scale(edge.length(), room), most) {
            let (k, at) = edge.at(along);
            let reach = reach(&solved.panels, edges, e, along, &at);
            spots.push(Spot { edge: e, along, at, segment: edge.segments[k], reach });
        }
    }
    let points: Vec<Vec3> = spots.iter().flat_map(Spot::points).collect();
    let seen = sources.potentials(&points, &solved.charges.density);
    let mut found: Vec<Vec<Place>> = vec![Vec::new(); edges.len()];
    for (k, spot) in spots.iter().enumerate() {
        let body = edges[spot.edge].body as u32;
        let row = solved.panels.assembly.rows.iter().position(|row| row.bodies.contains(&body));
        let range = k * RADII * AROUND..(k + 1) * RADII * AROUND;
        let drops = seen.iter().enumerate().map(|(j, seen)| {
            let own = if row == Some(j) { 1.0 } else { 0.0 };
            seen[range.clone()].iter().map(|s| own - s / (4.0 * PI)).collect::<Vec<f64>>()
        });
        found[spot.edge].push(spot.place(&drops.collect::<Vec<_>>(), edges[spot.edge].straight()));
    }
    found.iter_mut().for_each(|places| places.sort_by(|a, b| a.along.total_cmp(&b.along)));
    found
}

/// Length on which the field along an open edge changes towards its ends [m]: its own, or where something else is
/// nearer, `reach` from its middle, twice that.
pub fn scale(length: f64, reach: f64) -> f64 {
    length.min(2.0 * reach)
}

/// Where on an edge strengths are wanted [m]; on a bent edge at the middles of its pieces.
fn stations(edge: &Edge, scale: f64, most: usize) -> Vec<f64> {
    let length = edge.length();
    let wanted: Vec<f64> = if edge.closed {
        CLOSED.iter().map(|share| share * length).collect()
    } else {
        let ends = AT_ENDS.iter().flat_map(|share| [share * scale, length - share * scale]);
        let long = scale < 0.5 * length;
        let between = [0.25, 0.75].into_iter().filter(|_| long).map(|share| share * length);
        [0.5 * length].into_iter().chain(ends).chain(between).collect()
    };
    let straight = edge.straight();
    let snap = |along: &f64| if straight { *along } else { edge.middle_of(edge.at(*along).0) };
    let mut along: Vec<f64> = wanted.iter().take(most.max(1)).map(snap).collect();
    along.sort_by(f64::total_cmp);
    along.dedup();
    along
}

struct Spot {
    edge: usize,
    along: f64,
    at: Vec3,
    segment: Segment,
    reach: f64,
}

impl Spot {
    fn radius(&self, k: usize) -> f64 {
        WIDEST * self.reach * 10.0_f64.powf(-(k as f64) / (RADII - 1) as f64)
    }

    fn alpha(&self, m: usize) -> f64 {
        (m as f64 + 0.5) * (2.0 * PI - self.segment.angle) / AROUND as f64
    }

    fn points(&self) -> Vec<Vec3> {
        let around = |k: usize| (0..AROUND).map(move |m| (k, m));
        let at = |(k, m): (usize, usize)| self.segment.around(&self.at, self.radius(k), self.alpha(m));
        (0..RADII).flat_map(around).map(at).collect()
    }

    fn place(&self, drops: &[Vec<f64>], straight: bool) -> Place {
        let n = order(self.segment.angle);
        let mode = |u: &[f64], k: usize, term: f64| {
            let part = |m: usize| u[k * AROUND + m] * (term * n * self.alpha(m)).sin();
            let mean = 2.0 / AROUND as f64 * (0..AROUND).map(part).sum::<f64>();
            term * n * mean / self.radius(k).powf(term * n)
        };
        let means: Vec<Vec<f64>> =
            drops.iter().map(|u| (0..RADII).map(|k| mode(u, k, 1.0)).collect()).collect();
        let scaled: Vec<f64> = (0..RADII).map(|k| self.radius(k) / self.radius(0)).collect();
        let powers = if straight { STRAIGHT } else { BENT };
        let [first, blunt] = at_the_edge(&scaled, n, &powers);
        let [inner, _] = at_the_edge(&scaled[INNER..], n, &powers[..1]);
        let spread = scaled[RADII / 2].powf(-2.0 * n);
        Place {
            along: self.along,
            at: self.at,
            angle: self.segment.angle,
            reach: self.reach,
            strength: means.iter().map(|k| dot(&first, k)).collect(),
            other: means.iter().map(|k| dot(&inner, &k[INNER..])).collect(),
            unresolved: means.iter().map(|k| spread * dot(&blunt, k)).collect(),
            second: drops.iter().map(|u| mode(u, NEXT, 2.0)).collect(),
            third: drops.iter().map(|u| mode(u, NEXT, 3.0)).collect(),
        }
    }
}

/// Index of the radius at which the next terms are read.
const NEXT: usize = 1;

/// Powers of the radius beside the constant and r^(−2n).
const STRAIGHT: [i32; 2] = [2, 4];
const BENT: [i32; 2] = [1, 2];

/// First radius of the second fit, which has one power less.
const INNER: usize = 2;

/// Weights of the means over radii whose sums are the fitted constant and the fitted part of r^(−2n) [1].
fn at_the_edge(radii: &[f64], n: f64, powers: &[i32]) -> [Vec<f64>; 2] {
    let term = |r: f64, c: usize| match c {
        0 => 1.0,
        1 => r.powf(-2.0 * n),
        _ => r.powi(powers[c - 2]),
    };
    let weight = |r: f64| r.powf(n);
    let a = DMatrix::from_fn(radii.len(), powers.len() + 2, |k, c| weight(radii[k]) * term(radii[k], c));
    let equal = 1.0 / radii.len() as f64;
    let Ok(inverse) = a.pseudo_inverse(1e-12) else {
        return [vec![equal; radii.len()], vec![0.0; radii.len()]];
    };
    [0, 1].map(|c| (0..radii.len()).map(|k| inverse[(c, k)] * weight(radii[k])).collect())
}

/// Distance from a place to the nearest thing that is not its own edge and faces [m].
fn reach(panels: &Panels, edges: &[Edge], own: usize, along: f64, at: &Vec3) -> f64 {
    let edge = &edges[own];
    let (k, _) = edge.at(along);
    let segment = &edge.segments[k];
    let mut least = bend(edge, k, along);
    for (body, part) in panels.assembly.bodies.iter().enumerate() {
        let surface = &part.surface;
        for crease in surface.creases.iter().filter(|c| FOLD < (c.angle - PI).abs()) {
            let [a, b] = crease.ends.map(|k| surface.welded.points[k as usize]);
            let far = (distance::point_of_segment(&a, &b, at) - at).norm();
            if far < least && (body != edge.body || !is_on(edge, &[a, b])) {
                least = far;
            }
        }
    }
    let faces = [segment.normal, other_face(segment)];
    for p in 0..panels.len() {
        let tri = &panels.triangles[p];
        let own_face = panels.body[p] as usize == edge.body && {
            let n = tri.normal();
            let sheet = panels.assembly.bodies[edge.body].surface.sheet;
            faces.iter().any(|f| SAME_FACE < if sheet { f.dot(&n).abs() } else { f.dot(&n) })
        };
        if !own_face && (tri.centroid() - at).norm() - tri.longest_edge() < least {
            least = least.min((distance::point_of_triangle(tri, at) - at).norm());
        }
    }
    for grounded in panels.images.grounded() {
        least = least.min(grounded.plane.height(at).abs());
    }
    for mirror in panels.images.even() {
        // Through a mirror that it meets an edge just goes on; else its copy stands behind.
        let ends = edge.segments.iter().flat_map(|s| s.ends);
        let lowest = ends.map(|x| mirror.height(&x).abs()).fold(f64::INFINITY, f64::min);
        if ON_EDGE * edge.length() < lowest {
            least = least.min(2.0 * mirror.height(at).abs());
        }
    }
    least
}

/// Turn of a crease under which it is no obstacle [rad]: 5°.
const FOLD: f64 = 5.0 * PI / 180.0;

/// Whether both ends lie on the edge.
fn is_on(edge: &Edge, ends: &[Vec3; 2]) -> bool {
    let close = ON_EDGE * edge.length();
    let off = |s: &Segment, x: &Vec3| (distance::point_of_segment(&s.ends[0], &s.ends[1], x) - x).norm();
    ends.iter().all(|x| edge.segments.iter().any(|s| off(s, x) <= close))
}

/// Distance within which a point counts as on an edge, in lengths of the edge [1].
const ON_EDGE: f64 = 1e-6;

/// Outward unit normal of the second face.
fn other_face(segment: &Segment) -> Vec3 {
    let open = 2.0 * PI - segment.angle;
    let (sin, cos) = open.sin_cos();
    segment.face * sin - segment.normal * cos
}

/// Distance along the edge to its ends, or to where it has turned by [`BEND`] [m].
fn bend(edge: &Edge, k: usize, along: f64) -> f64 {
    let n = edge.segments.len();
    let start = edge.middle_of(k) - 0.5 * edge.segments[k].length();
    let walk = |forward: bool| {
        let t0 = edge.segments[k].tangent();
        let mut far = if forward { start + edge.segments[k].length() - along } else { along - start };
        for step in 1..n {
            let l = if forward { k + step } else { k + n - step };
            let wraps = if forward { n <= l } else { l < n };
            if wraps && !edge.closed {
                break;
            }
            let segment = &edge.segments[l % n];
            if segment.tangent().dot(&t0) < BEND.cos() {
                break;
            }
            far += segment.length();
        }
        far
    };
    walk(true).min(walk(false))
}
