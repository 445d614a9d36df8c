//! Edges with an unbounded field for the record, and what a declared radius makes of them.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::case::Case;
use crate::case::SurfaceKind;
use crate::geom::distance;
use crate::mesh::smooth;
use crate::operator::Sources;
use crate::physics::edges;
use crate::physics::edges::Edge;
use crate::physics::field;
use crate::physics::rounding;
use crate::physics::rounding::Corner;
use crate::physics::rounding::Ray;
use crate::physics::rounding::Rounded;
use crate::physics::solved::Solved;
use crate::physics::strength;
use crate::physics::strength::Place;
use crate::record;
use crate::record::EdgePlace;
use crate::record::FieldAt;
use std::f64::consts::PI;

/// Edges of all bodies with their strengths per volt.
pub(super) struct Edges<'a> {
    case: &'a Case,
    solved: &'a Solved,
    edges: Vec<Edge>,
    places: Vec<Vec<Place>>,
    corners: Vec<Corner>,
    charge_bar: Vec<f64>,
    /// Whether there were too many edges to hold.
    cut: bool,
}

/// What stands at the edges of one voltage case.
pub(super) struct Found {
    /// The edges of each part, strongest first.
    pub(super) edges: Vec<record::Edge>,
    /// The corners of each part with a law, highest first.
    pub(super) corners: Vec<record::Corner>,
    /// For each body what its edges make of the maximum.
    pub(super) tops: Vec<Top>,
    /// Roundings that are not small against the part, and seams.
    pub(super) findings: Vec<Finding>,
}

/// What the edges of a body make of its maximum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Top {
    /// It has none.
    NoEdge,
    /// Unbounded; `edge`, `corner` where the field grows towards one, or `seam`.
    Unbounded(&'static str),
    /// Bounded by the declared radius: value, place and kind (`edge`, `corner` or `smooth`).
    Rounded(Rounded, Vec3, &'static str),
}

/// Places along each edge, most first; fewer where there are many edges.
const PLACES: [usize; 4] = [strength::MOST_PLACES, 5, 3, 1];

/// Edges for which strengths are found at most.
const MOST_EDGES: usize = 2000;

/// Places at which strengths are found at most, beyond one for every eight panels.
const MOST_PLACES: usize = 400;

/// Edges and corners stored for each part and voltage case: the strongest.
const MOST_STORED: usize = 24;

/// Distances at which the field law is stated, in sizes of the part [1].
const STATED: [f64; 3] = [1e-3, 3e-3, 1e-2];

/// K near the end of an edge over that at its middle from which the field grows towards a corner [1].
const GROWS: f64 = 1.15;

impl<'a> Edges<'a> {
    /// Finds all edges, `charge_bar` being the relative bar of the charges of each row [1].
    pub(super) fn find(case: &'a Case, solved: &'a Solved, sources: &Sources, charge_bar: &[f64]) -> Self {
        let mut edges = edges::edges(&solved.panels);
        // The longest tell most; beyond the limit they are left out.
        edges.sort_by(|a, b| b.length().total_cmp(&a.length()));
        let cut = MOST_EDGES < edges.len();
        edges.truncate(MOST_EDGES);
        edges.sort_by_key(|edge| edge.body);
        let room = MOST_PLACES + solved.panels.len() / 8;
        let most = PLACES.into_iter().find(|most| most * edges.len() <= room).unwrap_or(1);
        let places = strength::strengths(solved, sources, &edges, most);
        let corners = rounding::corners(&edges);
        let assembly = &solved.panels.assembly;
        let worst = charge_bar.iter().fold(0.0, |most: f64, bar| most.max(*bar));
        let of_body = |body: usize| {
            let row = assembly.rows.iter().position(|row| row.bodies.contains(&(body as u32)));
            row.map_or(worst, |row| charge_bar[row])
        };
        let charge_bar = (0..assembly.bodies.len()).map(of_body).collect();
        Edges { case, solved, edges, places, corners, charge_bar, cut }
    }

    /// What stands at the edges at row potentials `v`.
    pub(super) fn at(&self, name: &str, v: &[f64]) -> Found {
        let held: Vec<Held> = (0..self.edges.len()).map(|e| self.held(e, v)).collect();
        let laws: Vec<Option<(f64, Option<Rounded>)>> =
            self.corners.iter().map(|c| self.law(c, &held)).collect();
        let tops: Vec<Top> = (0..self.charge_bar.len()).map(|b| self.top(b, &held, &laws, v)).collect();
        let mut edges: Vec<(usize, record::Edge)> =
            held.iter().enumerate().filter_map(|(e, held)| self.record(name, e, held)).collect();
        let near = |edge: &record::Edge| edge.field_at[0].field_v_per_m;
        edges.sort_by(|a, b| a.0.cmp(&b.0).then(near(&b.1).total_cmp(&near(&a.1))));
        let corner = |(corner, law): (&Corner, &Option<(f64, Option<Rounded>)>)| {
            let (exponent, rounded) = (*law)?;
            let record = record::Corner {
                part: self.name(corner.body),
                case: name.to_owned(),
                at_metre: corner.at.into(),
                exponent,
                edges: corner.edges.len(),
                edge_radius_metre: self.radius(corner.body),
                field_v_per_m: rounded.map(|r| r.field),
                bar_v_per_m: rounded.map(|r| r.bar),
            };
            Some((corner.body, record))
        };
        let mut corners: Vec<(usize, record::Corner)> =
            self.corners.iter().zip(&laws).filter_map(corner).collect();
        let high = |corner: &record::Corner| corner.field_v_per_m.unwrap_or(0.0);
        corners.sort_by(|a, b| a.0.cmp(&b.0).then(high(&b.1).total_cmp(&high(&a.1))));
        let bodies = 0..self.charge_bar.len();
        let findings = bodies.flat_map(|b| [self.not_small(b, &held), self.seams(b)]).flatten().collect();
        Found { edges: strongest(edges), corners: strongest(corners), tops, findings }
    }

    fn name(&self, body: usize) -> String {
        self.solved.panels.assembly.bodies[body].name.clone()
    }

    fn radius(&self, body: usize) -> Option<f64> {
        self.case.electrodes[body].edge_radius
    }

    fn held(&self, e: usize, v: &[f64]) -> Held {
        let (edge, places) = (&self.edges[e], &self.places[e]);
        let bars = strength::with_bars(edge, places, v, self.charge_bar[edge.body]);
        let rounded = |(place, (k, bar)): (&Place, &(f64, f64))| {
            let radius = self.radius(edge.body)?;
            // Beside a corner the corner decides.
            let room = place.along.min(edge.length() - place.along);
            let free = edge.closed || rounding::OFF_CORNER * radius <= room;
            free.then(|| rounding::edge(place, [*k, *bar], v, radius))
        };
        let rounded = places.iter().zip(&bars).map(rounded).collect();
        let off = |k: &usize| (places[*k].along - 0.5 * edge.length()).abs();
        let middle = (0..places.len()).min_by(|a, b| off(a).total_cmp(&off(b)));
        Held { bars, rounded, middle }
    }

    /// Exponent at a corner, and the field there if a radius is declared.
    fn law(&self, corner: &Corner, held: &[Held]) -> Option<(f64, Option<Rounded>)> {
        let rays: Vec<Ray> = corner.edges.iter().map(|(e, start)| self.ray(*e, *start, &held[*e])).collect();
        let law = rounding::corner_law(&rays)?;
        Some((law.exponent, self.radius(corner.body).map(|radius| law.rounded(radius))))
    }

    fn ray(&self, e: usize, start: bool, held: &Held) -> Ray {
        let (edge, places) = (&self.edges[e], &self.places[e]);
        let length = edge.length();
        let reach = held.middle.map_or(length, |m| places[m].reach);
        let from = |place: &Place| if start { place.along } else { length - place.along };
        // All of one sign: where K passes zero there is no power law.
        let sign = held.bars.first().map_or(1.0, |(k, _)| k.signum());
        let mut values: Vec<[f64; 3]> =
            places.iter().zip(&held.bars).map(|(place, (k, bar))| [from(place), sign * k, *bar]).collect();
        values.sort_by(|a, b| a[0].total_cmp(&b[0]));
        let last = edge.segments.len() - 1;
        let direction = if start { edge.segments[0].tangent() } else { -edge.segments[last].tangent() };
        let angle = edge.segments[if start { 0 } else { last }].angle;
        Ray { angle, direction, values, length: strength::scale(length, reach) }
    }

    fn top(&self, body: usize, held: &[Held], laws: &[Option<(f64, Option<Rounded>)>], v: &[f64]) -> Top {
        let own: Vec<usize> = (0..self.edges.len()).filter(|e| self.edges[*e].body == body).collect();
        if own.is_empty() {
            return if self.cut { Top::Unbounded("edge") } else { Top::NoEdge };
        }
        if self.radius(body).is_none() || self.cut {
            return Top::Unbounded(self.kind(body, &own, held));
        }
        let at_edges = own.iter().flat_map(|e| {
            let places = self.places[*e].iter().zip(&held[*e].rounded);
            places.filter_map(|(place, rounded)| rounded.map(|r| (r, place.at, "edge")))
        });
        let mut all: Vec<(Rounded, Vec3, &'static str)> = at_edges.collect();
        for (corner, law) in self.corners.iter().zip(laws).filter(|(corner, _)| corner.body == body) {
            match law {
                Some((_, Some(rounded))) => all.push((*rounded, corner.at, "corner")),
                // A corner that tells no law may be the highest place.
                _ if 1 < corner.edges.len() => return Top::Unbounded("corner"),
                _ => {}
            }
        }
        all.extend(self.elsewhere(body, v));
        let best = all.iter().fold(None, |best: Option<&(Rounded, Vec3, &'static str)>, one| match best {
            Some(high) if one.0.field <= high.0.field => Some(high),
            _ => Some(one),
        });
        let Some((highest, at, kind)) = best else { return Top::Unbounded("edge") };
        let upper = all.iter().map(|(r, ..)| r.field + r.bar).fold(highest.field, f64::max);
        let bar = highest.bar.max(upper - highest.field);
        Top::Rounded(Rounded { bar, ..*highest }, *at, kind)
    }

    /// Highest panel value away from all edges: more than two radii and the size of the panel.
    fn elsewhere(&self, body: usize, v: &[f64]) -> Option<(Rounded, Vec3, &'static str)> {
        let radius = self.radius(body)?;
        let panels = &self.solved.panels;
        let field = field::normal_field(self.solved, v);
        let own: Vec<&Edge> = self.edges.iter().filter(|edge| edge.body == body).collect();
        let far = |p: &usize| {
            let x = panels.triangles[*p].centroid();
            let least = AWAY * radius + panels.triangles[*p].longest_edge();
            own.iter()
                .flat_map(|edge| &edge.segments)
                .all(|s| least < (distance::point_of_segment(&s.ends[0], &s.ends[1], &x) - x).norm())
        };
        let held = (0..panels.len()).filter(|p| panels.body[*p] as usize == body);
        let mut order: Vec<usize> = held.collect();
        order.sort_by(|a, b| field[*b].abs().total_cmp(&field[*a].abs()).then(a.cmp(b)));
        let p = order.into_iter().find(far)?;
        let field = field[p].abs();
        Some((
            Rounded { field, bar: PANEL_DOUBT * field, terms: 0.0 },
            panels.triangles[p].centroid(),
            "smooth",
        ))
    }

    /// Kind of the place where the field law is strongest.
    fn kind(&self, body: usize, own: &[usize], held: &[Held]) -> &'static str {
        if own.iter().all(|e| self.places[*e].first().is_some_and(|place| self.is_seam(body, place))) {
            "seam"
        } else if self.grows_to_a_corner(body, own, held) {
            "corner"
        } else {
            "edge"
        }
    }

    /// Whether an edge there is only a turn from facet to facet of a surface taken as drawn.
    fn is_seam(&self, body: usize, place: &Place) -> bool {
        let as_drawn = self.case.electrodes[body].surface == SurfaceKind::AsDrawn;
        as_drawn && PI - place.angle <= smooth::CREASE_ANGLE
    }

    /// A note on creases so flat that they are taken for seams.
    fn seams(&self, body: usize) -> Option<Finding> {
        let (count, turn, at) = edges::seams(&self.solved.panels.assembly, body)?;
        Some(Finding {
            severity: Severity::Note,
            code: "seam",
            text: format!(
                "`{}`: {count} {} by less than {:.0}° (the sharpest by {:.2}°): seams between facets, not counted as \
                 unbounded",
                self.name(body),
                if count == 1 { "edge turns" } else { "edges turn" },
                (PI - edges::SEAM).to_degrees(),
                turn.to_degrees()
            ),
            place: Some(at),
        })
    }

    /// Whether K of the strongest edge grows towards an end.
    fn grows_to_a_corner(&self, body: usize, own: &[usize], held: &[Held]) -> bool {
        let distance = STATED[0] * size(self.solved, body);
        let highest = |e: usize| -> Option<(f64, usize)> {
            let places = self.places[e].iter().zip(&held[e].bars).enumerate();
            let field =
                |(k, (p, (s, _))): (usize, (&Place, &(f64, f64)))| (s.abs() * distance.powf(p.exponent()), k);
            places.map(field).max_by(|a, b| a.0.total_cmp(&b.0))
        };
        let all = own.iter().filter_map(|e| highest(*e).map(|(field, k)| (field, *e, k)));
        all.max_by(|a, b| a.0.total_cmp(&b.0)).is_some_and(|(_, e, k)| {
            let k_middle = held[e].middle.map_or(0.0, |m| held[e].bars[m].0.abs());
            !self.edges[e].closed && GROWS * k_middle < held[e].bars[k].0.abs()
        })
    }

    fn record(&self, case: &str, e: usize, held: &Held) -> Option<(usize, record::Edge)> {
        let (edge, places) = (&self.edges[e], &self.places[e]);
        let middle = held.middle?;
        let place = &places[middle];
        let size = size(self.solved, edge.body);
        let (k, bar) = held.bars[middle];
        let field_at = STATED.map(|share| FieldAt {
            distance_metre: share * size,
            field_v_per_m: k.abs() * (share * size).powf(place.exponent()),
        });
        let at = |k: usize| EdgePlace {
            at_metre: places[k].at.into(),
            strength: held.bars[k].0.abs(),
            bar: held.bars[k].1,
            field_v_per_m: held.rounded[k].map(|r| r.field),
            bar_v_per_m: held.rounded[k].map(|r| r.bar),
        };
        let highest = held.rounded.iter().flatten().max_by(|a, b| a.field.total_cmp(&b.field));
        let half = edge.length() * if edge.closed { 0.5 } else { 1.0 };
        let seam = self.is_seam(edge.body, place);
        let record = record::Edge {
            part: self.name(edge.body),
            kind: if seam { "seam" } else { "edge" }.to_owned(),
            angle_deg: place.angle.to_degrees(),
            exponent: place.exponent(),
            case: case.to_owned(),
            strength: k.abs(),
            strength_bar: bar,
            from_metre: edge.at(0.0).1.into(),
            to_metre: edge.at(half).1.into(),
            closed: edge.closed,
            length_metre: edge.length(),
            along: (0..places.len()).map(at).collect(),
            field_at: field_at.to_vec(),
            edge_radius_metre: self.radius(edge.body),
            field_v_per_m: highest.map(|r| r.field),
            bar_v_per_m: highest.map(|r| r.bar),
        };
        Some((edge.body, record))
    }

    /// A warning where the radius of a body is not small against it.
    fn not_small(&self, body: usize, held: &[Held]) -> Option<Finding> {
        let radius = self.radius(body)?;
        let mut worst: Option<(f64, Vec3)> = None;
        for e in (0..self.edges.len()).filter(|e| self.edges[*e].body == body) {
            for (k, (place, rounded)) in self.places[e].iter().zip(&held[e].rounded).enumerate() {
                let terms = rounded.map_or(0.0, |r| r.terms).max(radius / place.reach * REACH_SHARE);
                // Beside corners the corner decides, but the middle always counts.
                let counts = rounded.is_some() || held[e].middle == Some(k);
                if counts && worst.is_none_or(|(most, _)| most < terms) {
                    worst = Some((terms, place.at));
                }
            }
        }
        let (terms, at) = worst.filter(|(terms, _)| rounding::NOT_SMALL < *terms)?;
        Some(Finding {
            severity: Severity::Warning,
            code: "edge_radius_not_small",
            text: format!(
                "`{}`: `edge_radius` is not small against the part and what stands around it: the law of rounded edges \
                 is corrected by about {:.0} % there; draw the rounding for a better number",
                self.name(body),
                100.0 * terms
            ),
            place: Some(at),
        })
    }
}

/// Distance from edges, in radii, from which a panel tells of the rest of the surface [1].
const AWAY: f64 = 2.0;

/// Doubt of a panel value away from edges [1]: irregular facets scatter it by up to a tenth (DESIGN 3.6).
const PANEL_DOUBT: f64 = 0.1;

/// Share of radius over the distance to the next thing that counts as a correction [1]: at a ratio of 0.3 it warns.
const REACH_SHARE: f64 = 0.5;

/// One edge at given potentials.
struct Held {
    /// K and its bar at each place.
    bars: Vec<(f64, f64)>,
    /// Field on the rounding, away from corners and where a radius is declared.
    rounded: Vec<Option<Rounded>>,
    /// Index of the place nearest to the middle.
    middle: Option<usize>,
}

/// The first of each body.
fn strongest<T>(sorted: Vec<(usize, T)>) -> Vec<T> {
    let mut count = (usize::MAX, 0);
    let mut kept = Vec::new();
    for (body, one) in sorted {
        count = if count.0 == body { (body, count.1 + 1) } else { (body, 1) };
        if count.1 <= MOST_STORED {
            kept.push(one);
        }
    }
    kept
}

/// Longest side of the box around a body [m].
fn size(solved: &Solved, body: usize) -> f64 {
    let points = &solved.panels.assembly.bodies[body].surface.welded.points;
    let (lo, hi) = crate::mesh::weld::bounds(points);
    let size: Vec3 = hi - lo;
    size.max()
}
